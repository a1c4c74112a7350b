"""One marginal of every family and shape that matters, with its reference in SciPy."""

import math

import numpy as np
import pytest
from scipy import stats

from assess.probability.marginals import Marginal, make_marginal


def _cases() -> dict[str, tuple[Marginal, object]]:
    chi_degrees, chi_scale = 10.0, 0.09
    return {
        "normal": (make_marginal("normal", mean=3.0, sd=1.5), stats.norm(3.0, 1.5)),
        "lognormal": (
            make_marginal("lognormal", parameters={"log_mean": 3.6, "log_sd": 0.4}),
            stats.lognorm(0.4, scale=math.exp(3.6)),
        ),
        "gumbel": (
            make_marginal("gumbel", parameters={"mode": 90.0, "scale": 15.0}),
            stats.gumbel_r(90.0, 15.0),
        ),
        "weibull": (
            make_marginal("weibull", parameters={"scale": 108.0, "shape": 5.8}),
            stats.weibull_min(5.8, scale=108.0),
        ),
        "weibull, skewed": (
            make_marginal("weibull", parameters={"scale": 2.0, "shape": 0.8}),
            stats.weibull_min(0.8, scale=2.0),
        ),
        "gamma": (
            make_marginal("gamma", parameters={"shape": 4.0, "scale": 2.5}),
            stats.gamma(4.0, scale=2.5),
        ),
        "gamma, skewed": (
            make_marginal("gamma", parameters={"shape": 0.3, "scale": 1.0}),
            stats.gamma(0.3),
        ),
        "gamma, nearly normal": (
            make_marginal("gamma", parameters={"shape": 2000.0, "scale": 1.0}),
            stats.gamma(2000.0),
        ),
        "beta": (
            make_marginal("beta", parameters={"q": 5.3, "r": 18.6}, lower=0.2, upper=2.0),
            stats.beta(5.3, 18.6, loc=0.2, scale=1.8),
        ),
        "beta, bathtub": (
            make_marginal("beta", parameters={"q": 0.5, "r": 0.7}, lower=0.0, upper=1.0),
            stats.beta(0.5, 0.7),
        ),
        "uniform": (
            make_marginal("uniform", lower=-1.0, upper=3.0),
            stats.uniform(-1.0, 4.0),
        ),
        "truncated normal, below": (
            make_marginal("truncated normal", parameters={"location": 1.0, "scale": 2.0}, lower=0),
            stats.truncnorm(-0.5, math.inf, loc=1.0, scale=2.0),
        ),
        "truncated normal, above": (
            make_marginal("truncated normal", parameters={"location": 1.0, "scale": 2.0}, upper=4),
            stats.truncnorm(-math.inf, 1.5, loc=1.0, scale=2.0),
        ),
        "truncated normal, both": (
            make_marginal(
                "truncated normal",
                parameters={"location": 40.0, "scale": 10.0},
                lower=10.0,
                upper=60.0,
            ),
            stats.truncnorm(-3.0, 2.0, loc=40.0, scale=10.0),
        ),
        "scaled inverse chi": (
            make_marginal(
                "scaled inverse chi", parameters={"scale": chi_scale, "degrees": chi_degrees}
            ),
            _ScaledInverseChi(chi_scale, chi_degrees),
        ),
    }


class _ScaledInverseChi:
    """Reference: the variance is inverse gamma with shape nu/2 and scale nu s²/2."""

    def __init__(self, scale: float, degrees: float) -> None:
        self.variance = stats.invgamma(degrees / 2.0, scale=degrees * scale**2 / 2.0)

    def cdf(self, x):
        return self.variance.cdf(x**2)

    def sf(self, x):
        return self.variance.sf(x**2)

    def ppf(self, p):
        return self.variance.ppf(p) ** 0.5

    def isf(self, q):
        return self.variance.isf(q) ** 0.5

    def logpdf(self, x):
        return self.variance.logpdf(x**2) + math.log(2.0) + np.log(x)

    def mean(self):
        return self.variance.expect(lambda v: v**0.5, epsabs=1e-13, epsrel=1e-12)

    def std(self):
        return (self.variance.mean() - self.mean() ** 2) ** 0.5


CASES = _cases()


@pytest.fixture(params=list(CASES), ids=list(CASES))
def case(request):
    """A marginal and its reference."""
    return CASES[request.param]


@pytest.fixture(scope="session")
def all_cases():
    """Every marginal and its reference by name."""
    return CASES
