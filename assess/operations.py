"""Elementary functions that take numbers or PyTensor variables, chosen by argument type.

A formula written with these has one body: NumPy arrays and floats go to NumPy and SciPy, PyTensor
variables build a graph. PyTensor is imported only when an argument belongs to it, so that formulas
stay usable where it is not installed.
"""

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from scipy import special

Numeric = Any  # float, ndarray, DataArray or PyTensor variable

SQRT_TWO = math.sqrt(2.0)
LOG_SQRT_TWO_PI = 0.5 * math.log(2.0 * math.pi)


def is_symbolic(*arguments: object) -> bool:
    """Tell whether any argument is a PyTensor variable.

    Parameters
    ----------
    *arguments : object
        Anything.

    Returns
    -------
    bool
        True when at least one of them belongs to PyTensor.

    Examples
    --------
    >>> is_symbolic(1.0, np.zeros(3))
    False
    """
    return any(type(argument).__module__.startswith("pytensor") for argument in arguments)


def _graph() -> Any:
    """Give ``pytensor.tensor``; called only once an argument has shown that it is loaded."""
    import pytensor.tensor

    return pytensor.tensor


def exp(x: Numeric) -> Numeric:
    """Exponential, elementwise."""
    return _graph().exp(x) if is_symbolic(x) else np.exp(x)


def expm1(x: Numeric) -> Numeric:
    """Exponential less one, accurate near zero."""
    return _graph().expm1(x) if is_symbolic(x) else np.expm1(x)


def log(x: Numeric) -> Numeric:
    """Natural logarithm, elementwise."""
    return _graph().log(x) if is_symbolic(x) else np.log(x)


def log1p(x: Numeric) -> Numeric:
    """Natural logarithm of one plus ``x``, accurate near zero."""
    return _graph().log1p(x) if is_symbolic(x) else np.log1p(x)


def sqrt(x: Numeric) -> Numeric:
    """Square root, elementwise."""
    return _graph().sqrt(x) if is_symbolic(x) else np.sqrt(x)


def where(condition: Numeric, if_true: Numeric, if_false: Numeric) -> Numeric:
    """Choose elementwise.

    Parameters
    ----------
    condition : numeric
        True where ``if_true`` is wanted.
    if_true, if_false : numeric
        The two choices; shapes broadcast.

    Returns
    -------
    numeric
        A scalar when all arguments are scalars.

    Notes
    -----
    Both choices are evaluated. In a graph a choice that is infinite or undefined where it is not
    wanted spoils the gradient, so its argument is to be bounded before.
    """
    if is_symbolic(condition, if_true, if_false):
        return _graph().where(condition, if_true, if_false)
    chosen: Numeric = np.where(condition, if_true, if_false)
    return chosen[()]  # a scalar, not an array without axes


def maximum(a: Numeric, b: Numeric) -> Numeric:
    """Larger of two, elementwise."""
    return _graph().maximum(a, b) if is_symbolic(a, b) else np.maximum(a, b)


def minimum(a: Numeric, b: Numeric) -> Numeric:
    """Smaller of two, elementwise."""
    return _graph().minimum(a, b) if is_symbolic(a, b) else np.minimum(a, b)


def stack_last(parts: Sequence[Numeric]) -> Numeric:
    """Join arrays of one shape along a new last axis."""
    if is_symbolic(*parts):
        return _graph().stack(list(parts), axis=-1)
    return np.stack([np.asarray(part) for part in parts], axis=-1)


def erf(x: Numeric) -> Numeric:
    """Error function, elementwise."""
    return _graph().erf(x) if is_symbolic(x) else special.erf(x)


def erfc(x: Numeric) -> Numeric:
    """Complement of the error function, accurate for large ``x``."""
    return _graph().erfc(x) if is_symbolic(x) else special.erfc(x)


def gammaln(x: Numeric) -> Numeric:
    """Logarithm of the gamma function, for positive ``x``."""
    return _graph().gammaln(x) if is_symbolic(x) else special.gammaln(x)


def normal_cdf(z: Numeric) -> Numeric:
    """Cumulative distribution of the standard normal, relatively accurate in the lower tail.

    Examples
    --------
    >>> float(round(normal_cdf(-3.8), 9))
    7.2348e-05
    """
    return 0.5 * _graph().erfc(-z / SQRT_TWO) if is_symbolic(z) else special.ndtr(z)


def normal_ppf(p: Numeric) -> Numeric:
    """Inverse of `normal_cdf`, for ``p`` in [0, 1].

    Notes
    -----
    Accurate down to the smallest ``p``; near one, accuracy is that of ``p`` itself: take
    ``-normal_ppf(q)`` where the complement ``q`` is known.
    """
    return -SQRT_TWO * _graph().erfcinv(2.0 * p) if is_symbolic(p) else special.ndtri(p)


def normal_logpdf(z: Numeric) -> Numeric:
    """Logarithm of the standard normal density."""
    return -0.5 * z * z - LOG_SQRT_TWO_PI


def log_normal_cdf(z: Numeric) -> Numeric:
    r"""Logarithm of the standard normal distribution function, accurate in both tails.

    Parameters
    ----------
    z : numeric
        Standard normal value. [-]

    Returns
    -------
    numeric
        :math:`\ln \Phi(z)`; keeps its relative accuracy for ``z`` of -30 as of +8.

    Notes
    -----
    In a graph, with the scaled complement of the error function erfcx:

    .. math:: \ln\Phi(z) = \ln\tfrac12\mathrm{erfcx}(-z/\sqrt2) - z^2/2 \quad (z \le 0), \qquad
              \ln\Phi(z) = \ln(1 - \tfrac12\mathrm{erfc}(z/\sqrt2)) \quad (z > 0)

    Each branch sees only arguments of its own sign, which keeps the gradient finite.

    References
    ----------
    .. [1] NIST Digital Library of Mathematical Functions, 7.2 and 7.12.

    Examples
    --------
    >>> round(float(log_normal_cdf(-30.0)), 4)
    -454.3212
    """
    if not is_symbolic(z):
        return special.log_ndtr(z)
    tensor = _graph()
    below = tensor.where(z > 0.0, 0.0, z)
    above = tensor.where(z > 0.0, z, 0.0)
    lower = tensor.log(0.5 * tensor.erfcx(-below / SQRT_TWO)) - 0.5 * below * below
    upper = tensor.log1p(-0.5 * tensor.erfc(above / SQRT_TWO))
    return tensor.where(z > 0.0, upper, lower)
