"""Reliability index and failure probability: conversions that keep their digits."""

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

FloatArray = NDArray[np.float64]


def index_from_probability(probability: ArrayLike) -> FloatArray:
    r"""Reliability index of a failure probability.

    Parameters
    ----------
    probability : array_like
        Failure probability, in [0, 1]. [-]

    Returns
    -------
    ndarray
        :math:`\beta = -\Phi^{-1}(P_f)`. [-] Infinite for 0, minus infinite for 1, NaN for NaN.

    Raises
    ------
    ValueError
        If a probability is outside [0, 1].

    Notes
    -----
    Accurate to rounding down to the smallest floating-point number. A probability close to 1
    carries its digits in the survival, and one below 1e-300 only in its logarithm: use
    `index_from_log_probability` there.

    References
    ----------
    .. [1] EN 1990:2002, C5(2) and table C1 (from memory).

    Examples
    --------
    >>> round(float(index_from_probability(1e-6)), 5)
    4.75342
    """
    value = np.asarray(probability, dtype=np.float64)
    if np.any((value < 0) | (value > 1)):
        outside = value[(value < 0) | (value > 1)].flat[0]
        raise ValueError(f"a failure probability must be in [0, 1], got {outside:g}")
    return np.asarray(-special.ndtri(value))


def index_from_log_probability(
    log_probability: ArrayLike, *, of_survival: bool = False
) -> FloatArray:
    r"""Reliability index from the logarithm of a probability.

    Parameters
    ----------
    log_probability : array_like
        Natural logarithm of the failure probability, at most 0. [-]
    of_survival : bool, default False
        Whether the logarithm is that of survival, :math:`\ln(1 - P_f)`, as sums over years give
        it.

    Returns
    -------
    ndarray
        Reliability index. [-]

    Raises
    ------
    ValueError
        If a logarithm is above 0.

    Examples
    --------
    >>> round(float(index_from_log_probability(-1000.0)), 4)
    44.6157
    """
    value = np.asarray(log_probability, dtype=np.float64)
    if np.any(value > 0):
        raise ValueError(f"the logarithm of a probability is at most 0, got {np.max(value):g}")
    index = special.ndtri_exp(value)
    return np.asarray(index if of_survival else -index)


def probability_from_index(index: ArrayLike) -> FloatArray:
    r"""Failure probability of a reliability index.

    Parameters
    ----------
    index : array_like
        Reliability index, :math:`\beta`. [-]

    Returns
    -------
    ndarray
        :math:`\Phi(-\beta)`. [-] Accurate to rounding in the tail.

    Examples
    --------
    >>> f"{float(probability_from_index(3.8)):.4e}"
    '7.2348e-05'
    """
    return np.asarray(special.ndtr(-np.asarray(index, dtype=np.float64)))


def index_for_period(index: ArrayLike, years: ArrayLike) -> FloatArray:
    r"""Reliability index for several years from that of one year.

    Parameters
    ----------
    index : array_like
        Index of one year, :math:`\beta_1`. [-]
    years : array_like
        Number of years, :math:`n > 0`. [yr]

    Returns
    -------
    ndarray
        :math:`\beta_n` with :math:`\Phi(\beta_n) = \Phi(\beta_1)^n`. [-]

    Raises
    ------
    ValueError
        If a number of years is not positive.

    Notes
    -----
    Assumes that failures of different years are independent. Resistance is the same structure
    every year, so they are not: results never use this, it compares with codes that do.
    Worked in :math:`n \ln \Phi(\beta_1)`, hence without cancellation up to :math:`\beta_1 = 38`,
    where the probability itself underflows and the result is infinite.

    References
    ----------
    .. [1] EN 1990:2002, eq. C.3 (from memory); SANS 2394:2016, 8.1 (read in a secondary source).

    Examples
    --------
    >>> round(float(index_for_period(4.7, 50)), 4)
    3.8263
    """
    return _power_of_survival(index, _positive_years(years))


def index_for_one_year(index: ArrayLike, years: ArrayLike) -> FloatArray:
    r"""Reliability index for one year from that of several, the inverse of `index_for_period`.

    Parameters
    ----------
    index : array_like
        Index of the period, :math:`\beta_n`. [-]
    years : array_like
        Number of years, :math:`n > 0`. [yr]

    Returns
    -------
    ndarray
        :math:`\beta_1` with :math:`\Phi(\beta_1)^n = \Phi(\beta_n)`, years independent. [-]

    Raises
    ------
    ValueError
        If a number of years is not positive.

    Examples
    --------
    >>> round(float(index_for_one_year(3.8, 50)), 4)
    4.6782
    """
    return _power_of_survival(index, 1.0 / _positive_years(years))


def index_error(index: ArrayLike, probability_error: ArrayLike) -> FloatArray:
    r"""Carry the standard error of a failure probability over to its index.

    Parameters
    ----------
    index : array_like
        Reliability index, :math:`\beta`. [-]
    probability_error : array_like
        Standard error of the failure probability. [-]

    Returns
    -------
    ndarray
        First-order (delta method) error, :math:`se(P_f) / \varphi(\beta)`. [-] Infinite where
        the index is: no finite sample bounds it.

    Raises
    ------
    ValueError
        If a standard error is negative.

    Examples
    --------
    >>> round(float(index_error(3.8, 7.2348e-6)), 4)  # 10 % of the probability
    0.0248
    """
    index = np.asarray(index, dtype=np.float64)
    error = np.asarray(probability_error, dtype=np.float64)
    if np.any(error < 0):
        raise ValueError(f"a standard error must not be negative, got {np.min(error):g}")
    with np.errstate(divide="ignore", over="ignore", invalid="ignore"):
        result = np.exp(np.log(error) + 0.5 * index * index + 0.5 * np.log(2.0 * np.pi))
    return np.asarray(np.where(np.isinf(index), np.inf, result))


def _power_of_survival(index: ArrayLike, exponent: FloatArray) -> FloatArray:
    log_survival = special.log_ndtr(np.asarray(index, dtype=np.float64))
    return np.asarray(special.ndtri_exp(exponent * log_survival))


def _positive_years(years: ArrayLike) -> FloatArray:
    value = np.asarray(years, dtype=np.float64)
    if np.any(value <= 0):
        raise ValueError(f"the number of years must be positive, got {np.min(value):g}")
    return value
