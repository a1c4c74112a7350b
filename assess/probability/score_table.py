"""Fixed tables that map standard normal scores where the quantile has no closed form.

Numbers and PyTensor graphs get the same value, with a gradient, at the price of a polynomial.
"""

import math
from typing import Any

import numpy as np
from scipy import special

from assess.operations import Numeric, is_symbolic, normal_logpdf, where
from assess.probability.marginal import FloatArray

TABLE_END = 8.5  # scores covered on either side
KNOTS_PER_UNIT = 128  # leaves less than 1e-8, see the tests
# Quantiles below this have lost digits or underflowed; the leading power-law term is exact there.
SMALLEST_QUANTILE = 1e-290


def table_scores() -> FloatArray:
    """Scores at the knots of every table, from -8.5 to 8.5."""
    n_half = int(TABLE_END * KNOTS_PER_UNIT)
    return np.arange(-n_half, n_half + 1) / KNOTS_PER_UNIT


class ScoreTable:
    r"""A smooth increasing function of the standard normal score, from values and slopes.

    Parameters
    ----------
    values : ndarray of shape (n_knot,)
        Function at `table_scores`.
    slopes : ndarray of shape (n_knot,)
        Its derivative there.

    Notes
    -----
    Cubic Hermite interpolation [1]_; with knots :math:`h = 1/128` apart the error is at most
    :math:`h^4 \max|f''''| / 384`, some :math:`10^{-11} \max|f''''|`. Linear beyond
    the ends.

    References
    ----------
    .. [1] J. Stoer, R. Bulirsch, Introduction to Numerical Analysis, 3rd ed., Springer 2002,
       section 2.1.5.
    """

    def __init__(self, values: FloatArray, slopes: FloatArray) -> None:
        rises = np.diff(values)
        left, right = slopes[:-1] / KNOTS_PER_UNIT, slopes[1:] / KNOTS_PER_UNIT
        self._coefficients = (
            np.ascontiguousarray(values[:-1]),
            left,
            3.0 * rises - 2.0 * left - right,
            left + right - 2.0 * rises,
        )
        self._end_slopes = (float(slopes[0]), float(slopes[-1]))

    def __call__(self, z: Numeric) -> Numeric:
        """Interpolate; numbers give numbers, a PyTensor variable gives a graph."""
        inside = where(z > TABLE_END, TABLE_END, where(z < -TABLE_END, -TABLE_END, z))
        position = (inside + TABLE_END) * KNOTS_PER_UNIT
        n_interval = len(self._coefficients[0])
        if is_symbolic(z):
            interval, c0, c1, c2, c3 = self._look_up_in_graph(position, n_interval)
        else:
            interval = np.clip(np.floor(position), 0, n_interval - 1).astype(np.int64)
            c0, c1, c2, c3 = (column[interval] for column in self._coefficients)
        t = position - interval
        first, last = self._end_slopes
        beyond = where(z > 0.0, last, first) * (z - inside)
        return c0 + t * (c1 + t * (c2 + t * c3)) + beyond

    def _look_up_in_graph(self, position: Any, n_interval: int) -> tuple[Any, ...]:
        import pytensor.tensor as pt
        from pytensor.gradient import disconnected_grad

        # The interval number is a step function: no gradient may pass through it.
        interval = disconnected_grad(pt.clip(pt.floor(position), 0, n_interval - 1))
        index = pt.cast(interval, "int64")
        if index.ndim == 0:
            return interval, *(pt.constant(column)[index] for column in self._coefficients)
        flat = index.flatten()  # one-dimensional look-up compiles on every backend
        columns = (pt.constant(column)[flat] for column in self._coefficients)
        return interval, *(column.reshape(index.shape) for column in columns)


def log_gamma_table(shape: float) -> ScoreTable:
    """Logarithm of the standard gamma quantile as a function of the score.

    Parameters
    ----------
    shape : float
        Shape parameter k. [-]

    Returns
    -------
    ScoreTable
        ln x of score z, scale one.
    """
    z = table_scores()
    probability = special.ndtr(-np.abs(z))
    quantile = np.where(
        z < 0.0,
        special.gammaincinv(shape, probability),
        special.gammainccinv(shape, probability),
    )
    # P(x) ~ x^k / Gamma(k + 1) for small x
    power_law = (special.log_ndtr(z) + special.gammaln(shape + 1.0)) / shape
    tiny = quantile < SMALLEST_QUANTILE
    values = np.where(tiny, power_law, np.log(np.where(tiny, 1.0, quantile)))
    log_density = shape * values - np.exp(values) - special.gammaln(shape)  # of ln x
    return ScoreTable(values, np.exp(normal_logpdf(z) - log_density))


def logit_beta_table(q: float, r: float) -> ScoreTable:
    """Logit of the standard beta quantile as a function of the score.

    Parameters
    ----------
    q, r : float
        Shapes at the lower and the upper end. [-]

    Returns
    -------
    ScoreTable
        ln(y / (1 - y)) of score z, on the unit interval.
    """
    z = table_scores()
    values = np.where(z < 0.0, _logit_from_below(z, q, r), -_logit_from_below(-z, r, q))
    log_y, log_rest = -np.logaddexp(0.0, -values), -np.logaddexp(0.0, values)
    log_density = q * log_y + r * log_rest - special.betaln(q, r)  # of the logit
    return ScoreTable(values, np.exp(normal_logpdf(z) - log_density))


def _logit_from_below(z: FloatArray, q: float, r: float) -> FloatArray:
    """Logit of the beta quantile from its lower tail; used for negative scores only."""
    probability = special.ndtr(np.minimum(z, 0.0))
    quantile = special.betaincinv(q, r, probability)
    rest = special.betainccinv(r, q, probability)  # 1 - quantile, with digits of its own
    # P(y) ~ y^q / (q B(q, r)) for small y
    power_law = (special.log_ndtr(z) + math.log(q) + special.betaln(q, r)) / q
    tiny = quantile < SMALLEST_QUANTILE
    return np.where(tiny, power_law, np.log(np.where(tiny, 1.0, quantile)) - np.log(rest))
