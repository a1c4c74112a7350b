"""Corrosion currents of places that were read more than once: onset and current integrated out."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from assess import operations as op
from assess.updating.corrosion_history import LEAST
from assess.updating.kind import FloatArray, IntArray, Numeric, Rows
from assess.updating.nested import local_posterior, nested_log_likelihood

# Scores of the local current for the trapezoidal rule: the probability is right to 1e-5 where the
# error of reading is a fifth of what the local current scatters, to 1e-2 where it is a tenth.
SCORES = np.linspace(-6.5, 6.5, 65)
_DENSITY = np.exp(-0.5 * SCORES**2)
WEIGHTS = _DENSITY / _DENSITY.sum()
IMPOSSIBLE = 1e6  # taken off a log-probability


@dataclass(frozen=True, slots=True, eq=False)
class Readings:
    """Readings of shared places in order of age, (n_place, n_visit), as numbers or in a graph.

    Where a place has fewer visits than another, its last one is repeated without saying anything.
    """

    value: Any  # ln of the reading, 0 where it is low or does not count
    precision: Any  # one over the variance of its error, 0 there
    low: Any  # 1 where the reading is below the passive limit and counts
    row: IntArray  # index into the rows
    limit: FloatArray  # ln of the passive limit
    error: FloatArray  # standard deviation of ln of a reading

    @staticmethod
    def from_data(data: Mapping[str, Numeric], rows: Rows, shared: NDArray[np.bool_]) -> "Readings":
        """Take the arrays of `data` back, as numbers or as graph variables."""
        row, _ = _visits(rows, shared)
        return Readings(
            value=data["corrosion_current_shared_value"],
            precision=data["corrosion_current_shared_precision"],
            low=data["corrosion_current_shared_low"],
            row=row,
            limit=rows.extra["limit"][row],
            error=np.sqrt(rows.extra["variance"][row]),
        )


def data(rows: Rows, shared: NDArray[np.bool_], stage: int) -> dict[str, NDArray[Any]]:
    """Arrange the readings of shared places, with later surveys switched off.

    Parameters
    ----------
    rows : Rows
        All readings.
    shared : ndarray of bool, shape (n_row,)
        Whether the row's place has others.
    stage : int
        Number of surveys that count.

    Returns
    -------
    dict of str to ndarray (n_place, n_visit)
        Under the names that `Readings.from_data` looks for.
    """
    row, once = _visits(rows, shared)
    active = once & (rows.stage[row] <= stage)
    read = active & np.isfinite(rows.value[row])
    return {
        "corrosion_current_shared_value": np.where(read, np.nan_to_num(rows.value[row]), 0.0),
        "corrosion_current_shared_precision": np.where(read, 1.0 / rows.extra["variance"][row], 0),
        "corrosion_current_shared_low": np.where(active & ~read, 1.0, 0.0),
    }


def log_likelihood(
    readings: Readings, centre: Numeric, variance: Numeric, score: Numeric
) -> Numeric:
    r"""Log-likelihood of the readings of each place.

    Parameters
    ----------
    readings : Readings
        Of n_place places.
    centre : numeric, shape (n_row,)
        Mean of ln of a reading of an active bar.
    variance : numeric, shape (n_row,)
        Of ln of the local current about the zone's.
    score : numeric, shape (n_row,)
        Standard normal score of ln of the survey's age among the zone's onsets.

    Returns
    -------
    numeric, shape (n_place,)
        Up to terms of the errors alone; 0 where nothing counts.

    Notes
    -----
    With visits at :math:`T_1 \le \dots \le T_m` the onset matters only by the interval that it
    lies in. If it lies before :math:`T_j` and not before :math:`T_{j-1}`, visits from j on see an
    active bar, and no earlier one may have read a current:

    .. math:: L = \sum_{j=1}^{m+1} [F(T_j) - F(T_{j-1})]\, 1[\text{no current read before } j]
              \, E_u \Big[ \prod_{k \ge j,\,read} N(y_k; \mu_k + u, e_k^2)
              \prod_{k \ge j,\,low} \Phi\Big(\frac{c_k - \mu_k - u}{e_k}\Big) \Big]

    with u normal in the zone. The currents that were read integrate in closed form
    (`nested_log_likelihood`); the product over the low ones is averaged over what they leave of
    u, by the trapezoidal rule, which converges fast on smooth functions that decay at both
    ends [1]_.

    References
    ----------
    .. [1] L. N. Trefethen, J. A. C. Weideman, The exponentially convergent trapezoidal rule, SIAM
       Rev. 56 (2014) 385-458.
    """
    visits = readings.row.shape[1]
    here, local_variance = centre[..., readings.row], variance[..., readings.row[:, 0]]
    residual = readings.value - here
    precision = readings.precision.sum(axis=1)
    weighted = readings.precision * residual
    weighted_sum = weighted.sum(axis=-1)
    density = nested_log_likelihood(
        precision, weighted_sum, (weighted * residual).sum(axis=-1), local_variance
    )
    mean, sd = local_posterior(precision, weighted_sum, 0.0, local_variance)
    local = mean[..., None] + sd[..., None] * SCORES
    # From the latest interval of the onset to the earliest: each adds one visit to the active.
    at = [score[..., readings.row[:, k]] for k in range(visits)]
    terms = [op.log_normal_cdf(-at[-1]) - _blocked(readings, visits)]
    low: Numeric = WEIGHTS
    for k in reversed(range(visits)):
        bound = (readings.limit[:, k, None] - here[..., k, None] - local) / readings.error[
            :, k, None
        ]
        counts = readings.low[:, k, None]
        low = low * (counts * op.normal_cdf(bound) + (1.0 - counts))
        inside = op.log_normal_cdf(at[0]) if k == 0 else _log_between(at[k - 1], at[k])
        all_low = op.log(op.maximum(low.sum(axis=-1), LEAST))
        terms.append(inside - _blocked(readings, k) + all_low)
    stacked = op.stack_last(terms)
    peak = stacked.max(axis=-1)
    total = peak + op.log(op.exp(stacked - peak[..., None]).sum(axis=-1))
    known = precision + readings.low.sum(axis=1)
    return op.where(known > 0.0, density + total, 0.0)


def _log_between(lower: Numeric, upper: Numeric) -> Numeric:
    """Logarithm of the normal probability between two scores, floored where there is none."""
    side = op.where(lower > 0.0, -1.0, 1.0)  # in the tail where neither is close to 1
    between = side * (op.normal_cdf(side * upper) - op.normal_cdf(side * lower))
    return op.log(op.maximum(between, LEAST))


def _blocked(readings: Readings, before: int) -> Numeric:
    """Take off where a current was read before a visit: the bar was active already."""
    if before == 0:
        return 0.0
    seen = readings.precision[:, :before].sum(axis=1)
    return op.where(seen > 0.0, IMPOSSIBLE, 0.0)


def _visits(rows: Rows, shared: NDArray[np.bool_]) -> tuple[IntArray, NDArray[np.bool_]]:
    """Row of each visit in order of age, (n_place, n_visit), and whether it is no repetition."""
    place = rows.place[shared]
    row = np.flatnonzero(shared)
    order = np.lexsort((rows.extra["age"][shared], place))
    _, start, count = np.unique(place[order], return_index=True, return_counts=True)
    visit = np.arange(int(count.max(initial=1)))
    once = visit < count[:, None]
    return row[order][start[:, None] + np.minimum(visit, count[:, None] - 1)], once
