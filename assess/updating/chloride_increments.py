"""Increments of chloride profiles: what they should hold, and what their contents say.

Contents are in percent of the binder's mass, depths in mm below the convection depth.
"""

from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy import special

from assess import operations as op
from assess.mechanics.chloride import mean_content, mean_penetration
from assess.updating.bounds import is_below

Numeric = Any  # float, ndarray or PyTensor variable
FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

LOG_LENGTH = (-7.0, 14.0)  # [ln mm] diffusion lengths beyond a micrometre and a kilometre say less
USUAL_LENGTH = 40.0  # [mm] where the search for a profile's own values starts
WEAK_SD = (2.0, 1.5)  # of ln surface content and ln diffusion about that start
SCAN_LENGTH = (5.0, 10.0, 20.0, 40.0, 80.0, 160.0)  # [mm]
SCAN_SURFACE = (0.0, 0.5, 1.0, 2.0)  # ln over the largest content
STEPS = 25
LONGEST_STEP = 1.5
LEAST_CONTENT = 1e-3  # [%]


@dataclass(frozen=True, slots=True, eq=False)
class Increments:
    """All increments, arrays of shape (n_row,)."""

    start: FloatArray  # [mm]
    end: FloatArray  # [mm]
    log_age: FloatArray  # [ln yr]
    initial: FloatArray  # content of the fresh concrete [%]
    variation: FloatArray  # coefficient of variation of a content as measured [-]
    absolute: FloatArray  # its standard deviation where there is no chloride [%]
    limit: FloatArray  # of detection, -inf for none [%]

    def content(self, log_surface: Numeric, log_apparent: Numeric) -> Numeric:
        """Give the mean content of each increment in percent, last axis row.

        Parameters
        ----------
        log_surface, log_apparent : numeric, last axis row
            Logarithms of the surface content [%] and of the apparent diffusion coefficient at
            the row's age [mm²/yr].
        """
        length = self._length(log_apparent)
        return mean_content(self.start, self.end, length, op.exp(log_surface), self.initial)

    def sd(self, content: Numeric) -> Numeric:
        """Give the standard deviation of a measured content about the true one, in percent."""
        relative = self.variation * content
        return op.sqrt(relative * relative + self.absolute**2)

    def _length(self, log_apparent: Numeric) -> Numeric:
        log_length = np.log(2.0) + 0.5 * (log_apparent + self.log_age)
        low, high = LOG_LENGTH
        return op.exp(op.maximum(op.minimum(log_length, high), low))

    def slopes(self, log_surface: FloatArray, log_apparent: FloatArray) -> tuple[FloatArray, ...]:
        """Give the content in percent and its derivatives by the two logarithms, each (n_row,)."""
        length, surface = self._length(log_apparent), np.exp(log_surface)
        near, far = self.start / length, self.end / length
        share = mean_penetration(self.start, self.end, length)
        # d ierfc(u) / du = -erfc(u), and u goes with the root of the coefficient inversely.
        by_log_u = (far * special.erfc(far) - near * special.erfc(near)) / (far - near) - share
        content = self.initial + (surface - self.initial) * share
        return content, surface * share, -0.5 * (surface - self.initial) * by_log_u


class Summary(NamedTuple):
    """What each profile says of (ln surface content, ln apparent coefficient), as a normal.

    The log-likelihood of profile v is about ``-x' precision[v] x / 2 + linear[v]' x``.
    """

    precision: FloatArray  # (n_visit, 2, 2)
    linear: FloatArray  # (n_visit, 2)


