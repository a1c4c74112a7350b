"""The one door: conversions of parameters, and what it refuses."""

import dataclasses
import math

import numpy as np
import pytensor.tensor as pt
import pytest
from scipy import stats

from assess.probability.marginals import DISTRIBUTIONS, make_marginal

# Recomputed for this project from the formulas in the docstrings, and here against SciPy's
# moments: mean, sd; lognormal; gumbel; weibull; gamma; 5 % lognormal; 98 % gumbel.
CONVERSIONS = [
    (100, 20, (4.585560, 0.198042), (90.998936, 15.593936), (5.797400, 107.997531), (25, 4)),
    (40, 4, (3.683904, 0.099751), (38.199787, 3.118787), (12.153434, 41.721507), (100, 0.4)),
    (30, 4.5, (3.390072, 0.149166), (27.974761, 3.508636), (7.906927, 31.874002), (44.4444, 0.675)),
]
FRACTILES = [(100, 20, 70.7965, 151.8455), (40, 4, 33.7786, 50.3691), (30, 4.5, 23.2131, 41.6652)]


@pytest.mark.parametrize(("mean", "sd", "lognormal", "gumbel", "weibull", "gamma"), CONVERSIONS)
def test_parameters_from_moments(mean, sd, lognormal, gumbel, weibull, gamma):
    made = {name: make_marginal(name, mean=mean, sd=sd).parameters for name in DISTRIBUTIONS[1:5]}
    assert tuple(made["lognormal"].values()) == pytest.approx(lognormal, abs=5.1e-7)
    assert tuple(made["gumbel"].values()) == pytest.approx(gumbel, abs=5.1e-7)
    assert made["weibull"]["shape"] == pytest.approx(weibull[0], abs=5.1e-7)
    assert made["weibull"]["scale"] == pytest.approx(weibull[1], abs=5.1e-7)
    assert tuple(made["gamma"].values()) == pytest.approx(gamma, abs=5e-5)


@pytest.mark.parametrize(("mean", "sd", "lognormal_5", "gumbel_98"), FRACTILES)
def test_fractiles_from_moments(mean, sd, lognormal_5, gumbel_98):
    assert make_marginal("lognormal", mean=mean, sd=sd).ppf(0.05) == pytest.approx(
        lognormal_5, abs=5.1e-5
    )
    assert make_marginal("gumbel", mean=mean, sd=sd).ppf(0.98) == pytest.approx(
        gumbel_98, abs=5.1e-5
    )


# Chloride: means and standard deviations as remembered from fib Bulletin 34 (values from memory);
# shapes and 5, 50 and 95 % fractiles recomputed for this project.
BETAS = [
    pytest.param(0.60, 0.15, 0.2, 2.0, (5.30864, 18.58025), (0.37907, 0.58589, 0.86933), id="crit"),
    pytest.param(0.30, 0.12, 0.0, 1.0, (4.07500, 9.50833), (0.12061, 0.28994, 0.51397), id="CEM I"),
    pytest.param(0.60, 0.15, 0.0, 1.0, (5.80000, 3.86667), (0.34078, 0.60716, 0.83456), id="ash"),
    pytest.param(0.45, 0.20, 0.0, 1.0, (2.33437, 2.85312), (0.13390, 0.44312, 0.78974), id="slag"),
    pytest.param(8.9, 5.6, 0.0, 50.0, (1.89823, 8.76599), (1.68435, 7.88012, 19.62562), id="depth"),
]


@pytest.mark.parametrize(("mean", "sd", "lower", "upper", "shapes", "fractiles"), BETAS)
def test_four_parameter_beta(mean, sd, lower, upper, shapes, fractiles):
    marginal = make_marginal("beta", mean=mean, sd=sd, lower=lower, upper=upper)
    parameters = marginal.parameters
    assert (parameters["q"], parameters["r"]) == pytest.approx(shapes, abs=5.1e-6)
    assert marginal.ppf(np.array([0.05, 0.5, 0.95])) == pytest.approx(fractiles, abs=5.1e-6)


def test_four_parameter_beta_probability():
    critical = make_marginal("beta", mean=0.60, sd=0.15, lower=0.2, upper=2.0)
    assert critical.cdf(0.4) == pytest.approx(0.07519, abs=5.1e-6)


ALL_FROM_MOMENTS = [
    ("normal", {}),
    ("lognormal", {}),
    ("gumbel", {}),
    ("weibull", {}),
    ("gamma", {}),
    ("uniform", {}),
    ("beta", {"lower": 0.0, "upper": 9.0}),
    ("truncated normal", {"lower": 0.0}),
    ("truncated normal", {"lower": -1.0, "upper": 8.0}),
    ("truncated normal", {"upper": 6.0}),
    ("scaled inverse chi", {}),
]


