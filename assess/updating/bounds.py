"""Readings of which only a bound is known: how they are told apart, and where they would begin.

A row that was not read has the value NaN; its sign bit says on which side the reading lies, so
that simulated readings, which are nothing but values, say it too.
"""

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

BELOW = float(np.copysign(np.nan, -1.0))  # less than the row's lower limit
BEYOND = float(np.copysign(np.nan, 1.0))  # more than the row's upper limit


def is_below(value: FloatArray) -> BoolArray:
    """Tell which readings lie below their lower limit."""
    return np.asarray(np.isnan(value) & np.signbit(value))


def is_beyond(value: FloatArray) -> BoolArray:
    """Tell which readings lie beyond their upper limit."""
    return np.asarray(np.isnan(value) & ~np.signbit(value))


def bounded(reading: FloatArray, lower: FloatArray, upper: FloatArray) -> FloatArray:
    """Put the marks of this module in place of readings outside their limits; shapes broadcast."""
    inside = np.where(reading > upper, BEYOND, reading)
    return np.asarray(np.where(reading < lower, BELOW, inside))


def marked(value: FloatArray, below: FloatArray, beyond: FloatArray | float = np.nan) -> FloatArray:
    """Put marks where a row says a bound (``below`` and ``beyond``, NaN elsewhere)."""
    over = np.where(np.isfinite(beyond), BEYOND, value)
    return np.asarray(np.where(np.isfinite(below), BELOW, over))


def shifted(value: FloatArray, amount: FloatArray) -> FloatArray:
    """Add to what was read and keep the marks, which arithmetic would not promise to do."""
    return np.asarray(np.where(np.isfinite(value), value + amount, value))


def lower_limits(value: FloatArray, below: FloatArray, stated: float | None = None) -> FloatArray:
    """Give the limit under which each row of a table is, or would have been, a bound.

    Parameters
    ----------
    value : ndarray, shape (n_row,)
        What was read, NaN elsewhere.
    below : ndarray, shape (n_row,)
        The bounds that rows say, NaN elsewhere.
    stated : float, optional
        Limit that holds for all rows that say none of their own.

    Returns
    -------
    ndarray, shape (n_row,)
        Each row's own bound, else the stated limit, else the largest bound of the table, as
        laboratories use one method for all: but none (``-inf``) where a smaller value was read.
    """
    said = below[np.isfinite(below)]
    common = np.max(said, initial=-np.inf) if stated is None else stated
    rest = np.where(value < common, -np.inf, common)
    return np.asarray(np.where(np.isfinite(below), below, rest))


def upper_limits(value: FloatArray, beyond: FloatArray) -> FloatArray:
    """Give the limit over which each row of a table is, or would have been, a bound.

    Parameters
    ----------
    value : ndarray, shape (n_row,)
        What was read, NaN elsewhere.
    beyond : ndarray, shape (n_row,)
        The bounds that rows say, NaN elsewhere.

    Returns
    -------
    ndarray, shape (n_row,)
        Each row's own bound, else the least bound of the table; none (``inf``) where a larger
        value was read.
    """
    said = beyond[np.isfinite(beyond)]
    common = np.min(said, initial=np.inf)
    rest = np.where(value > common, np.inf, common)
    return np.asarray(np.where(np.isfinite(beyond), beyond, rest))
