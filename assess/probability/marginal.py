"""What every marginal distribution offers, whatever its family."""

import math
from abc import ABC, abstractmethod
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray
from scipy import special

from assess.operations import Numeric, where

FloatArray = NDArray[np.float64]


class Marginal(ABC):
    r"""Distribution of one variable, and its map to and from standard normal scores.

    A marginal is frozen. It is made by `assess.probability.marginals.make_marginal`.

    Notes
    -----
    The score of a value is :math:`z = \Phi^{-1}(F(x))`. Both directions are computed from the
    nearer tail, so they keep their accuracy for scores between -8.2 and 8.2 (probabilities down
    to 1e-16 on either side), as far as a floating-point number can hold the value: close to a
    bound other than zero a value is no finer than the bound's own last digit.

    References
    ----------
    .. [1] N. L. Johnson, S. Kotz, N. Balakrishnan, Continuous Univariate Distributions, vols. 1
       and 2, 2nd ed., Wiley 1994 and 1995 (the families and their moments).
    """

    distribution: ClassVar[str]

    @property
    @abstractmethod
    def mean(self) -> float:
        """Mean, in the unit of the variable."""

    @property
    @abstractmethod
    def sd(self) -> float:
        """Standard deviation, in the unit of the variable."""

    @property
    @abstractmethod
    def support(self) -> tuple[float, float]:
        """Smallest and largest possible value; may be infinite."""

    @property
    @abstractmethod
    def parameters(self) -> dict[str, float]:
        """Native parameters by name, as `make_marginal` takes them, bounds included."""

    @abstractmethod
    def cdf(self, x: Numeric) -> Numeric:
        """Probability of a value at most ``x``."""

    @abstractmethod
    def sf(self, x: Numeric) -> Numeric:
        """Probability of a value above ``x``, relatively accurate in the upper tail."""

    @abstractmethod
    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density; minus infinity outside the support."""

    @abstractmethod
    def ppf(self, p: Numeric) -> Numeric:
        """Value that is not exceeded with probability ``p``, for ``p`` in [0, 1]."""

    @abstractmethod
    def isf(self, q: Numeric) -> Numeric:
        """Value that is exceeded with probability ``q``, accurate for the smallest ``q``."""

    @abstractmethod
    def from_score(self, z: Numeric) -> Numeric:
        r"""Map standard normal scores to values, :math:`F^{-1}(\Phi(z))`.

        Parameters
        ----------
        z : numeric
            Standard normal scores, any shape; a PyTensor variable gives a graph that can be
            differentiated. [-]

        Returns
        -------
        numeric
            Values of the same shape, in the unit of the variable.
        """

    def score(self, x: Numeric) -> Numeric:
        r"""Map values to standard normal scores, :math:`\Phi^{-1}(F(x))`; numbers only.

        Parameters
        ----------
        x : numeric
            Values, any shape. A value at a bound has an infinite score.

        Returns
        -------
        numeric
            Scores of the same shape. [-]
        """
        below = self.cdf(x)
        return where(below < 0.5, special.ndtri(below), -special.ndtri(self.sf(x)))

    @property
    def V(self) -> float:
        """Coefficient of variation, sd over absolute mean; infinite for a mean of zero."""
        return self.sd / abs(self.mean) if self.mean != 0.0 else math.inf

    def random(self, rng: np.random.Generator, size: int | tuple[int, ...]) -> FloatArray:
        """Draw independent values.

        Parameters
        ----------
        rng : numpy.random.Generator
            Source of random numbers.
        size : int or tuple of int
            Shape of the result.

        Returns
        -------
        ndarray
            Values of that shape, in the unit of the variable.
        """
        return np.asarray(self.from_score(rng.standard_normal(size)), dtype=np.float64)

    def describe(self) -> str:
        """Say in short words what the distribution is, such as ``lognormal, mean 35, V 0.5``."""
        if not math.isfinite(self.sd):
            return self._in_parameters()
        spread = f"V {self.V:.3g}" if self.mean > 0.0 else f"sd {self.sd:.4g}"
        words = f"{self.distribution}, mean {self.mean:.4g}, {spread}"
        return words + self._bounds_in_words()

    def _bounds_in_words(self) -> str:
        return ""

    def _in_parameters(self) -> str:
        listed = ", ".join(f"{name} {value:.4g}" for name, value in self.parameters.items())
        return f"{self.distribution}, {listed}"


def bounds_in_words(lower: float, upper: float) -> str:
    """Give ``, from 0.2 to 2``, leaving out what is infinite."""
    words = f", from {lower:.4g}" if math.isfinite(lower) else ""
    if math.isfinite(upper):
        words += f" to {upper:.4g}" if words else f", up to {upper:.4g}"
    return words


def log_or_minus_infinity(inside: Numeric, log_density: Numeric) -> Numeric:
    """Keep a log density where ``inside`` holds, minus infinity elsewhere."""
    return where(inside, log_density, -math.inf)


def require(condition: bool, what: str, given: float, allowed: str, hint: str = "") -> None:
    """Refuse a number with what it is, the value given and what is allowed.

    Raises
    ------
    ValueError
        When ``condition`` does not hold.
    """
    if not condition:
        raise ValueError(f"{what}: given {given:g}, allowed {allowed}{hint}")
