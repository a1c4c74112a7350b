"""What holds for every family: SciPy's values, round trips, tails, graphs."""

import math

import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scipy import special

from assess.probability.marginals import make_marginal

PROBABILITIES = np.array([1e-12, 1e-6, 0.001, 0.05, 0.3, 0.5, 0.7, 0.95, 0.999, 1.0 - 1e-6])
SCORES = np.linspace(-8.2, 8.2, 165)
many = settings(
    max_examples=30,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)


def _probabilities(marginal):
    """Leave out the tails of the truncated normal, where SciPy's own quantile has few digits.

    Those are compared with mpmath in test_tails.py.
    """
    if marginal.distribution == "truncated normal":
        return PROBABILITIES[(PROBABILITIES > 1e-5) & (PROBABILITIES < 0.9999)]
    return PROBABILITIES


def test_quantiles_match_scipy(case):
    marginal, reference = case
    p = _probabilities(marginal)
    np.testing.assert_allclose(marginal.ppf(p), reference.ppf(p), rtol=1e-9)
    upper = 1e-6 if marginal.distribution != "truncated normal" else 0.001
    q = np.array([upper, 0.05, 0.5, 0.95])
    np.testing.assert_allclose(marginal.isf(q), reference.isf(q), rtol=1e-9)


def test_probabilities_match_scipy(case):
    marginal, reference = case
    x = reference.ppf(_probabilities(marginal))
    np.testing.assert_allclose(marginal.cdf(x), reference.cdf(x), rtol=1e-9)
    np.testing.assert_allclose(marginal.sf(x), reference.sf(x), rtol=1e-9)


def test_density_matches_scipy(case):
    marginal, reference = case
    x = reference.ppf(PROBABILITIES)
    np.testing.assert_allclose(marginal.logpdf(x), reference.logpdf(x), rtol=1e-9, atol=1e-9)


def test_moments_match_scipy(case):
    marginal, reference = case
    assert marginal.mean == pytest.approx(reference.mean(), rel=1e-9)
    assert marginal.sd == pytest.approx(reference.std(), rel=1e-8)
    assert pytest.approx(marginal.sd / abs(marginal.mean)) == marginal.V


def test_support_is_where_the_quantiles_end(case):
    marginal, reference = case
    lower, upper = marginal.support
    assert (marginal.ppf(0.0), marginal.ppf(1.0)) == pytest.approx((lower, upper))
    assert marginal.cdf(np.array([lower, upper])) == pytest.approx([0.0, 1.0])
    if math.isfinite(lower):
        assert marginal.logpdf(lower - 1.0) == -math.inf
        assert (marginal.cdf(lower - 1.0), marginal.sf(lower - 1.0)) == (0.0, 1.0)
    if math.isfinite(upper):
        assert marginal.logpdf(upper + 1.0) == -math.inf
        assert (marginal.cdf(upper + 1.0), marginal.sf(upper + 1.0)) == (1.0, 0.0)


@many
@given(p=st.floats(1e-300, 1.0 - 1e-9))
def test_cdf_undoes_ppf(case, p):
    marginal, _ = case
    lower, _ = marginal.support
    x = marginal.ppf(p)
    # A probability is held as finely as the value: next to a bound other than zero not at all.
    held = 1e-300 if lower in (0.0, -math.inf) else 1e-14
    # A value that underflows to zero, or to a denormal number, has lost its probability.
    if x > 1e-300 or lower != 0.0:
        assert marginal.cdf(x) == pytest.approx(p, rel=2e-11, abs=held)


@many
@given(z=st.floats(-8.2, 8.2))
def test_score_undoes_from_score(case, z):
    marginal, _ = case
    x = marginal.from_score(z)
    low, high = marginal.support
    # The last digit of the value, in scores: all that a bound other than zero leaves.
    slope = math.exp(min(marginal.logpdf(x) + 0.5 * z * z + 0.92, 700.0))
    last_digit = np.spacing(abs(x)) * slope if low < x < high else math.inf
    assert (
        last_digit < 1e-9 or (low not in (0.0, -math.inf) and z < 0) or (high < math.inf and z > 0)
    )
    if last_digit < 1e-3:
        assert marginal.score(x) == pytest.approx(z, abs=1e-9 + 4.0 * last_digit)


@many
@given(z=st.floats(-8.4, 8.4), step=st.floats(1e-6, 2.0))
def test_from_score_rises(case, z, step):
    marginal, _ = case
    low, high = marginal.from_score(np.array([z, z + step]))
    assert low <= high
    if abs(z) < 5.0:
        assert low < high


