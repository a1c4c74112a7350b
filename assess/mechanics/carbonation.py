"""Carbonation of concrete: depth with the root of time, onset, and what the rate depends on."""

from typing import Any

from assess import operations as op

Numeric = Any  # float, ndarray or PyTensor variable

# fib Bulletin 34, annex B1; all numbers from memory.
REFERENCE_HUMIDITY = 65.0  # [%]
HUMIDITY_EXPONENT = 5.0  # f_e [-]
HUMIDITY_POWER = 2.5  # g_e [-]
CURING_EXPONENT = -0.567  # mean of b_c, sd 0.024 [-]
REFERENCE_CURING = 7.0  # [d]
WEATHER_EXPONENT = 0.446  # mean of b_w, sd 0.163 [-]
REFERENCE_AGE = 0.0767  # t_0, 28 days [yr]
TEST_FACTOR = 1.25  # mean of k_t, sd 0.35 [-]
TEST_ERROR = 315.5  # mean of epsilon_t, sd 48 [(mm²/yr)/(kg/m³)]
ATMOSPHERE = 0.00082  # mean content of carbon dioxide in the air, sd 0.0001 [kg/m³]


def carbonation_depth(rate: Numeric, age: Numeric) -> Numeric:
    r"""Depth of carbonation with the root of time.

    Parameters
    ----------
    rate : numeric
        Carbonation rate, :math:`k`. [mm/yr^0.5]
    age : numeric
        Time of exposure, :math:`t`. [yr]

    Returns
    -------
    numeric
        :math:`x_c = k \sqrt t`. [mm] Arguments broadcast, and may be PyTensor variables.

    Notes
    -----
    Diffusion of carbon dioxide to a sharp front through concrete whose humidity stays the same
    [1]_; where rain wets it, the depth grows more slowly than that (`weather_function`).

    References
    ----------
    .. [1] K. Tuutti, Corrosion of Steel in Concrete, CBI Research 4:82, 1982 (from memory).

    Examples
    --------
    >>> float(carbonation_depth(4.0, 25.0))
    20.0
    """
    return rate * op.sqrt(age)


def carbonation_onset(cover: Numeric, rate: Numeric) -> Numeric:
    r"""Age at which carbonation reaches the bar.

    Parameters
    ----------
    cover : numeric
        Depth of the bar, :math:`c`. [mm]
    rate : numeric
        See `carbonation_depth`. [mm/yr^0.5]

    Returns
    -------
    numeric
        :math:`(c / k)^2`. [yr] Arguments broadcast, and may be PyTensor variables.

    Examples
    --------
    >>> float(carbonation_onset(20.0, 4.0))
    25.0
    """
    ratio = cover / rate
    return ratio * ratio


def humidity_factor(humidity: Numeric) -> Numeric:
    r"""Effect of the air's humidity on carbonation.

    Parameters
    ----------
    humidity : numeric
        Mean relative humidity, :math:`RH`, below 100. [%]

    Returns
    -------
    numeric
        :math:`k_e`, 1 at 65 %. [-]

    Notes
    -----
    .. math:: k_e = \left[\frac{1 - (RH / 100)^{5}}{1 - (65 / 100)^{5}}\right]^{2.5}

    References
    ----------
    .. [1] fib Bulletin 34, Model Code for Service Life Design, 2006, annex B1 (from memory).

    Examples
    --------
    >>> round(float(humidity_factor(80.0)), 6)
    0.504481
    """
    dry = 1.0 - (humidity / 100.0) ** HUMIDITY_EXPONENT
    reference = 1.0 - (REFERENCE_HUMIDITY / 100.0) ** HUMIDITY_EXPONENT
    return (dry / reference) ** HUMIDITY_POWER