@pytest.mark.parametrize(("distribution", "bounds"), ALL_FROM_MOMENTS)
@pytest.mark.parametrize("V", [0.02, 0.3, 0.5])
def test_moments_come_back(distribution, bounds, V):
    marginal = make_marginal(distribution, mean=3.0, V=V, **bounds)
    assert marginal.mean == pytest.approx(3.0, rel=1e-9)
    assert marginal.sd == pytest.approx(3.0 * V, rel=1e-7)
    by_sd = make_marginal(distribution, mean=3.0, sd=3.0 * V, **bounds)
    assert by_sd == marginal


@pytest.mark.parametrize(("distribution", "bounds"), ALL_FROM_MOMENTS)
@pytest.mark.parametrize("probabilities", [(0.05, 0.5), (0.1, 0.99)])
def test_quantiles_come_back(distribution, bounds, probabilities):
    quantiles = dict(zip(probabilities, (2.0, 4.5), strict=True))
    marginal = make_marginal(distribution, quantiles=quantiles, **bounds)
    assert marginal.ppf(np.array(probabilities)) == pytest.approx([2.0, 4.5], rel=1e-8)
    back_to_front = dict(reversed(quantiles.items()))
    assert make_marginal(distribution, quantiles=back_to_front, **bounds) == marginal


def test_truncated_normal_moments_are_those_after_the_cut():
    marginal = make_marginal("truncated normal", mean=3.0, sd=1.5, lower=0.0)
    location, scale = marginal.parameters["location"], marginal.parameters["scale"]
    reference = stats.truncnorm(-location / scale, math.inf, loc=location, scale=scale)
    assert (reference.mean(), reference.std()) == pytest.approx((3.0, 1.5), rel=1e-8)


def test_a_mean_below_zero_takes_v_by_its_absolute_value():
    assert make_marginal("normal", mean=-2.0, V=0.5).sd == pytest.approx(1.0)


def test_constant():
    for constant in (
        make_marginal("constant", mean=35.0),
        make_marginal("constant", mean=35.0, sd=0.0),
        make_marginal("constant", parameters={"value": 35.0}),
    ):
        assert (constant.mean, constant.sd, constant.support) == (35.0, 0.0, (35.0, 35.0))
        assert constant.cdf(np.array([34.9, 35.0])).tolist() == [0.0, 1.0]
        assert constant.sf(np.array([34.9, 35.0])).tolist() == [1.0, 0.0]
        assert constant.from_score(np.array([-3.0, 3.0])).tolist() == [35.0, 35.0]
        assert constant.isf(0.2) == constant.ppf(0.7) == 35.0
        assert constant.score(35.0) == 0.0
        assert constant.random(np.random.default_rng(1), 3).tolist() == [35.0] * 3
        assert constant.from_score(pt.ones(2)).eval(mode="FAST_COMPILE").tolist() == [35.0, 35.0]
    with pytest.raises(ValueError, match="score of a constant: given 34, allowed 35"):
        constant.score(np.array([35.0, 34.0]))
    with pytest.raises(ValueError, match="no density: given the constant 35"):
        constant.logpdf(35.0)


def test_marginals_are_frozen():
    with pytest.raises(dataclasses.FrozenInstanceError, match="cannot assign to field"):
        make_marginal("normal", mean=0.0, sd=1.0).location = 2.0