def test_score_and_from_score_are_the_quantile_of_the_same_probability(case):
    marginal, reference = case
    end = 3.0 if marginal.distribution == "truncated normal" else 5.0
    z = np.array([-end, -2.0, -0.5, 0.0, 0.5, 2.0, end])
    exact = np.where(z < 0, reference.ppf(special.ndtr(z)), reference.isf(special.ndtr(-z)))
    np.testing.assert_allclose(marginal.from_score(z), exact, rtol=1e-8, atol=1e-12)
    np.testing.assert_allclose(marginal.score(exact), z, atol=1e-7)


@pytest.fixture(scope="module")
def from_graph(all_cases):
    """Values and gradients of every score map, from one compiled function."""
    z = pt.dvector("z")
    outputs = []
    for marginal, _ in all_cases.values():
        x = marginal.from_score(z)
        outputs += [x, pytensor.grad(x.sum(), z)]
    results = pytensor.function([z], outputs)(SCORES)
    return {name: (results[2 * i], results[2 * i + 1]) for i, name in enumerate(all_cases)}


def test_graph_gives_the_values_of_numbers(all_cases, from_graph):
    for name, (marginal, _) in all_cases.items():
        expected = marginal.from_score(SCORES)
        np.testing.assert_allclose(from_graph[name][0], expected, rtol=1e-11, err_msg=name)


def test_gradient_is_the_ratio_of_densities(all_cases, from_graph):
    """By F(x(z)) = Phi(z), dx/dz = phi(z)/f(x): independent of how the map is computed."""
    for name, (marginal, _) in all_cases.items():
        x, gradient = from_graph[name]
        low, high = marginal.support
        # Where the value itself is exact enough for its density to be.
        exact = np.abs(SCORES) < (5.0 if max(abs(low), abs(high)) < math.inf else 8.3)
        log_phi = -0.5 * SCORES**2 - 0.5 * math.log(2.0 * math.pi)
        slope = np.exp(log_phi - marginal.logpdf(x))
        np.testing.assert_allclose(gradient[exact], slope[exact], rtol=1e-7, err_msg=name)
        assert np.all(np.isfinite(gradient)), name
        assert np.all(gradient >= 0.0), name


def test_gradient_matches_finite_differences(all_cases, from_graph):
    step = 1e-4
    inner = np.abs(SCORES) < 5.0
    for name, (marginal, _) in all_cases.items():
        rise = marginal.from_score(SCORES + step) - marginal.from_score(SCORES - step)
        gradient = from_graph[name][1]
        scale = np.maximum(gradient, 1e-4 * gradient.max())
        error = np.abs(rise / (2.0 * step) - gradient) / scale
        assert error[inner].max() < 2e-6, name


def test_random_draws_follow_the_distribution(case):
    marginal, reference = case
    draws = marginal.random(np.random.default_rng(20260901), (50, 80))
    assert draws.shape == (50, 80)
    # Kolmogorov-Smirnov distance; 1.95/sqrt(n) is exceeded once in a thousand (fixed seed).
    ranks = (np.arange(draws.size) + 0.5) / draws.size
    distance = np.abs(reference.cdf(np.sort(draws.ravel())) - ranks).max()
    assert distance < 1.95 / math.sqrt(draws.size)


def test_score_maps_keep_shapes(case):
    marginal, _ = case
    assert np.shape(marginal.from_score(0.5)) == ()
    assert np.shape(marginal.from_score(np.zeros((2, 3)))) == (2, 3)
    assert np.shape(marginal.score(marginal.from_score(np.zeros((2, 3))))) == (2, 3)


def test_parameters_make_the_same_marginal_again(case):
    marginal, _ = case
    parameters = dict(marginal.parameters)
    bounds = {}
    if marginal.distribution in ("beta", "truncated normal"):
        bounds = {k: v for k in ("lower", "upper") if math.isfinite(v := parameters.pop(k))}
    again = make_marginal(marginal.distribution, parameters=parameters, **bounds)
    assert again == marginal
    assert hash(again) == hash(marginal)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ({"distribution": "lognormal", "mean": 35.0, "V": 0.5}, "lognormal, mean 35, V 0.5"),
        ({"distribution": "normal", "mean": 0.0, "sd": 1.0}, "normal, mean 0, sd 1"),
        ({"distribution": "constant", "mean": 35.0}, "constant 35"),
        (
            {"distribution": "beta", "mean": 0.6, "sd": 0.15, "lower": 0.2, "upper": 2.0},
            "beta, mean 0.6, V 0.25, from 0.2 to 2",
        ),
        (
            {
                "distribution": "truncated normal",
                "parameters": {"location": 0.0, "scale": 1.0},
                "upper": 0.0,
            },
            "truncated normal, mean -0.7979, sd 0.6028, up to 0",
        ),
        (
            {"distribution": "scaled inverse chi", "parameters": {"scale": 0.1, "degrees": 2.0}},
            "scaled inverse chi, scale 0.1, degrees 2",
        ),
    ],
)
def test_describe(arguments, words):
    assert make_marginal(**arguments).describe() == words
