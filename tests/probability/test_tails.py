"""Score maps far into both tails, against arithmetic with many digits.

The error is measured in scores: the exact score of the value that the map gives, less the score
that was asked for.
"""

import math

import mpmath
import numpy as np
import pytest

from assess.probability.marginals import make_marginal

FAR = [-8.2, -7.0, -5.0, -2.0, 0.0, 2.0, 5.0, 7.0, 8.2]


def _normal(x, location, scale):
    z = (x - location) / scale
    return mpmath.ncdf(z), mpmath.ncdf(-z)


def _lognormal(x, log_mean, log_sd):
    return _normal(mpmath.log(x), log_mean, log_sd)


def _gumbel(x, mode, scale):
    power = -mpmath.exp(-(x - mode) / scale)
    return mpmath.exp(power), -mpmath.expm1(power)


def _weibull(x, scale, shape):
    power = -((x / scale) ** shape)
    return -mpmath.expm1(power), mpmath.exp(power)


def _gamma(x, shape, scale):
    below = mpmath.gammainc(shape, 0, x / scale, regularized=True)
    return below, mpmath.gammainc(shape, x / scale, mpmath.inf, regularized=True)


def _scaled_inverse_chi(x, scale, degrees):
    half_chi_square = degrees * scale**2 / (2 * x**2)
    above, below = _gamma(half_chi_square, degrees / 2, mpmath.mpf(1))
    return below, above


def _beta(x, q, r, lower, upper):
    below, above = (x - lower) / (upper - lower), (upper - x) / (upper - lower)
    return (
        mpmath.betainc(q, r, 0, below, regularized=True),
        mpmath.betainc(r, q, 0, above, regularized=True),
    )


def _uniform(x, lower, upper):
    return (x - lower) / (upper - lower), (upper - x) / (upper - lower)


def _truncated(x, location, scale, lower, upper):
    low, t, high = ((b - location) / scale for b in (lower, x, upper))
    total = mpmath.ncdf(high) - mpmath.ncdf(low)
    return (mpmath.ncdf(t) - mpmath.ncdf(low)) / total, (mpmath.ncdf(high) - mpmath.ncdf(t)) / total


# A bound at zero lets a value be held as close to it as need be: one case for either side.
CASES = [
    ("normal", {"mean": 3.0, "sd": 1.5}, {}, _normal, FAR),
    ("lognormal", {"log_mean": 3.6, "log_sd": 0.9}, {}, _lognormal, FAR),
    ("gumbel", {"mode": 90.0, "scale": 15.0}, {}, _gumbel, FAR),
    ("weibull", {"scale": 108.0, "shape": 5.8}, {}, _weibull, FAR),
    ("weibull", {"scale": 1.0, "shape": 0.7}, {}, _weibull, FAR),
    ("gamma", {"shape": 0.1, "scale": 2.0}, {}, _gamma, FAR),
    ("gamma", {"shape": 4.0, "scale": 2.5}, {}, _gamma, FAR),
    ("gamma", {"shape": 400.0, "scale": 1.0}, {}, _gamma, FAR),
    ("scaled inverse chi", {"scale": 0.09, "degrees": 10.0}, {}, _scaled_inverse_chi, FAR),
    ("scaled inverse chi", {"scale": 1.0, "degrees": 1.0}, {}, _scaled_inverse_chi, FAR),
    ("beta", {"q": 5.3, "r": 18.6}, {"lower": 0.0, "upper": 2.0}, _beta, FAR[:7]),
    ("beta", {"q": 5.3, "r": 18.6}, {"lower": -2.0, "upper": 0.0}, _beta, FAR[2:]),
    ("beta", {"q": 0.5, "r": 0.5}, {"lower": 0.0, "upper": 1.0}, _beta, FAR[:5]),
    ("beta", {"q": 0.5, "r": 0.1}, {"lower": -1.0, "upper": 0.0}, _beta, FAR[4:]),
    ("uniform", {"lower": 0.0, "upper": 3.0}, {}, _uniform, FAR[:5]),
    ("uniform", {"lower": -3.0, "upper": 0.0}, {}, _uniform, FAR[4:]),
    (
        "truncated normal",
        {"location": 1.0, "scale": 2.0},
        {"lower": 0.0},
        _truncated,
        FAR,
    ),
    ("truncated normal", {"location": 5.0, "scale": 1.0}, {"lower": 0.0}, _truncated, FAR),
    ("truncated normal", {"location": -3.0, "scale": 1.0}, {"lower": 0.0}, _truncated, FAR),
    ("truncated normal", {"location": -20.0, "scale": 1.0}, {"lower": 0.0}, _truncated, FAR),
    ("truncated normal", {"location": 1.0, "scale": 2.0}, {"upper": 0.0}, _truncated, FAR),
    (
        "truncated normal",
        {"location": 1.0, "scale": 2.0},
        {"lower": 0.0, "upper": 3.0},
        _truncated,
        FAR[:5],
    ),
]


def _exact_score_error(z, below, above):
    """Exact score less ``z``, from the nearer tail."""
    if z <= 0.0:
        return float((below - mpmath.ncdf(z)) / mpmath.npdf(z))
    return float((mpmath.ncdf(-z) - above) / mpmath.npdf(z))


@pytest.mark.parametrize(
    ("distribution", "parameters", "bounds", "probabilities", "scores"),
    CASES,
    ids=[f"{c[0]} {i}" for i, c in enumerate(CASES)],
)
def test_from_score_hits_the_exact_probability(
    distribution, parameters, bounds, probabilities, scores
):
    marginal = make_marginal(distribution, parameters=parameters, **bounds)
    with mpmath.workdps(150):
        numbers = {name: mpmath.mpf(value) for name, value in parameters.items()}
        if distribution == "truncated normal":
            numbers["lower"] = mpmath.mpf(bounds.get("lower", -math.inf))
            numbers["upper"] = mpmath.mpf(bounds.get("upper", math.inf))
        elif distribution == "beta":
            numbers |= {name: mpmath.mpf(value) for name, value in bounds.items()}
        for z in scores:
            x = float(marginal.from_score(z))
            below, above = probabilities(mpmath.mpf(x), *numbers.values())
            assert abs(_exact_score_error(z, below, above)) < 2e-8, z
            if z <= 0.0:
                assert float(marginal.cdf(x)) == pytest.approx(float(below), rel=1e-8, abs=0.0)
            if z >= 0.0:
                assert float(marginal.sf(x)) == pytest.approx(float(above), rel=1e-8, abs=0.0)
            assert float(marginal.score(x)) == pytest.approx(z, abs=2e-8)


def test_score_beyond_the_table_is_linear_in_the_logarithm():
    marginal = make_marginal("gamma", parameters={"shape": 4.0, "scale": 2.5})
    logs = np.log(marginal.from_score(np.array([8.5, 9.5, 10.5])))
    assert logs[2] - logs[1] == pytest.approx(logs[1] - logs[0], rel=1e-12)
    below = np.log(marginal.from_score(np.array([-8.5, -9.5, -10.5])))
    assert below[2] - below[1] == pytest.approx(below[1] - below[0], rel=1e-12)