REFUSED = [
    ({"distribution": "lognormall", "mean": 1, "sd": 1}, "did you mean 'lognormal'"),
    ({"distribution": "cauchy", "mean": 1, "sd": 1}, "given 'cauchy', allowed normal, lognormal"),
    ({"distribution": "normal", "mean": 1}, "given mean, allowed exactly one of mean with V"),
    ({"distribution": "normal"}, "given nothing, allowed exactly one"),
    ({"distribution": "normal", "mean": 1, "V": 0.1, "sd": 0.1}, "given mean and V and sd"),
    (
        {"distribution": "normal", "mean": 1, "sd": 1, "quantiles": {0.1: 1, 0.2: 2}},
        "given mean and sd; quantiles",
    ),
    ({"distribution": "normal", "mean": 1, "V": 20}, r"given 20, allowed in .*percent\? write 0.2"),
    ({"distribution": "normal", "mean": 1, "V": 500}, r"given 500, allowed in \(0, 2\]$"),
    ({"distribution": "normal", "mean": 1, "V": 0}, r"variation of a normal: given 0, allowed in"),
    ({"distribution": "normal", "mean": 0, "V": 0.1}, "mean that goes with V: given 0"),
    ({"distribution": "normal", "mean": math.nan, "sd": 1}, "given nan, allowed a finite number"),
    ({"distribution": "normal", "mean": 1, "sd": -2}, "given -2, allowed a positive number"),
    ({"distribution": "normal", "mean": 1, "sd": 1, "lower": 0}, "given lower 0 .*allowed none"),
    ({"distribution": "lognormal", "mean": -1, "sd": 1}, "mean of a lognormal: given -1"),
    ({"distribution": "weibull", "mean": -1, "sd": 1}, "mean of a weibull: given -1"),
    ({"distribution": "gamma", "mean": -1, "sd": 1}, "mean of a gamma: given -1"),
    ({"distribution": "scaled inverse chi", "mean": -1, "sd": 1}, "mean of a scaled inverse chi"),
    ({"distribution": "constant", "mean": 1, "sd": 1}, "deviation of a constant: given 1"),
    ({"distribution": "constant", "quantiles": {0.1: 1, 0.2: 2}}, "allowed are mean or parameters"),
    ({"distribution": "constant", "mean": math.inf}, "given inf, allowed a finite number"),
    (
        {"distribution": "gamma", "parameters": {"shape": 1, "rate": 1}},
        "given shape, rate, allowed shape, scale",
    ),
    (
        {"distribution": "gamma", "parameters": {"shape": 0.01, "scale": 1}},
        "shape of a gamma: given 0.01, allowed a number between 0.05",
    ),
    ({"distribution": "normal", "parameters": {"mean": 0, "sd": 0}}, "sd of a normal: given 0"),
    ({"distribution": "normal", "quantiles": {0.1: 1}}, "given 1, allowed two"),
    ({"distribution": "normal", "quantiles": {0.1: 1, 5: 2}}, "given 5, allowed between 0 and 1"),
    (
        {"distribution": "normal", "quantiles": {0.1: 2, 0.9: 1}},
        "given 1, allowed a number above 2",
    ),
    ({"distribution": "lognormal", "quantiles": {0.1: -2, 0.9: 1}}, "of a lognormal: given -2"),
    ({"distribution": "beta", "mean": 1, "sd": 1, "lower": 0}, "given lower 0 .*allowed both"),
    (
        {"distribution": "beta", "mean": 3, "sd": 1, "lower": 0, "upper": 2},
        "mean of a beta: given 3, allowed a number between the bounds 0 and 2",
    ),
    (
        {"distribution": "beta", "mean": 1, "sd": 1, "lower": 0, "upper": 2},
        "standard deviation of a beta: given 1, allowed less than 1",
    ),
    (
        {"distribution": "beta", "mean": 1, "sd": 1, "lower": 2, "upper": 0},
        "upper bound of a beta: given 0, allowed a number above the lower bound 2",
    ),
    (
        {"distribution": "beta", "quantiles": {0.1: -1, 0.9: 1}, "lower": 0, "upper": 2},
        "smaller quantile of a beta: given -1, allowed inside the bounds 0 and 2",
    ),
    (
        {"distribution": "beta", "quantiles": {0.1: 0.5, 0.9: 3}, "lower": 0, "upper": 2},
        "larger quantile of a beta: given 3",
    ),
    ({"distribution": "uniform", "lower": 0}, "given lower 0 and upper None, allowed both"),
    ({"distribution": "uniform", "lower": 2, "upper": 1}, "upper bound of a uniform: given 1"),
    ({"distribution": "truncated normal", "mean": 1, "sd": 1}, "allowed lower, upper or both"),
    (
        {"distribution": "truncated normal", "mean": 1, "sd": 1.2, "lower": 0},
        "mean 1 and sd 1.2: no normal distribution cut off",
    ),
    (
        {"distribution": "truncated normal", "mean": -1, "sd": 1.2, "lower": 0},
        "mean of a truncated normal: given -1",
    ),
    (
        {
            "distribution": "truncated normal",
            "parameters": {"location": -50, "scale": 1},
            "lower": 0,
        },
        "lower bound: given 0, allowed within 37 scales of the location -50",
    ),
    (
        {"distribution": "truncated normal", "quantiles": {0.1: -1, 0.9: 1}, "lower": 0},
        "smaller quantile of a truncated normal: given -1",
    ),
    (
        {"distribution": "gamma", "quantiles": {0.5: 1.0, 0.500001: 1e9}},
        "gamma with quantiles in the ratio 1e.09: no parameter",
    ),
]


@pytest.mark.parametrize(("arguments", "message"), REFUSED)
def test_refusals_say_what_was_given_and_what_is_allowed(arguments, message):
    with pytest.raises(ValueError, match=message):
        make_marginal(**arguments)
