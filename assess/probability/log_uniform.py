"""Log-uniform distribution: every factor is as likely as any other of the same size."""

import math
from dataclasses import dataclass
from functools import cached_property
from typing import ClassVar

import numpy as np

from assess.operations import Numeric, exp
from assess.probability.closed_form import Uniform
from assess.probability.marginal import Marginal, bounds_in_words, log_or_minus_infinity, require


@dataclass(frozen=True)
class LogUniform(Marginal):
    """Distribution whose logarithm is uniform, with density 1/x between two bounds.

    The reference prior of a scale parameter, cut off where no value can be.

    References
    ----------
    .. [1] H. Jeffreys, Theory of Probability, 3rd ed., 1961, section 3.1.
    """

    lower: float
    upper: float
    distribution: ClassVar[str] = "log-uniform"

    def __post_init__(self) -> None:
        require(self.lower > 0.0, "lower bound of a log-uniform", self.lower, "above 0")
        allowed = f"a finite number above the lower bound {self.lower:g}"
        require(
            self.lower < self.upper < math.inf, "upper bound of a log-uniform", self.upper, allowed
        )

    @cached_property
    def _logarithm(self) -> Uniform:
        return Uniform(math.log(self.lower), math.log(self.upper))

    @property
    def mean(self) -> float:
        """Mean."""
        return (self.upper - self.lower) / math.log(self.upper / self.lower)

    @property
    def sd(self) -> float:
        """Standard deviation."""
        square = (self.upper**2 - self.lower**2) / (2.0 * math.log(self.upper / self.lower))
        return math.sqrt(max(square - self.mean**2, 0.0))

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
        return self._logarithm.cdf(self._log(x))

    def sf(self, x: Numeric) -> Numeric:
        """Its complement."""
        return self._logarithm.sf(self._log(x))

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density."""
        values = np.asarray(x, dtype=np.float64)
        inside = (values >= self.lower) & (values <= self.upper)
        log_x = np.log(np.where(inside, values, 1.0))
        return log_or_minus_infinity(inside, -log_x - math.log(math.log(self.upper / self.lower)))

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile."""
        return exp(self._logarithm.ppf(p))

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement."""
        return exp(self._logarithm.isf(q))

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score."""
        return exp(self._logarithm.from_score(z))

    @staticmethod
    def _log(x: Numeric) -> Numeric:
        return np.log(np.maximum(np.asarray(x, dtype=np.float64), 1e-300))[()]

    def _bounds_in_words(self) -> str:
        return bounds_in_words(self.lower, self.upper)
