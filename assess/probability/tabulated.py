"""Marginals whose quantile has no closed form: gamma, scaled inverse chi and beta.

Their score map is a table (`assess.probability.score_table`), for numbers as for PyTensor graphs;
their other functions are exact.
"""

import math
from dataclasses import dataclass
from functools import cached_property
from typing import ClassVar

import numpy as np
from scipy import special

from assess.operations import Numeric, exp, log1p, where
from assess.probability.marginal import (
    Marginal,
    bounds_in_words,
    log_or_minus_infinity,
    require,
)
from assess.probability.score_table import ScoreTable, log_gamma_table, logit_beta_table

SMALLEST_SHAPE = 0.05
LARGEST_SHAPE = 1e7


def _require_shape(name: str, value: float) -> None:
    allowed = f"a number between {SMALLEST_SHAPE:g} and {LARGEST_SHAPE:g}"
    require(SMALLEST_SHAPE <= value <= LARGEST_SHAPE, name, value, allowed)


@dataclass(frozen=True)
class Gamma(Marginal):
    """Gamma distribution from zero, with shape k and scale."""

    shape: float
    scale: float
    distribution: ClassVar[str] = "gamma"

    def __post_init__(self) -> None:
        _require_shape("shape of a gamma", self.shape)
        require(0.0 < self.scale < math.inf, "scale of a gamma", self.scale, "a positive number")

    @property
    def mean(self) -> float:
        """Mean, k times scale."""
        return self.shape * self.scale

    @property
    def sd(self) -> float:
        """Standard deviation."""
        return math.sqrt(self.shape) * self.scale

    @property
    def support(self) -> tuple[float, float]:
        """Positive numbers."""
        return (0.0, math.inf)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameters."""
        return {"shape": self.shape, "scale": self.scale}

    def _reduced(self, x: Numeric) -> Numeric:
        return np.maximum(np.asarray(x, dtype=float)[()], 0.0) / self.scale

    def cdf(self, x: Numeric) -> Numeric:
        """Distribution function."""
        return special.gammainc(self.shape, self._reduced(x))

    def sf(self, x: Numeric) -> Numeric:
        """Its complement."""
        return special.gammaincc(self.shape, self._reduced(x))

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density."""
        reduced = self._reduced(x)
        inside = reduced > 0.0
        safe = where(inside, reduced, 1.0)
        density = (self.shape - 1.0) * np.log(safe) - safe - special.gammaln(self.shape)
        return log_or_minus_infinity(inside, density - math.log(self.scale))

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile, exact."""
        return self.scale * special.gammaincinv(self.shape, p)

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement, exact."""
        return self.scale * special.gammainccinv(self.shape, q)

    @cached_property
    def _table(self) -> ScoreTable:
        return log_gamma_table(self.shape)

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score, by the table; within 1e-8 of the exact quantile."""
        return self.scale * exp(self._table(z))


@dataclass(frozen=True)
class ScaledInverseChi(Marginal):
    r"""Distribution of a standard deviation whose variance is scaled inverse chi-square.

    Notes
    -----
    :math:`\sigma = s \sqrt{\nu / \chi^2_\nu}` with scale s and :math:`\nu` degrees of freedom:
    the prior and posterior of a normal standard deviation in its conjugate analysis [1]_. Its
    mean exists for more than one degree of freedom, its standard deviation for more than two.

    References
    ----------
    .. [1] A. Gelman et al., Bayesian Data Analysis, 3rd ed., Chapman & Hall/CRC 2013,
       section 3.3 and appendix A.
    """

    scale: float
    degrees: float
    distribution: ClassVar[str] = "scaled inverse chi"

    def __post_init__(self) -> None:
        require(0.0 < self.scale < math.inf, "scale", self.scale, "a positive number")
        _require_shape("degrees", self.degrees / 2.0)

    @property
    def mean(self) -> float:
        """Mean; infinite up to one degree of freedom."""
        if self.degrees <= 1.0:
            return math.inf
        half = 0.5 * self.degrees
        ratio = math.exp(math.lgamma(half - 0.5) - math.lgamma(half))
        return self.scale * math.sqrt(half) * ratio

    @property
    def sd(self) -> float:
        """Standard deviation; infinite up to two degrees of freedom."""
        if self.degrees <= 2.0:
            return math.inf
        return self.mean * math.sqrt(inverse_chi_squared_variation(self.degrees))

    @property
    def support(self) -> tuple[float, float]:
        """Positive numbers."""
        return (0.0, math.inf)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameters."""
        return {"scale": self.scale, "degrees": self.degrees}

    def _gamma(self, x: Numeric) -> Numeric:
        """Half the chi-square that belongs to a value; it falls as the value rises."""
        values = np.maximum(np.asarray(x, dtype=float)[()], 0.0)
        with np.errstate(divide="ignore"):
            return 0.5 * self.degrees * (self.scale / values) ** 2

    def cdf(self, x: Numeric) -> Numeric:
        """Distribution function."""
        return special.gammaincc(0.5 * self.degrees, self._gamma(x))

    def sf(self, x: Numeric) -> Numeric:
        """Its complement."""
        return special.gammainc(0.5 * self.degrees, self._gamma(x))

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density."""
        values = np.asarray(x, dtype=float)[()]
        inside = values > 0.0
        safe = where(inside, values, self.scale)
        half, reduced = 0.5 * self.degrees, self._gamma(safe)
        density = half * np.log(reduced) - reduced - special.gammaln(half)  # of ln reduced
        return log_or_minus_infinity(inside, density + np.log(2.0 / safe))

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile, exact."""
        return self._from_gamma(special.gammainccinv(0.5 * self.degrees, p))

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement, exact."""
        return self._from_gamma(special.gammaincinv(0.5 * self.degrees, q))

    def _from_gamma(self, reduced: Numeric) -> Numeric:
        with np.errstate(divide="ignore"):
            return self.scale * np.sqrt(0.5 * self.degrees / reduced)

    @cached_property
    def _table(self) -> ScoreTable:
        return log_gamma_table(0.5 * self.degrees)

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score, by the table; within 1e-8 of the exact quantile."""
        return self.scale * math.sqrt(0.5 * self.degrees) * exp(-0.5 * self._table(-z))


