"""Design values for a verification in code format: EN 1990, annexes C and D."""

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

from assess.mechanics import loads

FloatArray = NDArray[np.float64]

RESISTANCE_SENSITIVITY = 0.8  # [-] alpha_R, EN 1990:2002, C7(3), from memory
ACTION_SENSITIVITY = -0.7  # [-] alpha_E, EN 1990:2002, C7(3), from memory
ACCOMPANYING_FACTOR = 0.4  # [-] on alpha of accompanying variables, EN 1990:2002, C7(3)
STANDARD_RATIO_RANGE = (0.16, 7.6)  # [-] sd of action effect over sd of resistance, C7(3)


def standard_sensitivities(
    action_sd: ArrayLike, resistance_sd: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    r"""Sensitivity factors of EN 1990 for the dominant resistance and action.

    Parameters
    ----------
    action_sd, resistance_sd : array_like
        Standard deviations of action effect and resistance, in one unit, positive.

    Returns
    -------
    resistance, action : ndarray
        :math:`\alpha_R` and :math:`\alpha_E`. [-] 0.8 and -0.7 for
        :math:`0.16 < \sigma_E/\sigma_R < 7.6`, otherwise 1.0 in size for the variable with the
        larger standard deviation and 0.4 for the other.

    Raises
    ------
    ValueError
        If a standard deviation is not positive.

    References
    ----------
    .. [1] EN 1990:2002, C7(3) (from memory).

    Examples
    --------
    >>> [float(value) for value in standard_sensitivities(10.0, 1.0)]
    [0.4, -1.0]
    """
    action = np.asarray(action_sd, dtype=np.float64)
    resistance = np.asarray(resistance_sd, dtype=np.float64)
    for value in (action, resistance):
        if np.any(value <= 0):
            raise ValueError(f"a standard deviation must be positive, got {np.min(value):g}")
    ratio = action / resistance
    low, high = STANDARD_RATIO_RANGE
    cases = [ratio <= low, ratio >= high]
    return (
        np.select(cases, [1.0, 0.4], RESISTANCE_SENSITIVITY),
        np.select(cases, [-0.4, -1.0], ACTION_SENSITIVITY),
    )


def design_value_normal(
    mean: ArrayLike, variation: ArrayLike, index: ArrayLike, sensitivity: ArrayLike
) -> FloatArray:
    r"""Design value of a normal variable.

    Parameters
    ----------
    mean : array_like
        Mean, :math:`\mu`. [any unit]
    variation : array_like
        Coefficient of variation, V. [-]
    index : array_like
        Target reliability index, :math:`\beta`. [-]
    sensitivity : array_like
        Sensitivity factor, :math:`\alpha`: positive for resistances, negative for actions. [-]

    Returns
    -------
    ndarray
        :math:`\mu (1 - \alpha \beta V)`. [unit of the mean]

    References
    ----------
    .. [1] EN 1990:2002, table C3 (from memory).

    Examples
    --------
    >>> round(float(design_value_normal(30.0, 0.15, 3.8, 0.8)), 2)
    16.32
    """
    shift = np.asarray(sensitivity) * np.asarray(index) * np.asarray(variation, dtype=np.float64)
    return np.asarray(np.asarray(mean) * (1.0 - shift))


def design_value_lognormal(
    mean: ArrayLike, variation: ArrayLike, index: ArrayLike, sensitivity: ArrayLike
) -> FloatArray:
    r"""Design value of a lognormal variable, exact.

    Parameters
    ----------
    mean, variation, index, sensitivity : array_like
        As for `design_value_normal`.

    Returns
    -------
    ndarray
        :math:`\mu (1 + V^2)^{-1/2} \exp(-\alpha \beta \sqrt{\ln(1 + V^2)})`. [unit of the mean]

    References
    ----------
    .. [1] EN 1990:2002, table C3, whose printed form is the approximation for small V.

    Examples
    --------
    >>> round(float(design_value_lognormal(30.0, 0.15, 3.8, 0.8)), 4)
    18.8518
    """
    log_variance = np.log1p(np.square(np.asarray(variation, dtype=np.float64)))
    exponent = -np.asarray(sensitivity) * np.asarray(index) * np.sqrt(log_variance)
    return np.asarray(np.asarray(mean) * np.exp(exponent - 0.5 * log_variance))


def design_value_lognormal_approximate(
    mean: ArrayLike, variation: ArrayLike, index: ArrayLike, sensitivity: ArrayLike
) -> FloatArray:
    r"""Design value of a lognormal variable as EN 1990 prints it, for V below 0.2.

    Parameters
    ----------
    mean, variation, index, sensitivity : array_like
        As for `design_value_normal`; `variation` below 0.2.

    Returns
    -------
    ndarray
        :math:`\mu \exp(-\alpha \beta V)`. [unit of the mean]

    Raises
    ------
    ValueError
        If a coefficient of variation is 0.2 or more.

    References
    ----------
    .. [1] EN 1990:2002, table C3 (from memory).

    Examples
    --------
    >>> round(float(design_value_lognormal_approximate(30.0, 0.15, 3.8, 0.8)), 4)
    19.0144
    """
    variation = np.asarray(variation, dtype=np.float64)
    if np.any(variation >= 0.2):
        raise ValueError(
            "the approximate lognormal design value holds for coefficients of variation below "
            f"0.2, got {np.max(variation):g}; use the exact one"
        )
    return np.asarray(np.asarray(mean) * np.exp(-np.asarray(sensitivity) * index * variation))


def design_value_gumbel(
    mean: ArrayLike, variation: ArrayLike, index: ArrayLike, sensitivity: ArrayLike
) -> FloatArray:
    r"""Design value of a Gumbel (maximum) variable.

    Parameters
    ----------
    mean, variation, index, sensitivity : array_like
        As for `design_value_normal`.

    Returns
    -------
    ndarray
        :math:`u - \frac{1}{a} \ln[-\ln \Phi(-\alpha \beta)]`. [unit of the mean]

    Notes
    -----
    :math:`a = \pi/(\sigma \sqrt 6)`, :math:`u = \mu - \gamma/a`; the code rounds Euler's constant
    :math:`\gamma` to 0.577.

    References
    ----------
    .. [1] EN 1990:2002, table C3 (from memory).

    Examples
    --------
    >>> round(float(design_value_gumbel(100.0, 0.35, 3.8, -0.7)), 4)
    235.5138
    """
    mode, scale = loads.gumbel_from_mean(mean, variation)
    log_probability = special.log_ndtr(-np.asarray(sensitivity) * np.asarray(index))
    return np.asarray(mode - scale * np.log(-log_probability))


def annex_d_factor(tests: ArrayLike, probability: float, V_known: bool) -> FloatArray:
    r"""Factor of EN 1990 annex D for a value assessed from tests.

    Parameters
    ----------
    tests : array_like
        Number of tests, :math:`n`: 1 or more with known, 2 or more with unknown coefficient of
        variation. [-]
    probability : float
        Probability of a lower value, in (0, 0.5]: 0.05 for characteristic values (table D1),
        0.001 for design values of a dominant resistance (table D2). [-]
    V_known : bool
        Whether the coefficient of variation is known beforehand.

    Returns
    -------
    ndarray
        :math:`k_n`: the value is :math:`m (1 - k_n V_X)`, or for a lognormal variable
        :math:`\exp(m_y - k_n s_y)`. [-]

    Raises
    ------
    ValueError
        If there are too few tests, or `probability` is outside (0, 0.5].

    Notes
    -----
    Predictive fractile under a vague prior: :math:`z_p \sqrt{1 + 1/n}` for V known,
    :math:`t_{p, n-1} \sqrt{1 + 1/n}` for V unknown. The printed tables D1 and D2 are these,
    mostly cut off instead of rounded, except that table D2 prints 3.04 for infinitely many tests,
    which belongs to a probability of 0.00118.

    References
    ----------
    .. [1] EN 1990:2002, D7.2 and D7.3, tables D1 and D2 (from memory; formulas derived).

    Examples
    --------
    >>> round(float(annex_d_factor(5, 0.05, False)), 3)
    2.335
    """
    count = np.asarray(tests, dtype=np.float64)
    least = 1 if V_known else 2
    if np.any(count < least):
        known = "known" if V_known else "unknown"
        raise ValueError(
            f"with {known} coefficient of variation at least {least} tests are needed, got "
            f"{np.min(count):g}"
        )
    if not 0 < probability <= 0.5:
        raise ValueError(f"probability must be in (0, 0.5], got {probability:g}")
    degrees = np.inf if V_known else count - 1.0  # Student's t of infinite degrees is normal
    fractile = special.stdtrit(degrees, probability)
    return np.asarray(-fractile * np.sqrt(1.0 + 1.0 / count))
