"""How a section stands against its target."""

import numpy as np
from numpy.typing import NDArray

from assess.decisions.results import IndexCurve, Standing, Target, Verdict
from assess.reliability.index import probability_from_index

FloatArray = NDArray[np.float64]

INTERVAL = (0.05, 0.95)
LEAST_LOAD_FACTOR = 0.1  # below it a load limit is a closure and is not offered as a limit


def crossing(
    curve: IndexCurve,
    conditional: FloatArray,
    target: Target,
    draw_weight: FloatArray | None = None,
) -> tuple[int | None, int | None, int | None]:
    """Year in which the target is first missed, with its interval over the draws.

    Parameters
    ----------
    curve : IndexCurve
        Of the target's reference period.
    conditional : ndarray, shape (n_draw, n_year)
        Failure probability given each draw, for the same windows.
    target : Target
        Required index.
    draw_weight : ndarray, shape (n_draw,), optional
        Weights of draws that are not alike.

    Returns
    -------
    tuple of int or None
        The year from the predictive index and the 5 % and 95 % quantiles of the year given the
        draw; None stands for after the horizon.
    """
    allowed = float(probability_from_index(target.index))
    below = np.flatnonzero(curve.index < target.index)
    year = int(curve.year[below[0]]) if len(below) else None
    missed = conditional > allowed
    never = len(curve.year)
    first = np.where(missed.any(axis=1), missed.argmax(axis=1), never)
    low, high = np.quantile(first, INTERVAL, method="inverted_cdf", weights=draw_weight).astype(int)
    return (
        year,
        int(curve.year[low]) if low < never else None,
        int(curve.year[high]) if high < never else None,
    )


def verdict(
    curve: IndexCurve,
    conditional: FloatArray,
    target: Target,
    load_factor: float | None,
    governing: str,
    draw_weight: FloatArray | None = None,
) -> Verdict:
    """Judge a section against its target.

    Parameters
    ----------
    curve, conditional, target
        As in `crossing`.
    load_factor : float or None
        Factor on the variable load that just meets the target now.
    governing : str
        Group of variables that failure comes from, in words.
    draw_weight : ndarray, shape (n_draw,), optional
        Weights of draws that are not alike.

    Returns
    -------
    Verdict
        One of the four standings, with the crossing year and its interval.
    """
    year, low, high = crossing(curve, conditional, target, draw_weight)
    if year is None:
        standing = Standing.MEETS
    elif curve.index[0] >= target.index:
        standing = Standing.MEETS_UNTIL
    elif load_factor is not None and load_factor >= LEAST_LOAD_FACTOR:
        standing = Standing.BELOW_LIMITABLE
    else:
        standing = Standing.BELOW
    allowed = float(probability_from_index(target.index))
    return Verdict(
        standing,
        year,
        low,
        high,
        float(np.average(conditional[:, -1] > allowed, weights=draw_weight)),
        load_factor,
        governing,
    )
