"""Yearly maxima of a variable load as Gumbel distributions."""

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

EULER = 0.5772156649015329  # [-] Euler-Mascheroni constant
SCALE_OVER_SD = np.sqrt(6.0) / np.pi  # [-] Gumbel scale over standard deviation


class Gumbel(NamedTuple):
    """Gumbel distribution of maxima, in the unit of the load."""

    mode: FloatArray
    scale: FloatArray


def gumbel_from_mean(mean: ArrayLike, variation: ArrayLike) -> Gumbel:
    r"""Gumbel distribution of given mean and coefficient of variation.

    Parameters
    ----------
    mean : array_like
        Mean of the maximum, :math:`\mu > 0`. [unit of the load]
    variation : array_like
        Coefficient of variation, :math:`V > 0`. [-]

    Returns
    -------
    Gumbel
        Scale :math:`b = \mu V \sqrt 6/\pi` and mode :math:`u = \mu - \gamma b`.

    Raises
    ------
    ValueError
        If a mean or a coefficient of variation is not positive.

    References
    ----------
    .. [1] EN 1990:2002, table C3 (there :math:`a = 1/b`, :math:`\gamma` rounded to 0.577; table
       quoted from memory).

    Examples
    --------
    >>> mode, scale = gumbel_from_mean(100.0, 0.20)
    >>> round(float(mode), 4), round(float(scale), 4)
    (90.9989, 15.5939)
    """
    mean = _positive("mean", mean)
    scale = mean * _positive("coefficient of variation", variation) * SCALE_OVER_SD
    return Gumbel(mean - EULER * scale, scale)


def gumbel_from_fractile(value: ArrayLike, probability: ArrayLike, variation: ArrayLike) -> Gumbel:
    r"""Gumbel distribution through one fractile, with a known coefficient of variation.

    Parameters
    ----------
    value : array_like
        Fractile, e.g. the characteristic load, :math:`q_p > 0`. [unit of the load]
    probability : array_like
        Probability that a year's maximum stays below `value`, :math:`p`: 0.98 for the usual
        characteristic value of EN 1990, 0.999 for a return period of 1000 years (EN 1991-2).
    variation : array_like
        Coefficient of variation of the yearly maximum, :math:`V > 0`. [-]

    Returns
    -------
    Gumbel
        Of the yearly maximum.

    Raises
    ------
    ValueError
        If `value` or `variation` is not positive, `probability` is outside (0, 1), or no
        positive mean goes with them (a low fractile of a load that varies much).

    Notes
    -----
    .. math:: \mu = q_p \Big/ \left[1 + V \frac{\sqrt 6}{\pi} (-\ln(-\ln p) - \gamma)\right]

    References
    ----------
    .. [1] EN 1990:2002, 4.1.2(7) note 2 (0.98 a year); EN 1991-2:2003, table 2.1 (1000 years
       for traffic). From memory.

    Examples
    --------
    >>> mode, scale = gumbel_from_fractile(151.84552, 0.98, 0.20)
    >>> round(float(mode), 3), round(float(scale), 3)
    (90.999, 15.594)
    """
    value = _positive("fractile value", value)
    variation = _positive("coefficient of variation", variation)
    level = np.asarray(probability, dtype=np.float64)
    ratio = 1.0 + variation * SCALE_OVER_SD * (_reduced(level) - EULER)
    if np.any(ratio <= 0):
        raise ValueError(
            f"no positive mean has the fractile {np.min(value):g} at probability "
            f"{np.min(level):g} with a coefficient of variation of {np.max(variation):g}; "
            "give a higher fractile"
        )
    return gumbel_from_mean(value / ratio, variation)


def probability_from_return_period(years: ArrayLike) -> FloatArray:
    """Probability that one year's maximum stays below the value of a return period.

    Parameters
    ----------
    years : array_like
        Return period, above 1. [yr]

    Returns
    -------
    ndarray
        ``1 - 1/years``. [-]

    Raises
    ------
    ValueError
        If a return period is not above one year.

    Examples
    --------
    >>> float(probability_from_return_period(50.0))
    0.98
    """
    years = np.asarray(years, dtype=np.float64)
    if np.any(years <= 1):
        raise ValueError(f"a return period must be above 1 year, got {np.min(years):g}")
    return np.asarray(1.0 - 1.0 / years)


