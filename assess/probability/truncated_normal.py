"""Normal distribution cut off at one or two bounds."""

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from scipy import special

from assess.operations import Numeric, is_symbolic, normal_cdf, normal_logpdf, normal_ppf, where
from assess.probability.marginal import Marginal, bounds_in_words, log_or_minus_infinity, require

# Bounds further out than this leave nothing, or cut nothing, in double precision.
FARTHEST_BOUND = 37.0
# Below this product of distance and (1 + |bound|) the fourth-order series is exact to 1e-16.
SERIES_LIMIT = 1e-4


def normal_mass(low: float, high: float) -> float:
    """Probability of a standard normal value between two bounds, from the nearer tail."""
    if low > 0.0:
        return float(special.ndtr(-low) - special.ndtr(-high))
    return float(special.ndtr(high) - special.ndtr(low))


def truncated_moments(
    location: float, scale: float, lower: float, upper: float
) -> tuple[float, float]:
    """Mean and standard deviation of a truncated normal distribution.

    Parameters
    ----------
    location, scale : float
        Mean and standard deviation before truncation, in the unit of the variable.
    lower, upper : float
        Bounds; may be infinite.

    Returns
    -------
    tuple of float
        Mean and standard deviation after truncation.

    References
    ----------
    .. [1] N. L. Johnson, S. Kotz, N. Balakrishnan, Continuous Univariate Distributions, vol. 1,
       2nd ed., Wiley 1994, chapter 13.
    """
    low, high = (lower - location) / scale, (upper - location) / scale
    mass = normal_mass(low, high)
    at_low, at_high = (math.exp(normal_logpdf(b)) if math.isfinite(b) else 0.0 for b in (low, high))
    shift = (at_low - at_high) / mass
    tails = (low * at_low if at_low else 0.0) - (high * at_high if at_high else 0.0)
    variance = 1.0 + tails / mass - shift * shift
    return location + scale * shift, scale * math.sqrt(max(variance, 0.0))


def _distance_from_bound(mass: Numeric, bound: float) -> Numeric:
    """Distance above a bound that holds a small mass, in units of the density at the bound.

    Taylor series of the normal quantile about the bound; its derivatives by the density are
    1, b, 1 + 2b², 7b + 6b³ (derived by differentiating dt/dp = 1/phi(t)).
    """
    third, fourth = (1.0 + 2.0 * bound**2) / 6.0, (7.0 * bound + 6.0 * bound**3) / 24.0
    return mass * (1.0 + mass * (0.5 * bound + mass * (third + mass * fourth)))


