"""Chloride ingress into concrete: content at a depth, mean over an increment, onset."""

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

from assess import operations as op

FloatArray = NDArray[np.float64]
Numeric = Any  # float, ndarray or PyTensor variable

ROOT_PI = float(np.sqrt(np.pi))
REFERENCE_TEMPERATURE = 293.0  # [K] fib Bulletin 34, from memory
TEMPERATURE_REGRESSION = 4800.0  # [K] mean of b_e, sd 700 K; fib Bulletin 34, from memory


def apparent_diffusion(
    diffusion: Numeric, reference_age: Numeric, age: Numeric, age_exponent: Numeric
) -> Numeric:
    r"""Apparent diffusion coefficient of concrete of some age.

    Parameters
    ----------
    diffusion : numeric
        Apparent coefficient at the reference age, :math:`D_0`. [mm²/yr]
    reference_age, age : numeric
        :math:`t_0` and :math:`t`, both above 0. [yr]
    age_exponent : numeric
        :math:`a`, 0 to 1. [-]

    Returns
    -------
    numeric
        :math:`D_{app}`. [mm²/yr] Arguments broadcast, and may be PyTensor variables.

    Notes
    -----
    .. math:: D_{app}(t) = D_0 (t_0 / t)^a

    The coefficient is the one that, held constant from the first exposure on, gives the profile
    at age t [1]_. It is not the coefficient that rules at that moment, whose time average is
    larger by :math:`1 / (1 - a)`: values of the two sorts must not be mixed.

    References
    ----------
    .. [1] fib Bulletin 34, Model Code for Service Life Design, 2006, annex B2 (from memory).

    Examples
    --------
    >>> float(apparent_diffusion(100.0, 1.0, 16.0, 0.5))
    25.0
    """
    return diffusion * op.exp(age_exponent * op.log(reference_age / age))


def temperature_factor(
    temperature: Numeric, regression: Numeric = TEMPERATURE_REGRESSION
) -> Numeric:
    r"""Effect of temperature on chloride diffusion.

    Parameters
    ----------
    temperature : numeric
        Mean temperature of the concrete or the air around it, :math:`T`. [K]
    regression : numeric, default 4800
        :math:`b_e`, of mean 4800 and standard deviation 700. [K]

    Returns
    -------
    numeric
        :math:`k_e`, 1 at 293 K. [-]

    Notes
    -----
    .. math:: k_e = \exp\left[b_e \left(\frac{1}{T_{ref}} - \frac{1}{T}\right)\right]

    with :math:`T_{ref} = 293` K [1]_.

    References
    ----------
    .. [1] fib Bulletin 34, Model Code for Service Life Design, 2006, annex B2 (from memory).

    Examples
    --------
    >>> round(float(temperature_factor(283.0)), 4)
    0.5605
    """
    return op.exp(regression * (1.0 / REFERENCE_TEMPERATURE - 1.0 / temperature))


def apparent_from_migration(
    migration: Numeric,
    reference_age: Numeric,
    age: Numeric,
    age_exponent: Numeric,
    temperature: Numeric = REFERENCE_TEMPERATURE,
    regression: Numeric = TEMPERATURE_REGRESSION,
    transfer: Numeric = 1.0,
) -> Numeric:
    r"""Apparent diffusion coefficient from the rapid chloride migration test.

    Parameters
    ----------
    migration : numeric
        Migration coefficient at the reference age, :math:`D_{RCM,0}`. [mm²/yr]
    reference_age, age : numeric
        :math:`t_0`, as a rule 28 days, and :math:`t`. [yr]
    age_exponent : numeric
        :math:`a`, 0 to 1. [-]
    temperature, regression : numeric
        As for `temperature_factor`. [K]
    transfer : numeric, default 1
        Transfer variable :math:`k_t`. [-]

    Returns
    -------
    numeric
        :math:`D_{app}`. [mm²/yr]

    Notes
    -----
    .. math:: D_{app}(t) = k_e D_{RCM,0} k_t (t_0 / t)^a

    References
    ----------
    .. [1] fib Bulletin 34, Model Code for Service Life Design, 2006, annex B2 (from memory).

    Examples
    --------
    >>> round(float(apparent_from_migration(100.0, 1.0, 16.0, 0.5, 283.0)), 3)
    14.013
    """
    at_temperature = temperature_factor(temperature, regression) * transfer * migration
    return apparent_diffusion(at_temperature, reference_age, age, age_exponent)


