"""Marginals whose map from standard normal scores is a closed form."""

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from scipy import special

from assess.operations import (
    Numeric,
    exp,
    is_symbolic,
    normal_cdf,
    normal_logpdf,
    where,
)
from assess.probability.marginal import (
    Marginal,
    bounds_in_words,
    log_or_minus_infinity,
    require,
)


@dataclass(frozen=True)
class Constant(Marginal):
    """A value without uncertainty; it has no density, and every score maps to it."""

    value: float
    distribution: ClassVar[str] = "constant"

    def __post_init__(self) -> None:
        require(math.isfinite(self.value), "value of a constant", self.value, "a finite number")

    @property
    def mean(self) -> float:
        """The value."""
        return self.value

    @property
    def sd(self) -> float:
        """Zero."""
        return 0.0

    @property
    def support(self) -> tuple[float, float]:
        """The value, twice."""
        return (self.value, self.value)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameter."""
        return {"value": self.value}

    def cdf(self, x: Numeric) -> Numeric:
        """One from the value on."""
        return where(np.asarray(x) >= self.value, 1.0, 0.0)

    def sf(self, x: Numeric) -> Numeric:
        """Zero from the value on."""
        return where(np.asarray(x) >= self.value, 0.0, 1.0)

    def logpdf(self, x: Numeric) -> Numeric:
        """Refuse: there is no density."""
        raise ValueError(f"a constant has no density: given the constant {self.value:g}")

    def ppf(self, p: Numeric) -> Numeric:
        """Give the value, whatever the probability."""
        return self.value + 0.0 * np.asarray(p, dtype=float)[()]

    def isf(self, q: Numeric) -> Numeric:
        """Give the value, whatever the probability."""
        return self.ppf(q)

    def from_score(self, z: Numeric) -> Numeric:
        """Give the value, whatever the score."""
        return self.value + 0.0 * z if is_symbolic(z) else self.ppf(z)

    def score(self, x: Numeric) -> Numeric:
        """Zero by convention for the value itself; anything else is refused."""
        values = np.asarray(x, dtype=float)
        if not np.all(values == self.value):
            other = float(values[values != self.value].flat[0])
            raise ValueError(f"score of a constant: given {other:g}, allowed {self.value:g}")
        return np.zeros_like(values)[()]

    def describe(self) -> str:
        """Say ``constant 35``."""
        return f"constant {self.value:.4g}"


@dataclass(frozen=True)
class Normal(Marginal):
    """Normal distribution."""

    location: float
    scale: float
    distribution: ClassVar[str] = "normal"

    def __post_init__(self) -> None:
        require(math.isfinite(self.location), "mean of a normal", self.location, "a finite number")
        require(0.0 < self.scale < math.inf, "sd of a normal", self.scale, "a positive number")

    @property
    def mean(self) -> float:
        """Mean."""
        return self.location

    @property
    def sd(self) -> float:
        """Standard deviation."""
        return self.scale

    @property
    def support(self) -> tuple[float, float]:
        """All numbers."""
        return (-math.inf, math.inf)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameters."""
        return {"mean": self.location, "sd": self.scale}

    def _standard(self, x: Numeric) -> Numeric:
        return (np.asarray(x, dtype=float)[()] - self.location) / self.scale

    def cdf(self, x: Numeric) -> Numeric:
        """Distribution function."""
        return normal_cdf(self._standard(x))

    def sf(self, x: Numeric) -> Numeric:
        """Its complement."""
        return normal_cdf(-self._standard(x))

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density."""
        return normal_logpdf(self._standard(x)) - math.log(self.scale)

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile."""
        return self.from_score(special.ndtri(p))

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement."""
        return self.from_score(-special.ndtri(q))

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score."""
        return self.location + self.scale * z

    def score(self, x: Numeric) -> Numeric:
        """Score of a value."""
        return self._standard(x)