def shift_to_period(mode: ArrayLike, scale: ArrayLike, years: ArrayLike) -> Gumbel:
    r"""Maximum of several independent years from that of one year.

    Parameters
    ----------
    mode, scale : array_like
        Of the yearly maximum, :math:`u` and :math:`b`. [unit of the load]
    years : array_like
        Number of years, :math:`N > 0`. [yr]

    Returns
    -------
    Gumbel
        Mode :math:`u + b \ln N`, same scale: :math:`F_N = F_1^N` exactly.

    Raises
    ------
    ValueError
        If a number of years is not positive.

    Examples
    --------
    >>> round(float(shift_to_period(90.998936, 15.593936, 50.0).mode), 4)
    152.0028
    """
    scale = np.asarray(scale, dtype=np.float64)
    return Gumbel(np.asarray(mode) + scale * np.log(_positive("number of years", years)), scale)


def fractile(probability: ArrayLike, mode: ArrayLike, scale: ArrayLike) -> FloatArray:
    r"""Value that a Gumbel maximum stays below with a given probability.

    Parameters
    ----------
    probability : array_like
        Probability of staying below, in (0, 1). [-]
    mode, scale : array_like
        Gumbel parameters. [unit of the load]

    Returns
    -------
    ndarray
        :math:`u - b \ln(-\ln p)`. [unit of the load]

    Raises
    ------
    ValueError
        If a probability is outside (0, 1).

    Examples
    --------
    >>> round(float(fractile(0.98, 90.998936, 15.593936)), 4)
    151.8455
    """
    return np.asarray(np.asarray(mode) + np.asarray(scale) * _reduced(probability))


def log_cdf(value: ArrayLike, mode: ArrayLike, scale: ArrayLike) -> FloatArray:
    r"""Logarithm of the probability that a Gumbel maximum stays below a value.

    Parameters
    ----------
    value : array_like
        Load, e.g. the capacity for it. [unit of the load]
    mode, scale : array_like
        Gumbel parameters. [unit of the load]

    Returns
    -------
    ndarray
        :math:`\ln F = -\exp(-(x - u)/b)`. [-] Adding it up over years gives the logarithm of
        surviving them; ``-expm1`` of the sum is the failure probability without cancellation.

    Examples
    --------
    >>> round(float(np.exp(log_cdf(151.84552, 90.998936, 15.593936))), 6)
    0.98
    """
    reduced = (np.asarray(value) - np.asarray(mode)) / np.asarray(scale)
    return np.asarray(-np.exp(np.minimum(-reduced, 700.0)))  # 700: exp stays finite


def mode_in_year(
    mode: ArrayLike, year: ArrayLike, reference_year: float, yearly_growth: ArrayLike
) -> FloatArray:
    """Mode of the yearly maximum under a linear trend; the scale stays.

    Parameters
    ----------
    mode : array_like
        Mode in the reference year. [unit of the load]
    year : array_like
        Calendar year. [yr]
    reference_year : float
        Year that `mode` belongs to. [yr]
    yearly_growth : array_like
        Growth per year, as a fraction of `mode`; negative for a falling load. [1/yr]

    Returns
    -------
    ndarray
        Mode in `year`, ``mode (1 + yearly_growth (year - reference_year))``. [unit of the load]

    Examples
    --------
    >>> round(float(mode_in_year(100.0, 2036, 2026, 0.01)), 6)
    110.0
    """
    elapsed = np.asarray(year, dtype=np.float64) - reference_year
    return np.asarray(np.asarray(mode) * (1.0 + np.asarray(yearly_growth) * elapsed))


def _positive(name: str, value: ArrayLike) -> FloatArray:
    array = np.asarray(value, dtype=np.float64)
    if np.any(array <= 0):
        raise ValueError(f"{name} must be positive, got {np.min(array):g}")
    return array


def _reduced(probability: ArrayLike) -> FloatArray:
    array = np.asarray(probability, dtype=np.float64)
    if np.any((array <= 0) | (array >= 1)):
        raise ValueError(
            f"probability must be in (0, 1), got {np.min(array):g} to {np.max(array):g}"
        )
    return np.asarray(-np.log(-np.log(array)))