def summarise(
    increments: Increments, value: FloatArray, active: BoolArray, visit: IntArray, count: int
) -> Summary:
    """Approximate each profile's likelihood by a normal one about its best values.

    Parameters
    ----------
    increments : Increments
        All of them.
    value : ndarray, shape (n_row,)
        Measured contents, with marks of `assess.updating.bounds`. [%]
    active : ndarray of bool, shape (n_row,)
        Rows that count.
    visit : ndarray of int, shape (n_row,)
        Profile of each row.
    count : int
        Number of profiles.

    Returns
    -------
    Summary
        Zero for a profile none of whose rows counts. The precision is never negative.

    Notes
    -----
    Fisher scoring with Levenberg's damping, all profiles at once, from the best of a few starts;
    a wide normal about the start keeps profiles that say little from running away, and is taken
    out of the result. Nothing rests on the approximation but the speed of sampling.

    References
    ----------
    .. [1] J. Nocedal, S. J. Wright, Numerical Optimization, 2nd ed., 2006, section 10.3.
    """
    problem = _Fit(
        increments, value, active, visit, _usual(increments, value, active, visit, count)
    )
    at = problem.start()
    target, gradient, precision = problem.evaluate(at)
    damping = np.full(count, 1e-2)
    for _ in range(STEPS):
        system = precision + problem.weak + damping[:, None, None] * np.eye(2)
        pull = gradient - (problem.weak @ (at - problem.centre)[..., None])[..., 0]
        step = np.linalg.solve(system, pull[..., None])[..., 0]
        trial = at + np.clip(step, -LONGEST_STEP, LONGEST_STEP)
        found = problem.evaluate(trial)
        better = found[0] > target
        at = np.where(better[:, None], trial, at)
        target = np.where(better, found[0], target)
        gradient = np.where(better[:, None], found[1], gradient)
        precision = np.where(better[:, None, None], found[2], precision)
        damping = np.where(better, 0.2 * damping, np.minimum(10.0 * damping, 1e6))
    return Summary(precision, (precision @ at[..., None])[..., 0] + gradient)


def _usual(
    increments: Increments, value: FloatArray, active: BoolArray, visit: IntArray, count: int
) -> FloatArray:
    """Give the values where the search for each profile starts, (n_visit, 2)."""
    some = np.where(np.isfinite(value), value, increments.limit)
    largest = np.full(count, LEAST_CONTENT)
    np.maximum.at(largest, visit, np.where(active, some, LEAST_CONTENT))
    log_age = np.zeros(count)
    log_age[visit] = increments.log_age
    return np.column_stack([np.log(largest), 2.0 * np.log(0.5 * USUAL_LENGTH) - log_age])


@dataclass(frozen=True, slots=True, eq=False)
class _Fit:
    """Log-likelihoods of all profiles as functions of their two values."""

    increments: Increments
    value: FloatArray
    active: BoolArray
    visit: IntArray
    centre: FloatArray  # (n_visit, 2)

    @property
    def weak(self) -> FloatArray:
        """Precision of the wide normal about the centre, (2, 2)."""
        return np.diag(1.0 / np.square(WEAK_SD))

    def start(self) -> FloatArray:
        """Best of a few surface contents and diffusion lengths, (n_visit, 2)."""
        best, at = np.full(len(self.centre), -np.inf), self.centre
        for length in SCAN_LENGTH:
            for surface in SCAN_SURFACE:
                trial = self.centre + [surface, 2.0 * np.log(length / USUAL_LENGTH)]
                target, _, _ = self.evaluate(trial)
                better = target > best
                best, at = np.where(better, target, best), np.where(better[:, None], trial, at)
        return at

    def evaluate(self, at: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Log-likelihood with the weak normal; gradient and precision without it."""
        rows = self.increments
        content, *slopes = rows.slopes(*at[self.visit].T)
        below = is_below(self.value)
        known = np.where(below, rows.limit, np.nan_to_num(self.value))
        sd = rows.sd(content)
        growth = rows.variation**2 * content / sd**2  # of ln sd with the content
        score = (known - content) / sd
        slope = -1.0 / sd - score * growth  # of the score with the content
        # The slope of ln Phi, and its curvature, which lies between 0 and 1 but for rounding.
        hazard = np.exp(op.normal_logpdf(score) - special.log_ndtr(score))
        bend = np.clip(hazard * (hazard + score), 0.0, 1.0)
        weight = np.where(self.active, 1.0, 0.0)
        log_density = np.where(below, special.log_ndtr(score), op.normal_logpdf(score) - np.log(sd))
        pull = np.where(below, hazard * slope, -score * slope - growth)
        # Of a reading the expected curvature, of a bound the one at hand.
        curvature = np.where(below, bend * slope**2, 1.0 / sd**2 + 2.0 * growth**2)
        gradient = [self._sum(weight * pull * a) for a in slopes]
        precision = [[self._sum(weight * curvature * a * b) for a in slopes] for b in slopes]
        away = at - self.centre
        weak = 0.5 * np.einsum("vi,ij,vj->v", away, self.weak, away)
        return (
            self._sum(weight * log_density) - weak,
            np.stack(gradient, axis=-1),
            np.moveaxis(np.array(precision), -1, 0),
        )

    def _sum(self, row: FloatArray) -> FloatArray:
        return np.bincount(self.visit, row, len(self.centre))
