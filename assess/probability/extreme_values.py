"""Extreme-value marginals: Gumbel for largest values, Weibull for smallest."""

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from scipy import special

from assess.operations import Numeric, exp, log, log_normal_cdf, where
from assess.probability.marginal import Marginal, log_or_minus_infinity, require

EULER_GAMMA = 0.577215664901532860606512  # Abramowitz & Stegun 1964, 6.1.3
LOG_TWO = math.log(2.0)


@dataclass(frozen=True)
class Gumbel(Marginal):
    r"""Gumbel distribution of largest values, :math:`F(x) = \exp(-e^{-(x-u)/b})`."""

    mode: float
    scale: float
    distribution: ClassVar[str] = "gumbel"

    def __post_init__(self) -> None:
        require(math.isfinite(self.mode), "mode of a gumbel", self.mode, "a finite number")
        require(0.0 < self.scale < math.inf, "scale of a gumbel", self.scale, "a positive number")

    @property
    def mean(self) -> float:
        """Mean, mode + 0.5772 scale."""
        return self.mode + EULER_GAMMA * self.scale

    @property
    def sd(self) -> float:
        """Standard deviation, pi scale / sqrt(6)."""
        return math.pi * self.scale / math.sqrt(6.0)

    @property
    def support(self) -> tuple[float, float]:
        """All numbers."""
        return (-math.inf, math.inf)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameters."""
        return {"mode": self.mode, "scale": self.scale}

    def _minus_log_cdf(self, x: Numeric) -> Numeric:
        # Capped where the probability is zero to every digit, so that nothing overflows.
        return np.exp(np.minimum(-(np.asarray(x, dtype=float)[()] - self.mode) / self.scale, 700.0))

    def cdf(self, x: Numeric) -> Numeric:
        """Distribution function."""
        return np.exp(-self._minus_log_cdf(x))

    def sf(self, x: Numeric) -> Numeric:
        """Its complement."""
        return -np.expm1(-self._minus_log_cdf(x))

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density."""
        reduced = (np.asarray(x, dtype=float)[()] - self.mode) / self.scale
        return -reduced - self._minus_log_cdf(x) - math.log(self.scale)

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile."""
        with np.errstate(divide="ignore"):
            return self.mode - self.scale * np.log(-np.log(p))

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement."""
        with np.errstate(divide="ignore"):
            return self.mode - self.scale * np.log(-np.log1p(-np.asarray(q, dtype=float)[()]))

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score."""
        return self.mode - self.scale * log(-log_normal_cdf(z))

    def score(self, x: Numeric) -> Numeric:
        """Score of a value, from the logarithm of its probability in the lower half."""
        exponent = self._minus_log_cdf(x)
        lower = special.ndtri_exp(-np.maximum(exponent, LOG_TWO))
        return where(exponent > LOG_TWO, lower, -special.ndtri(-np.expm1(-exponent)))


def weibull_squared_variation(shape: float) -> float:
    """Squared coefficient of variation of a Weibull distribution, Γ(1+2/k)/Γ(1+1/k)² - 1."""
    return math.expm1(math.lgamma(1.0 + 2.0 / shape) - 2.0 * math.lgamma(1.0 + 1.0 / shape))


@dataclass(frozen=True)
class Weibull(Marginal):
    r"""Weibull distribution of smallest values, :math:`F(x) = 1 - \exp(-(x/s)^k)`, from zero."""

    scale: float
    shape: float
    distribution: ClassVar[str] = "weibull"

    def __post_init__(self) -> None:
        require(0.0 < self.scale < math.inf, "scale of a weibull", self.scale, "a positive number")
        require(0.0 < self.shape < math.inf, "shape of a weibull", self.shape, "a positive number")

    @property
    def mean(self) -> float:
        """Mean, s Gamma(1 + 1/k)."""
        return self.scale * math.gamma(1.0 + 1.0 / self.shape)

    @property
    def sd(self) -> float:
        """Standard deviation."""
        return self.mean * math.sqrt(weibull_squared_variation(self.shape))

    @property
    def support(self) -> tuple[float, float]:
        """Positive numbers."""
        return (0.0, math.inf)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameters."""
        return {"scale": self.scale, "shape": self.shape}

    def _minus_log_sf(self, x: Numeric) -> Numeric:
        return (np.maximum(np.asarray(x, dtype=float)[()], 0.0) / self.scale) ** self.shape

    def cdf(self, x: Numeric) -> Numeric:
        """Distribution function."""
        return -np.expm1(-self._minus_log_sf(x))

    def sf(self, x: Numeric) -> Numeric:
        """Its complement."""
        return np.exp(-self._minus_log_sf(x))

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density."""
        values = np.asarray(x, dtype=float)[()]
        inside = values > 0.0
        reduced = where(inside, values, self.scale) / self.scale
        powers = (self.shape - 1.0) * np.log(reduced) - reduced**self.shape
        return log_or_minus_infinity(inside, powers + math.log(self.shape / self.scale))

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile."""
        with np.errstate(divide="ignore"):
            return self.scale * (-np.log1p(-np.asarray(p, dtype=float)[()])) ** (1.0 / self.shape)

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement."""
        with np.errstate(divide="ignore"):
            return self.scale * (-np.log(q)) ** (1.0 / self.shape)

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score."""
        # Through logarithms: a power of the tiny lower-tail value has a poor gradient.
        return self.scale * exp(log(-log_normal_cdf(-z)) / self.shape)

    def score(self, x: Numeric) -> Numeric:
        """Score of a value, from the logarithm of its exceedance in the upper half."""
        exponent = self._minus_log_sf(x)
        upper = -special.ndtri_exp(-np.maximum(exponent, LOG_TWO))
        return where(exponent > LOG_TWO, upper, special.ndtri(-np.expm1(-exponent)))
