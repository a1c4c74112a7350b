"""Local variables of a section: what is left to chance there once a draw is given."""

from abc import ABC, abstractmethod
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import special

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

SCORES = np.linspace(-8.0, 8.0, 161)  # nodes of a tabulated quantile function


class LocalModel(ABC):
    """Some local variables of one section, given each draw, as a map from standard normals.

    ``names`` are the variables that come out; ``normals`` those that go in, each named after the
    variable whose uncertainty it carries most directly.
    """

    names: tuple[str, ...]
    normals: tuple[str, ...]

    @abstractmethod
    def values(self, z: FloatArray, draws: IntArray) -> dict[str, FloatArray]:
        """Map standard normals to physical local values.

        Parameters
        ----------
        z : ndarray, shape (n, k, len(normals))
            Independent standard normals; the first axis goes with the chosen draws.
        draws : ndarray of int, shape (n,)
            Which draws the first axis of ``z`` stands for.

        Returns
        -------
        dict of str to ndarray (n, k)
            Values in the units of the variables.
        """

    @abstractmethod
    def without_dependence(self, rng: np.random.Generator) -> "LocalModel":
        """Keep each variable's own distribution and drop what ties it to the draws."""


@dataclass(frozen=True, slots=True, eq=False)
class Local(LocalModel):
    """One normal local variable given each draw.

    Attributes
    ----------
    name : str
        Of the variable.
    mean, sd : ndarray, shape (n_draw,)
        Of the variable, or of its logarithm.
    logarithm : bool
        Whether the normal distribution is that of the logarithm.
    """

    name: str
    mean: FloatArray
    sd: FloatArray
    logarithm: bool = False

    @property
    def names(self) -> tuple[str, ...]:  # type: ignore[override]
        """The variable."""
        return (self.name,)

    @property
    def normals(self) -> tuple[str, ...]:  # type: ignore[override]
        """One standard normal."""
        return (self.name,)

    def values(self, z: FloatArray, draws: IntArray) -> dict[str, FloatArray]:
        """Map standard normals to local values."""
        value = self.mean[draws][:, None] + self.sd[draws][:, None] * z[..., 0]
        return {self.name: np.exp(value) if self.logarithm else value}

    def without_dependence(self, rng: np.random.Generator) -> "Local":
        """Permute the draws."""
        return take(self, rng.permutation(len(self.mean)))


@dataclass(frozen=True, slots=True, eq=False)
class TabulatedLocal(LocalModel):
    """One local variable given each draw by its quantiles at the scores `SCORES`.

    Attributes
    ----------
    name : str
        Of the variable.
    table : ndarray, shape (n_draw, n_score)
        Values of the variable.
    """

    name: str
    table: FloatArray

    @property
    def names(self) -> tuple[str, ...]:  # type: ignore[override]
        """The variable."""
        return (self.name,)

    @property
    def normals(self) -> tuple[str, ...]:  # type: ignore[override]
        """One standard normal."""
        return (self.name,)

    def values(self, z: FloatArray, draws: IntArray) -> dict[str, FloatArray]:
        """Map standard normals to local values."""
        return {self.name: look_up(self.table, z[..., 0], draws)}

    def without_dependence(self, rng: np.random.Generator) -> "TabulatedLocal":
        """Permute the draws."""
        return take(self, rng.permutation(len(self.table)))


def take[T: Any](record: T, order: IntArray) -> T:
    """Reorder the draws of a record whose arrays all have the draws as first axis."""
    arrays = {
        field.name: getattr(record, field.name)[order]
        for field in fields(record)
        if isinstance(getattr(record, field.name), np.ndarray)
    }
    return replace(record, **arrays)