def diffusion_length(apparent: Numeric, age: Numeric) -> Numeric:
    """Length over which chlorides have diffused, twice the root of coefficient times age.

    Parameters
    ----------
    apparent : numeric
        Apparent diffusion coefficient at that age. [mm²/yr]
    age : numeric
        Time of exposure. [yr]

    Returns
    -------
    numeric
        ``2 sqrt(apparent age)``. [mm]

    Examples
    --------
    >>> float(diffusion_length(25.0, 16.0))
    40.0
    """
    return 2.0 * op.sqrt(apparent * age)


def chloride_content(
    depth: Numeric,
    length: Numeric,
    surface: Numeric,
    initial: Numeric = 0.0,
    convection_depth: Numeric = 0.0,
) -> Numeric:
    r"""Chloride content at a depth.

    Parameters
    ----------
    depth : numeric
        Depth below the exposed surface, :math:`x \ge \Delta x`. [mm]
    length : numeric
        See `diffusion_length`. [mm]
    surface : numeric
        Content at the convection depth, :math:`C_s`. [any measure of content]
    initial : numeric, default 0
        Content of the fresh concrete, :math:`C_0`. [same]
    convection_depth : numeric, default 0
        Depth from which on diffusion rules, :math:`\Delta x`. [mm]

    Returns
    -------
    numeric
        Content. [same] Arguments broadcast, and may be PyTensor variables. Nearer to the surface
        than the convection depth the equation does not hold.

    Notes
    -----
    .. math:: C(x, t) = C_0 + (C_s - C_0)\,
              \mathrm{erfc} \frac{x - \Delta x}{2 \sqrt{D_{app} t}}

    Fick's second law in a half space with constant content at its face [1]_, in the form of
    [2]_.

    References
    ----------
    .. [1] J. Crank, The Mathematics of Diffusion, 2nd ed., 1975, eq. 2.45 (from memory).
    .. [2] fib Bulletin 34, Model Code for Service Life Design, 2006, annex B2 (from memory).

    Examples
    --------
    >>> round(float(chloride_content(50.0, diffusion_length(25.31908, 50.0), 3.0, 0.1)), 4)
    1.0291
    """
    return initial + (surface - initial) * op.erfc((depth - convection_depth) / length)


def integrated_erfc(x: Numeric) -> Numeric:
    r"""Integral of the complementary error function from ``x`` to infinity.

    Parameters
    ----------
    x : numeric
        At least 0. [-]

    Returns
    -------
    numeric
        :math:`\mathrm{ierfc}(x) = e^{-x^2} / \sqrt\pi - x\,\mathrm{erfc}(x)`. Its relative error
        grows as :math:`2 x^2` times that of a number in the machine.

    References
    ----------
    .. [1] NIST Digital Library of Mathematical Functions, 7.18.

    Examples
    --------
    >>> round(float(integrated_erfc(0.0)), 6)  # 1 / sqrt(pi)
    0.56419
    """
    return op.exp(-x * x) / ROOT_PI - x * op.erfc(x)


def mean_penetration(start: Numeric, end: Numeric, length: Numeric) -> Numeric:
    r"""Mean of the complementary error function over an increment of depth.

    Parameters
    ----------
    start, end : numeric
        Depths below the convection depth, ``0 <= start < end``. [mm]
    length : numeric
        See `diffusion_length`. [mm] Up to some :math:`10^8` times ``end - start``: beyond, the
        difference of two integrals loses its digits.

    Returns
    -------
    numeric
        Share of the step from initial to surface content that the increment has on average,
        0 to 1. [-] Arguments broadcast, and may be PyTensor variables.

    Notes
    -----
    .. math:: \frac{1}{x_2 - x_1} \int_{x_1}^{x_2} \mathrm{erfc}\frac{x}{\ell}\, dx
              = \frac{\mathrm{ierfc}(u_1) - \mathrm{ierfc}(u_2)}{u_2 - u_1}, \quad u = x / \ell

    with `integrated_erfc`.

    Examples
    --------
    >>> round(float(mean_penetration(0.0, 5e3, 40.0)), 6)  # 40 / sqrt(pi) over 5000
    0.004514
    """
    near, far = start / length, end / length
    return (integrated_erfc(near) - integrated_erfc(far)) / (far - near)


