"""Characteristic strengths of concrete in a structure as codes derive them from cores."""

import numpy as np
from numpy.typing import ArrayLike
from scipy import stats

FEWEST_EN = 8  # cores, EN 13791:2019 without indirect testing
LEAST_VARIATION_EN = 0.08  # the standard deviation counts as no less than this share of the mean
FRACTILE = 0.10  # of ACI's specified strength
FEWEST_ACI = 3
# Table 6 of EN 13791:2019 as remembered, by number of test locations.
K_N = {
    8: 2.00, 9: 1.96, 10: 1.92, 11: 1.89, 12: 1.87, 13: 1.85, 14: 1.83, 15: 1.82, 16: 1.81,
    18: 1.79, 20: 1.77, 25: 1.74, 30: 1.73,
}  # fmt: skip
# Margin over the lowest result by that result, both [MPa].
MARGIN_FROM = ((20.0, 4.0), (16.0, 3.0), (12.0, 2.0), (0.0, 1.0))


def characteristic_strength_en(strength: ArrayLike) -> float:
    r"""Characteristic in-situ strength of one test region by EN 13791:2019.

    Parameters
    ----------
    strength : array_like, shape (n,)
        Strength at each test location, as of cores with l/d = 2. [MPa] At least 8 locations.

    Returns
    -------
    float
        :math:`f_{ck,is}`. [MPa] It is compared with 0.85 times that of standard cylinders.

    Raises
    ------
    ValueError
        If there are fewer locations than 8.

    Notes
    -----
    .. math:: f_{ck,is} = \min\{ f_{m(n)} - k_n s, \; f_{lowest} + M \}

    with s no less than 8 % of the mean; :math:`k_n` falls from 2.00 for 8 locations to 1.73 for
    30 (between printed numbers the smaller one's, that is the larger :math:`k_n`, counts), M from
    4 MPa (lowest from 20 MPa) to 1 MPa (below 12 MPa). :math:`k_n` agrees with the predictive
    factor of EN 1990, table D1, :math:`t_{0.05, n-1} \sqrt{1 + 1/n}`.

    References
    ----------
    .. [1] EN 13791:2019, clause 8.1, tables 6 and 7 (from memory).

    Examples
    --------
    >>> region = [31.2, 28.4, 35.0, 30.1, 26.9, 33.3, 29.7, 32.5]
    >>> round(characteristic_strength_en(region), 2)
    25.57
    """
    values = np.asarray(strength, dtype=np.float64)
    if len(values) < FEWEST_EN:
        raise ValueError(f"EN 13791 asks for {FEWEST_EN} test locations or more, got {len(values)}")
    scatter = max(float(values.std(ddof=1)), LEAST_VARIATION_EN * float(values.mean()))
    factor = K_N[max(count for count in K_N if count <= len(values))]
    lowest = float(values.min())
    margin = next(margin for start, margin in MARGIN_FROM if lowest >= start)
    return min(float(values.mean()) - factor * scatter, lowest + margin)


def one_sided_factor(count: int, confidence: float, fractile: float = FRACTILE) -> float:
    r"""One-sided tolerance factor of a normal sample.

    Parameters
    ----------
    count : int
        Size of the sample, at least 2.
    confidence : float
        That the mean less so many standard deviations lies below the fractile.
    fractile : float, default 0.10
        Of the population.

    Returns
    -------
    float
        K, from the non-central t distribution:
        :math:`K = t^{-1}_{n-1, \delta}(\gamma) / \sqrt n`, :math:`\delta = -z_p \sqrt n`.

    References
    ----------
    .. [1] M. G. Natrella, Experimental Statistics, NBS Handbook 91, 1963, table A-7.

    Examples
    --------
    >>> round(one_sided_factor(10, 0.75), 4)
    1.6706
    """
    root = np.sqrt(count)
    return float(stats.nct.ppf(confidence, count - 1, -stats.norm.ppf(fractile) * root) / root)


def equivalent_specified_strength(
    strength: ArrayLike, correction_error: float, confidence: float
) -> float:
    r"""Equivalent specified strength of ACI 214.4R-10 by the tolerance factor method.

    Parameters
    ----------
    strength : array_like, shape (n,)
        Corrected core strengths. [MPa] At least 3.
    correction_error : float
        Coefficient of variation of all correction factors together.
    confidence : float
        One-sided: 0.75, 0.90 or 0.95.

    Returns
    -------
    float
        :math:`f'_{c,eq}`. [MPa]

    Raises
    ------
    ValueError
        If there are fewer cores than 3.

    Notes
    -----
    .. math:: f'_{c,eq} = \bar f_c - \sqrt{(K s_c)^2 + (Z s_a)^2}

    with K of `one_sided_factor`, Z the normal score of the confidence and
    :math:`s_a = V_a \bar f_c`.

    References
    ----------
    .. [1] ACI 214.4R-10, chapter 9 (tolerance factor method; from memory).

    Examples
    --------
    >>> cores = [31.2, 28.4, 35.0, 30.1, 26.9, 33.3, 29.7, 32.5]
    >>> round(equivalent_specified_strength(cores, 0.036, 0.75), 2)
    26.2
    """
    values = np.asarray(strength, dtype=np.float64)
    if len(values) < FEWEST_ACI:
        raise ValueError(f"ACI 214.4R asks for {FEWEST_ACI} cores or more, got {len(values)}")
    mean, scatter = float(values.mean()), float(values.std(ddof=1))
    factor = one_sided_factor(len(values), confidence)
    error = float(stats.norm.ppf(confidence)) * correction_error * mean
    return mean - float(np.hypot(factor * scatter, error))
