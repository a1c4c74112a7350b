"""Generalised extreme value distribution of largest values; one body for numbers and graphs."""

import numpy as np
from numpy.typing import NDArray

from assess.operations import Numeric, exp, log, log1p, maximum, where

FloatArray = NDArray[np.float64]

LEAST_REDUCED = -50.0  # e^50 is improbable enough, and finite
EDGE = 1e-9  # keeps the logarithm finite beyond the bound of the distribution
SMALL = 1e-3  # below it a series replaces ln(1 + x) / x


def reduced_variate(standard: Numeric, shape: Numeric) -> Numeric:
    r"""Gumbel variate that a value of the generalised distribution stands for.

    Parameters
    ----------
    standard : numeric
        :math:`s = (x - u)/b` with location u and scale b. [-]
    shape : numeric
        Shape :math:`\xi`: 0 for the Gumbel distribution, above 0 for a heavier tail, below 0 for
        an upper bound at :math:`s = -1/\xi`. [-]

    Returns
    -------
    numeric
        :math:`t = \ln(1 + \xi s)/\xi`, so that :math:`F = \exp(-e^{-t})`. Beyond a bound it goes
        on with slope 1, finite, but so large or so small that the probability is nothing.

    References
    ----------
    .. [1] S. Coles, An Introduction to Statistical Modeling of Extreme Values, Springer 2001,
       section 3.1.3 (sign of the shape as there).
    .. [2] A. F. Jenkinson, Q. J. R. Meteorol. Soc. 81 (1955) 158-171.

    Examples
    --------
    >>> round(float(reduced_variate(2.0, 0.1)), 6)
    1.823216
    """
    product = shape * standard
    small = maximum(product, -product) < SMALL
    series = standard * (
        1.0 - product * (1.0 / 2.0 - product * (1.0 / 3.0 - product * (1.0 / 4.0 - product / 5.0)))
    )
    # Each branch gets arguments of its own, which keeps values and gradients finite.
    inside = maximum(where(small, 1.0, product), -1.0 + EDGE)
    beyond = inside - where(small, 1.0, product)  # 0 up to the bound
    exact = (log1p(inside) - beyond) / where(small, 1.0, shape)
    return maximum(where(small, series, exact), LEAST_REDUCED)


def standard_value(reduced: FloatArray, shape: FloatArray) -> FloatArray:
    r"""Value that has a reduced variate; numbers only, the inverse of `reduced_variate`.

    Parameters
    ----------
    reduced, shape : ndarray
        :math:`t` and :math:`\xi`; broadcast. [-]

    Returns
    -------
    ndarray
        :math:`s = (e^{\xi t} - 1)/\xi`. [-]
    """
    reduced, shape = np.broadcast_arrays(reduced, shape)
    straight = np.abs(shape * reduced) < 1e-8
    safe = np.where(straight, 1.0, shape)
    edge = np.log(EDGE) / safe  # reduced variate of the bound
    past = (shape < 0.0) & ~straight & (reduced > edge)
    inside = np.where(past, edge, reduced)
    value = np.expm1(np.where(straight, 0.0, shape) * inside) / safe
    return np.where(straight, reduced, value + np.where(past, reduced - edge, 0.0))


def log_density(
    value: Numeric, location: Numeric, scale: Numeric, shape: Numeric, period: Numeric = 1.0
) -> Numeric:
    r"""Log-density of the largest value of a period.

    Parameters
    ----------
    value : numeric
        Largest value x in the period. [unit of the location]
    location, scale : numeric
        Of the largest value of one year, u and b > 0. [unit of the value]
    shape : numeric
        :math:`\xi`. [-]
    period : numeric, default 1.0
        Length of the period, T. [yr]

    Returns
    -------
    numeric
        :math:`\ln T - \ln b - (1 + \xi) t - T e^{-t}`, as :math:`F_T = F^T`.

    References
    ----------
    .. [1] S. Coles, An Introduction to Statistical Modeling of Extreme Values, Springer 2001,
       sections 3.1.3 and 3.3.2.

    Examples
    --------
    >>> round(float(log_density(4.0, 3.87475, 0.19804, -0.05011)), 4)
    0.4829
    """
    reduced = reduced_variate((value - location) / scale, shape)
    return log(period) - log(scale) - (1.0 + shape) * reduced - period * exp(-reduced)


def log_hazard(value: Numeric, location: Numeric, scale: Numeric, shape: Numeric) -> Numeric:
    r"""Logarithm of :math:`-\ln F(x)` of the largest value of a year.

    Parameters
    ----------
    value, location, scale, shape : numeric
        As for `log_density`.

    Returns
    -------
    numeric
        :math:`-t`.
    """
    return -reduced_variate((value - location) / scale, shape)