@dataclass(frozen=True)
class Lognormal(Marginal):
    """Lognormal distribution: the logarithm is normal."""

    log_mean: float
    log_sd: float
    distribution: ClassVar[str] = "lognormal"

    def __post_init__(self) -> None:
        require(math.isfinite(self.log_mean), "log_mean", self.log_mean, "a finite number")
        require(0.0 < self.log_sd < math.inf, "log_sd", self.log_sd, "a positive number")

    @property
    def mean(self) -> float:
        """Mean."""
        return math.exp(self.log_mean + 0.5 * self.log_sd**2)

    @property
    def sd(self) -> float:
        """Standard deviation."""
        return self.mean * math.sqrt(math.expm1(self.log_sd**2))

    @property
    def support(self) -> tuple[float, float]:
        """Positive numbers."""
        return (0.0, math.inf)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameters."""
        return {"log_mean": self.log_mean, "log_sd": self.log_sd}

    def cdf(self, x: Numeric) -> Numeric:
        """Distribution function."""
        return normal_cdf(self.score(x))

    def sf(self, x: Numeric) -> Numeric:
        """Its complement."""
        return normal_cdf(-self.score(x))

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density."""
        values = np.asarray(x, dtype=float)[()]
        inside = values > 0.0
        logs = np.log(where(inside, values, 1.0))
        z = (logs - self.log_mean) / self.log_sd
        return log_or_minus_infinity(inside, normal_logpdf(z) - logs - math.log(self.log_sd))

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile."""
        return self.from_score(special.ndtri(p))

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement."""
        return self.from_score(-special.ndtri(q))

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score."""
        return exp(self.log_mean + self.log_sd * z)

    def score(self, x: Numeric) -> Numeric:
        """Score of a value; minus infinity for what is not positive."""
        values = np.asarray(x, dtype=float)[()]
        positive = values > 0.0
        z = (np.log(where(positive, values, 1.0)) - self.log_mean) / self.log_sd
        return where(positive, z, -math.inf)


@dataclass(frozen=True)
class Uniform(Marginal):
    """Uniform distribution between two bounds."""

    lower: float
    upper: float
    distribution: ClassVar[str] = "uniform"

    def __post_init__(self) -> None:
        require(math.isfinite(self.lower), "lower bound of a uniform", self.lower, "a number")
        allowed = f"a finite number above the lower bound {self.lower:g}"
        require(self.lower < self.upper < math.inf, "upper bound of a uniform", self.upper, allowed)

    @property
    def mean(self) -> float:
        """Mean."""
        return 0.5 * (self.lower + self.upper)

    @property
    def sd(self) -> float:
        """Standard deviation."""
        return (self.upper - self.lower) / math.sqrt(12.0)

    @property
    def support(self) -> tuple[float, float]:
        """The bounds."""
        return (self.lower, self.upper)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameters."""
        return {"lower": self.lower, "upper": self.upper}

    def cdf(self, x: Numeric) -> Numeric:
        """Distribution function."""
        return np.clip((np.asarray(x) - self.lower) / (self.upper - self.lower), 0.0, 1.0)[()]

    def sf(self, x: Numeric) -> Numeric:
        """Its complement."""
        return np.clip((self.upper - np.asarray(x)) / (self.upper - self.lower), 0.0, 1.0)[()]

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density."""
        values = np.asarray(x)
        inside = (values >= self.lower) & (values <= self.upper)
        return log_or_minus_infinity(inside, -math.log(self.upper - self.lower))

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile."""
        return self.lower + (self.upper - self.lower) * np.asarray(p, dtype=float)[()]

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement."""
        return self.upper - (self.upper - self.lower) * np.asarray(q, dtype=float)[()]

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score, measured from the nearer bound."""
        width = self.upper - self.lower
        return where(
            z < 0.0, self.lower + width * normal_cdf(z), self.upper - width * normal_cdf(-z)
        )

    def _bounds_in_words(self) -> str:
        return bounds_in_words(self.lower, self.upper)