@dataclass(frozen=True)
class TruncatedNormal(Marginal):
    """Normal distribution cut off at ``lower`` and ``upper``.

    Parameters
    ----------
    location, scale : float
        Mean and standard deviation before the cut; `mean` and `sd` are those after it.
    lower, upper : float
        Bounds; one of them may be infinite, or both.
    """

    location: float
    scale: float
    lower: float = -math.inf
    upper: float = math.inf
    distribution: ClassVar[str] = "truncated normal"

    def __post_init__(self) -> None:
        require(math.isfinite(self.location), "location", self.location, "a finite number")
        require(0.0 < self.scale < math.inf, "scale", self.scale, "a positive number")
        allowed = f"a number above the lower bound {self.lower:g}"
        require(self.lower < self.upper, "upper bound of a truncated normal", self.upper, allowed)
        near_enough = f"within {FARTHEST_BOUND:g} scales of the location {self.location:g}"
        lowest, highest = self._standard_bounds
        require(lowest < FARTHEST_BOUND, "lower bound", self.lower, near_enough)
        require(highest > -FARTHEST_BOUND, "upper bound", self.upper, near_enough)

    @property
    def mean(self) -> float:
        """Mean after truncation."""
        return truncated_moments(self.location, self.scale, self.lower, self.upper)[0]

    @property
    def sd(self) -> float:
        """Standard deviation after truncation."""
        return truncated_moments(self.location, self.scale, self.lower, self.upper)[1]

    @property
    def support(self) -> tuple[float, float]:
        """The bounds."""
        return (self.lower, self.upper)

    @property
    def parameters(self) -> dict[str, float]:
        """Native parameters and bounds."""
        return {
            "location": self.location,
            "scale": self.scale,
            "lower": self.lower,
            "upper": self.upper,
        }

    @property
    def _standard_bounds(self) -> tuple[float, float]:
        low, high = self.lower - self.location, self.upper - self.location
        return low / self.scale, high / self.scale

    def cdf(self, x: Numeric) -> Numeric:
        """Distribution function, also relatively accurate close to the lower bound."""
        values = np.clip(np.asarray(x, dtype=float), self.lower, self.upper)
        below = self._mass_beyond(values, lower=True)
        return np.clip(below, 0.0, 1.0)[()]

    def sf(self, x: Numeric) -> Numeric:
        """Its complement, also relatively accurate close to the upper bound."""
        values = np.clip(np.asarray(x, dtype=float), self.lower, self.upper)
        above = self._mass_beyond(values, lower=False)
        return np.clip(above, 0.0, 1.0)[()]

    def _mass_beyond(self, values: Numeric, *, lower: bool) -> Numeric:
        """Probability between a bound and a value; the upper bound is treated by reflection."""
        low, high = self._standard_bounds
        bound, sign = (low, 1.0) if lower else (-high, -1.0)
        total = normal_mass(low, high)
        standard = sign * (values - self.location) / self.scale
        in_lower_half = special.ndtr(standard) - special.ndtr(bound)
        in_upper_half = special.ndtr(-bound) - special.ndtr(-standard)
        direct = where(standard > 0.0, in_upper_half, in_lower_half) / total
        if abs(bound) > FARTHEST_BOUND:
            return direct
        distance = sign * (values - (self.lower if lower else self.upper)) / self.scale
        near = distance * (1.0 + abs(bound)) < SERIES_LIMIT
        s = where(near, distance, 0.0)
        # Taylor series of the normal distribution function: Hermite polynomials of the bound.
        third, fourth = (bound**2 - 1.0) / 6.0, (bound**3 - 3.0 * bound) / 24.0
        series = s * (1.0 - s * (0.5 * bound - s * (third - s * fourth)))
        return where(near, series * math.exp(normal_logpdf(bound)) / total, direct)

    def logpdf(self, x: Numeric) -> Numeric:
        """Logarithm of the density."""
        values = np.asarray(x, dtype=float)[()]
        inside = (values >= self.lower) & (values <= self.upper)
        log_mass = math.log(normal_mass(*self._standard_bounds))
        density = normal_logpdf((values - self.location) / self.scale) - math.log(self.scale)
        return log_or_minus_infinity(inside, density - log_mass)

    def ppf(self, p: Numeric) -> Numeric:
        """Quantile."""
        probability = np.asarray(p, dtype=float)[()]
        return self._from_masses(probability, 1.0 - probability)

    def isf(self, q: Numeric) -> Numeric:
        """Quantile of the complement."""
        probability = np.asarray(q, dtype=float)[()]
        return self._from_masses(1.0 - probability, probability)

    def from_score(self, z: Numeric) -> Numeric:
        """Value of a score."""
        return self._from_masses(normal_cdf(z), normal_cdf(-z))

    def _from_masses(self, below: Numeric, above: Numeric) -> Numeric:
        """Value with given probabilities on its two sides; sums of positive terms only."""
        low, high = self._standard_bounds
        cdf = float(special.ndtr(low)) * above + float(special.ndtr(high)) * below
        sf = float(special.ndtr(-low)) * above + float(special.ndtr(-high)) * below
        in_lower_half = cdf < 0.5
        # Each branch sees only its own half, so that neither meets an infinite quantile; an
        # exact 0, which numbers may ask for, is infinite on purpose.
        from_below = normal_ppf(where(in_lower_half, cdf, 0.25))
        from_above = -normal_ppf(where(in_lower_half, 0.25, sf))
        standard = where(in_lower_half, from_below, from_above)
        x = self.location + self.scale * standard
        if not is_symbolic(x):
            x = np.clip(x, self.lower, self.upper)[()]
        x = self._close_to_bound(x, above, lower=False)
        return self._close_to_bound(x, below, lower=True)

    def _close_to_bound(self, x: Numeric, probability: Numeric, *, lower: bool) -> Numeric:
        """Replace values close to a bound, where the difference of quantiles cancels."""
        low, high = self._standard_bounds
        bound = low if lower else -high
        if abs(bound) > FARTHEST_BOUND:
            return x
        mass = probability * (normal_mass(low, high) / math.exp(normal_logpdf(bound)))
        near = mass * (1.0 + abs(bound)) < SERIES_LIMIT
        distance = self.scale * _distance_from_bound(where(near, mass, 0.0), bound)
        return where(near, self.lower + distance if lower else self.upper - distance, x)

    def _bounds_in_words(self) -> str:
        return bounds_in_words(self.lower, self.upper)