def inverse_chi_squared_variation(degrees: float) -> float:
    """Squared coefficient of variation of the scaled inverse chi distribution."""
    half = 0.5 * degrees
    log_ratio = 2.0 * (math.lgamma(half) - math.lgamma(half - 0.5))
    return math.expm1(log_ratio - math.log(half - 1.0))


@dataclass(frozen=True)
class Beta(Marginal):
    r"""Beta distribution between two bounds.

    Notes
    -----
    Density :math:`\propto (x-a)^{q-1} (b-x)^{r-1}` on (a, b).
    """

    q: float
    r: float
    lower: float
    upper: float
    distribution: ClassVar[str] = "beta"

    def __post_init__(self) -> None:
        _require_shape("shape q of a beta", self.q)
        _require_shape("shape r of a beta", self.r)
        require(math.isfinite(self.lower), "lower bound of a beta", self.lower, "a finite number")
        allowed = f"a finite number above the lower bound {self.lower:g}"
        require(self.lower < self.upper < math.inf, "upper bound of a beta", self.upper, allowed)

    @property
    def width(self) -> float:
        """Distance between the bounds."""
        return self.upper - self.lower

    @property
    def mean(self) -> float:
        """Mean."""
        return self.lower + self.width * self.q / (self.q + self.r)

    @property
    def sd(self) -> float:
        """Standard deviation."""
        total = self.q + self.r
        return self.width * math.sqrt(self.q * self.r / (total + 1.0)) / total

    @property
    def support(self) -> tuple[float, float]:
        """The bounds."""
        return (self.lower, self.upper)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameters and bounds."""
        return {"q": self.q, "r": self.r, "lower": self.lower, "upper": self.upper}

    def _fraction(self, x: Numeric) -> tuple[Numeric, Numeric]:
        """Distances from the two bounds over the width, each from its own bound."""
        values = np.clip(np.asarray(x, dtype=float), self.lower, self.upper)[()]
        return (values - self.lower) / self.width, (self.upper - values) / self.width

    def cdf(self, x: Numeric) -> Numeric:
        """Distribution function."""
        below, above = self._fraction(x)
        return where(
            below < 0.5,
            special.betainc(self.q, self.r, below),
            special.betaincc(self.r, self.q, above),
        )

    def sf(self, x: Numeric) -> Numeric:
        """Its complement."""
        below, above = self._fraction(x)
        return where(
            below < 0.5,
            special.betaincc(self.q, self.r, below),
            special.betainc(self.r, self.q, above),
        )

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density; minus infinity at the bounds themselves."""
        values = np.asarray(x, dtype=float)[()]
        inside = (values > self.lower) & (values < self.upper)
        below, above = self._fraction(where(inside, values, 0.5 * (self.lower + self.upper)))
        powers = (self.q - 1.0) * np.log(below) + (self.r - 1.0) * np.log(above)
        density = powers - special.betaln(self.q, self.r) - math.log(self.width)
        return log_or_minus_infinity(inside, density)

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile, exact."""
        probability = np.asarray(p, dtype=float)[()]
        return self._between(
            probability < 0.5,
            special.betaincinv(self.q, self.r, probability),
            special.betainccinv(self.r, self.q, probability),
        )

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement, exact."""
        probability = np.asarray(q, dtype=float)[()]
        return self._between(
            probability > 0.5,
            special.betainccinv(self.q, self.r, probability),
            special.betaincinv(self.r, self.q, probability),
        )

    def _between(self, from_lower: Numeric, below: Numeric, above: Numeric) -> Numeric:
        """Value from its share of the width below or above it, whichever is wanted."""
        return where(from_lower, self.lower + self.width * below, self.upper - self.width * above)

    @cached_property
    def _table(self) -> ScoreTable:
        return logit_beta_table(self.q, self.r)

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score, by the table, measured from the nearer bound."""
        logit = self._table(z)
        # Each branch sees only its own half, so that neither exponential overflows.
        negative = logit < 0.0
        growth = exp(where(negative, logit, -logit))
        share = growth * exp(-log1p(growth))
        return self._between(negative, share, share)

    def _bounds_in_words(self) -> str:
        return bounds_in_words(self.lower, self.upper)