def look_up(table: FloatArray, z: FloatArray, draws: IntArray) -> FloatArray:
    """Interpolate tabulated quantiles linearly in the score.

    Parameters
    ----------
    table : ndarray, shape (n_draw, n_score)
        Quantiles at `SCORES`.
    z : ndarray, shape (n, k)
        Scores; beyond the table its end holds.
    draws : ndarray of int, shape (n,)
        Rows of the table that the first axis of ``z`` stands for.

    Returns
    -------
    ndarray, shape (n, k)
        Quantiles.
    """
    position = np.clip(
        (z - SCORES[0]) * ((len(SCORES) - 1) / (SCORES[-1] - SCORES[0])), 0.0, len(SCORES) - 1.0
    )
    cell = np.minimum(position.astype(np.int64), len(SCORES) - 2)
    share = position - cell
    rows = draws[:, None]
    return np.asarray(table[rows, cell] * (1.0 - share) + table[rows, cell + 1] * share)


def scores_of_density(
    grid: FloatArray, log_density: FloatArray, log_beyond: FloatArray | float = -np.inf
) -> tuple[FloatArray, FloatArray]:
    """Give the scores of grid points under a tabulated density, exact in both tails.

    Parameters
    ----------
    grid : ndarray, shape (n_draw, n_grid) or (n_grid,)
        Increasing points.
    log_density : ndarray, shape (n_draw, n_grid)
        Log-density at them, up to one constant per draw.
    log_beyond : ndarray, shape (n_draw,), or float
        Log-mass beyond the last point, up to the same constant.

    Returns
    -------
    tuple of ndarray
        Scores (n_draw, n_grid), from minus infinity at the first point on, and the share of the
        mass that lies beyond the last point, (n_draw,).

    Notes
    -----
    Masses of the cells follow the trapezoidal rule; the lower tail is summed from below and the
    upper one from above, so that neither loses digits.
    """
    beyond = np.broadcast_to(np.asarray(log_beyond, dtype=np.float64), log_density.shape[:1])
    peak = np.maximum(log_density.max(axis=1), beyond)[:, None]
    density = np.exp(log_density - peak)
    cells = 0.5 * (density[:, 1:] + density[:, :-1]) * np.diff(grid, axis=-1)
    tail = np.exp(beyond - peak[:, 0])
    zero = np.zeros((len(cells), 1))
    below = np.concatenate([zero, np.cumsum(cells, axis=1)], axis=1)
    above = np.concatenate([np.cumsum(cells[:, ::-1], axis=1)[:, ::-1], zero], axis=1)
    above = above + tail[:, None]
    total = (below[:, -1] + tail)[:, None]
    below, above = below / total, above / total
    with np.errstate(divide="ignore"):
        scores = np.where(below < 0.5, special.ndtri(below), -special.ndtri(above))
    return scores, tail / total[:, 0]


def quantile_table(grid: FloatArray, scores: FloatArray) -> FloatArray:
    """Tabulate quantiles at `SCORES` from the scores of grid points.

    Parameters
    ----------
    grid : ndarray, shape (n_draw, n_grid) or (n_grid,)
        Increasing points.
    scores : ndarray, shape (n_draw, n_grid)
        Their scores, from `scores_of_density`.

    Returns
    -------
    ndarray, shape (n_draw, n_score)
        Linear in the score between grid points; the ends hold beyond them.
    """
    points = np.broadcast_to(grid, scores.shape)
    table = np.empty((len(scores), len(SCORES)))
    for row, (score, point) in enumerate(zip(scores, points, strict=True)):
        usable = np.isfinite(score)
        table[row] = np.interp(SCORES, score[usable], point[usable])
    return table


def truncated_score(z: FloatArray, low: FloatArray, high: FloatArray) -> FloatArray:
    """Map standard normals to normals truncated to ``low..high``, exact in both tails.

    Parameters
    ----------
    z, low, high : ndarray
        Broadcast; bounds in standard units, possibly infinite.

    Returns
    -------
    ndarray
        Truncated standard normal values.

    Notes
    -----
    Where the window lies above zero it is reflected, so that probabilities are taken in the
    tail where they are small.
    """
    side = np.where(low > 0.0, -1.0, 1.0)
    near, far = np.where(side > 0.0, low, -high), np.where(side > 0.0, high, -low)
    share = special.ndtr(side * z)
    start, end = special.ndtr(near), special.ndtr(far)
    inside = np.clip(start + share * (end - start), 1e-300, 1.0 - 1e-16)
    return np.asarray(np.clip(side * special.ndtri(inside), low, high))
