"""Repeated readings with Student-t errors: the local value integrated out by quadrature."""

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from assess import operations as op

Numeric = Any  # float, ndarray or PyTensor variable
FloatArray = NDArray[np.float64]

# Points u = centre + scale sinh(x) about every reading and about the population; the rule is right
# to 1e-6 of the integral for readings up to 40 of their errors apart, see the tests.
GRID = np.linspace(-7.0, 7.0, 113)
_STEP = GRID[1] - GRID[0]
_SHIFT, _STRETCH = np.sinh(GRID), np.cosh(GRID)
TABLE_REACH, TABLE_POINTS = 5.0, 81  # of the points about each peak of a tabulated density
SHARPNESS = 6  # a peak belongs to the points about it, and hardly to those of another


class Readings(NamedTuple):
    """Readings of n_place places, padded to the largest number at one, last axis reading."""

    value: Numeric  # (..., n_place, n_reading)
    precision: Numeric  # one over the square of the scale of its error, 0 where none counts
    freedom: FloatArray  # degrees of freedom, inf for a normal error, (n_place, n_reading)


def log_error_density(residual: Numeric, precision: Numeric, freedom: FloatArray) -> Numeric:
    """Log-density of errors, normal or Student-t, up to terms of precision and freedom alone."""
    square = precision * residual * residual
    finite = np.where(np.isfinite(freedom), freedom, 1.0)
    heavy = 0.5 * (finite + 1.0) * op.log1p(square / finite)
    robust = np.isfinite(freedom).astype(np.float64)
    return -robust * heavy - (1.0 - robust) * 0.5 * square


def robust_log_likelihood(readings: Readings, mean: Numeric, variance: Numeric) -> Numeric:
    r"""Log-likelihood of the readings of each place, local values integrated out.

    Parameters
    ----------
    readings : Readings
        Of all places.
    mean, variance : numeric, last axis place
        Of the normal local values.

    Returns
    -------
    numeric, last axis place
        Up to terms of precision and freedom alone; 0 where nothing counts.

    Notes
    -----
    .. math:: L = \int N(u; \mu, \sigma^2) \prod_i t_\nu\left(\frac{y_i - u}{s_i}\right) du

    has a peak at the population and may have one at every reading. It is shared out among them
    by :math:`w_c(u) = q_c(u)^6 / \sum_k q_k(u)^6`, with :math:`q_c = [s_c \sqrt{1 + ((u -
    m_c)/s_c)^2}]^{-1}` the density of the points that :math:`u = m_c + s_c \sinh x` gives for
    even x; each share is summed by the trapezoidal rule in x, which converges fast for smooth
    integrands that decay at both ends [1]_.

    References
    ----------
    .. [1] L. N. Trefethen, J. A. C. Weideman, The exponentially convergent trapezoidal rule, SIAM
       Rev. 56 (2014) 385-458.
    .. [2] K. L. Lange, R. J. A. Little, J. M. G. Taylor, Robust statistical modeling using the t
       distribution, J. Am. Stat. Assoc. 84 (1989) 881-896.
    """
    sd = op.sqrt(variance)
    count = readings.freedom.shape[-1]
    known = readings.precision > 0.0
    # A reading that does not count stands at the population, and shares its points.
    scale = [
        op.where(known[..., i], 1.0 / op.sqrt(op.maximum(readings.precision[..., i], 1e-12)), sd)
        for i in range(count)
    ]
    centre = [op.where(known[..., i], readings.value[..., i], mean) for i in range(count)]
    centres, scales = [mean, *centre], [sd, *scale]
    terms = []
    for middle, width in zip(centres, scales, strict=True):
        u = middle[..., None] + width[..., None] * _SHIFT
        crowd: Numeric = 0.0  # sum of (q_k / q_c)^SHARPNESS
        for other, other_width in zip(centres, scales, strict=True):
            away = (u - other[..., None]) / other_width[..., None]
            ratio = (width / other_width)[..., None] * _STRETCH / op.sqrt(1.0 + away * away)
            crowd = crowd + ratio**SHARPNESS
        term = _log_integrand(readings, mean, sd, u) - op.log(crowd)
        terms.append(term + np.log(_STRETCH) + op.log(width)[..., None])
    peak = terms[0].max(axis=-1)
    for term in terms[1:]:
        peak = op.maximum(peak, term.max(axis=-1))
    total: Numeric = 0.0
    for term in terms:
        total = total + op.exp(term - peak[..., None]).sum(axis=-1)
    counts = readings.precision.sum(axis=-1) > 0.0
    return op.where(counts, peak + op.log(_STEP * total), 0.0)


def _log_integrand(readings: Readings, mean: Numeric, sd: Numeric, u: Numeric) -> Numeric:
    """Log of the local value's density and of all readings given it, at points (..., place, n)."""
    total = op.normal_logpdf((u - mean[..., None]) / sd[..., None]) - op.log(sd)[..., None]
    for i in range(readings.freedom.shape[-1]):
        total = total + log_error_density(
            readings.value[..., i, None] - u,
            readings.precision[..., i, None],
            readings.freedom[:, i, None],
        )
    return total


def padded_places(
    place: NDArray[np.int64], chosen: NDArray[np.int64]
) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    """Arrange the rows of chosen places.

    Parameters
    ----------
    place : ndarray of int, shape (n_row,)
        Place of each row.
    chosen : ndarray of int, shape (n_chosen,)
        Places to arrange, each with at least one row.

    Returns
    -------
    row : ndarray of int, shape (n_chosen, n_most)
        Rows of each place, one of them repeated to fill up.
    once : ndarray, shape (n_chosen, n_most)
        1 where a row stands for the first time, else 0.
    """
    rows = [np.flatnonzero(place == one) for one in chosen]
    most = max((len(some) for some in rows), default=1)
    row = np.array([np.resize(some, most) for some in rows], dtype=np.int64).reshape(-1, most)
    once = np.arange(most) < np.array([len(some) for some in rows])[:, None]
    return row, once.astype(np.float64)


def robust_local_density(
    value: FloatArray, precision: FloatArray, freedom: FloatArray, mean: FloatArray, sd: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Tabulate the density of one place's local value given its readings.

    Parameters
    ----------
    value : ndarray, shape (n_draw, n_reading)
        Readings less their known errors.
    precision, freedom : ndarray, shape (n_reading,)
        As in `Readings`, all positive.
    mean, sd : ndarray, shape (n_draw,)
        Of the local values of the zone.

    Returns
    -------
    grid, log_density : ndarray, shape (n_draw, n_grid)
        Increasing points, gathered about the population and every reading, and the log-density
        at them up to a constant of each draw.
    """
    shift = np.sinh(np.linspace(-TABLE_REACH, TABLE_REACH, TABLE_POINTS))
    scale = 1.0 / np.sqrt(precision)
    about = [mean[:, None] + sd[:, None] * np.linspace(-9.0, 9.0, TABLE_POINTS)]
    about += [value[:, i, None] + scale[i] * shift for i in range(len(scale))]
    grid = np.sort(np.concatenate(about, axis=1), axis=1)
    # Beyond nine standard deviations of the population nothing is left whatever was read.
    low, high = (mean - 9.0 * sd)[:, None], (mean + 9.0 * sd)[:, None]
    grid = np.clip(grid, low, high)
    density = -0.5 * ((grid - mean[:, None]) / sd[:, None]) ** 2
    for i in range(len(scale)):
        density = density + log_error_density(value[:, i, None] - grid, precision[i], freedom[i])
    return grid, density