def curing_factor(curing: Numeric, exponent: Numeric = CURING_EXPONENT) -> Numeric:
    r"""Effect of curing on carbonation.

    Parameters
    ----------
    curing : numeric
        Days of curing, :math:`t_c`, above 0. [d]
    exponent : numeric, default -0.567
        :math:`b_c`, normal of mean -0.567 and standard deviation 0.024. [-]

    Returns
    -------
    numeric
        :math:`k_c = (t_c / 7)^{b_c}`. [-]

    References
    ----------
    .. [1] fib Bulletin 34, Model Code for Service Life Design, 2006, annex B1 (from memory).

    Examples
    --------
    >>> round(float(curing_factor(1.0)), 6)
    3.01419
    """
    return op.exp(exponent * op.log(curing / REFERENCE_CURING))


def weather_function(
    age: Numeric,
    driving_rain: Numeric,
    wetness: Numeric,
    exponent: Numeric = WEATHER_EXPONENT,
) -> Numeric:
    r"""Effect of rain on carbonation.

    Parameters
    ----------
    age : numeric
        :math:`t`. [yr]
    driving_rain : numeric
        Probability that rain hits the surface, :math:`p_{SR}`: 1 for horizontal surfaces, 0 for
        sheltered and inner ones. [-]
    wetness : numeric
        Share of days with at least 2.5 mm of rain, :math:`ToW`. [-]
    exponent : numeric, default 0.446
        :math:`b_w`, normal of mean 0.446 and standard deviation 0.163. [-]

    Returns
    -------
    numeric
        :math:`W(t)`, 1 without rain. [-]

    Notes
    -----
    .. math:: W(t) = (t_0 / t)^{(p_{SR}\, ToW)^{b_w} / 2}, \quad t_0 = 0.0767\ \mathrm{yr}

    References
    ----------
    .. [1] fib Bulletin 34, Model Code for Service Life Design, 2006, annex B1 (from memory).

    Examples
    --------
    >>> round(float(weather_function(50.0, 0.1, 0.2)), 6), float(weather_function(50.0, 0.0, 0.2))
    (0.567807, 1.0)
    """
    power = 0.5 * (driving_rain * wetness) ** exponent
    return op.exp(power * op.log(REFERENCE_AGE / age))


def carbonation_rate(
    inverse_resistance: Numeric,
    humidity: Numeric = REFERENCE_HUMIDITY,
    curing: Numeric = REFERENCE_CURING,
    *,
    test_factor: Numeric = TEST_FACTOR,
    test_error: Numeric = TEST_ERROR,
    atmosphere: Numeric = ATMOSPHERE,
    curing_exponent: Numeric = CURING_EXPONENT,
) -> Numeric:
    r"""Carbonation rate from the accelerated test and the exposure.

    Parameters
    ----------
    inverse_resistance : numeric
        Inverse effective resistance from the accelerated test, :math:`R_{ACC,0}^{-1}`.
        [(mm²/yr)/(kg/m³)] :math:`10^{-11}` (m²/s)/(kg/m³) is 315.576 of these.
    humidity : numeric, default 65
        As for `humidity_factor`. [%]
    curing : numeric, default 7
        As for `curing_factor`. [d]
    test_factor, test_error : numeric
        Regression from the accelerated to the natural test, :math:`k_t` [-] (normal, mean 1.25,
        standard deviation 0.35) and :math:`\epsilon_t` [(mm²/yr)/(kg/m³)] (315.5, 48).
    atmosphere : numeric, default 0.00082
        Carbon dioxide in the air, :math:`C_S` (normal, 0.00082, 0.0001). [kg/m³]
    curing_exponent : numeric
        As for `curing_factor`. [-]

    Returns
    -------
    numeric
        :math:`k` of `carbonation_depth`; where rain falls, its depth is to be multiplied by
        `weather_function`. [mm/yr^0.5]

    Notes
    -----
    .. math:: k = \sqrt{2 k_e k_c (k_t R_{ACC,0}^{-1} + \epsilon_t) C_S}

    References
    ----------
    .. [1] fib Bulletin 34, Model Code for Service Life Design, 2006, annex B1 (from memory).

    Examples
    --------
    >>> round(float(carbonation_depth(carbonation_rate(3.1 * 315.576), 50.0)), 4)
    11.2314
    """
    factors = humidity_factor(humidity) * curing_factor(curing, curing_exponent)
    natural = test_factor * inverse_resistance + test_error
    return op.sqrt(2.0 * factors * natural * atmosphere)