def mean_content(
    start: Numeric,
    end: Numeric,
    length: Numeric,
    surface: Numeric,
    initial: Numeric = 0.0,
    convection_depth: Numeric = 0.0,
) -> Numeric:
    """Mean chloride content of an increment, as grinding or slicing collects it.

    Parameters
    ----------
    start, end : numeric
        Depths below the exposed surface, ``convection_depth <= start < end``. [mm]
    length, surface, initial, convection_depth : numeric
        As for `chloride_content`.

    Returns
    -------
    numeric
        Mean content. [that of ``surface``] Arguments broadcast, and may be PyTensor variables.

    Examples
    --------
    >>> round(float(mean_content(45.0, 55.0, diffusion_length(25.31908, 50.0), 3.0, 0.1)), 4)
    1.0314
    """
    share = mean_penetration(start - convection_depth, end - convection_depth, length)
    return initial + (surface - initial) * share


def chloride_onset(
    cover: ArrayLike,
    critical: ArrayLike,
    surface: ArrayLike,
    diffusion: ArrayLike,
    reference_age: ArrayLike,
    age_exponent: ArrayLike,
    initial: ArrayLike = 0.0,
    convection_depth: ArrayLike = 0.0,
) -> FloatArray:
    r"""Age at which the content at the bar reaches the critical one.

    Parameters
    ----------
    cover : array_like
        Depth of the bar, :math:`c`. [mm]
    critical : array_like
        Critical content, :math:`C_{crit}`, in the measure of ``surface``.
    surface, initial, convection_depth : array_like
        As for `chloride_content`.
    diffusion, reference_age, age_exponent : array_like
        As for `apparent_diffusion`; ``age_exponent`` from 0 to 1.

    Returns
    -------
    ndarray
        Age. [yr] Infinite where the surface content stays below the critical one; 0 where the
        fresh concrete has it, or where the bar lies in the convection zone of a surface that has
        it. Arguments broadcast.

    Notes
    -----
    .. math:: t = \left[\frac{1}{D_0 t_0^a} \left(\frac{c - \Delta x}{2 z}\right)^2
              \right]^{1 / (1 - a)}, \qquad
              z = \mathrm{erfc}^{-1} \frac{C_{crit} - C_0}{C_s - C_0}

    which solves :math:`C(c, t) = C_{crit}` of `chloride_content` with `apparent_diffusion`. As a
    nears 1 the content nears a constant, and the age goes to 0 or to infinity.

    Examples
    --------
    >>> round(float(chloride_onset(50.0, 0.6, 3.0, 176.8876, 0.0767, 0.3, 0.1)), 1)
    20.2
    """
    critical, surface, initial, diffusion, reference_age, age_exponent = (
        np.asarray(one, dtype=np.float64)
        for one in (critical, surface, initial, diffusion, reference_age, age_exponent)
    )
    convection = np.asarray(convection_depth, dtype=np.float64)
    depth = np.maximum(np.asarray(cover, dtype=np.float64) - convection, 0.0)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        share = (critical - initial) / (surface - initial)
        z = special.erfcinv(np.clip(share, 0.0, 1.0))
        # Of dimensionless quantities only: (t / t_0)^(1 - a) whose logarithm is this.
        log_power = 2.0 * np.log(depth / (2.0 * z)) - np.log(diffusion * reference_age)
        late = reference_age * np.exp(log_power / (1.0 - age_exponent))
    onset = np.where(surface <= critical, np.inf, np.where(depth > 0.0, late, 0.0))
    return np.asarray(np.where(critical <= initial, 0.0, onset))
