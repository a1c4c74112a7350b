"""Reinforcing bars: yield strength that hardness tells of, and how sizes stray."""

from typing import Any

Numeric = Any  # float, ndarray or PyTensor variable

HARDNESS_INTERCEPT = -90.7  # [MPa] of the line of Pavlina and Van Tyne
HARDNESS_SLOPE = 2.876  # [MPa per unit of Vickers hardness]
BRINELL_OVER_VICKERS = 0.95  # [-] ISO 18265, table A.1, unalloyed steels (from memory)
BAR_AREA_VARIATION = 0.02  # [-] of the area about its nominal value, JCSS part 3.2
BAR_DIAMETER_VARIATION = 0.5 * BAR_AREA_VARIATION  # area goes with the square of the diameter


def yield_strength_from_hardness(hardness: Numeric) -> Numeric:
    r"""Yield strength that a hardness indicates, over many steels.

    Parameters
    ----------
    hardness : numeric
        Vickers hardness, :math:`H`. [-] Of steels from some 130 to 650, that is 300 to 1700 MPa.

    Returns
    -------
    numeric
        :math:`f_y = -90.7 + 2.876 H`. [MPa]

    Notes
    -----
    Over 150 hypoeutectoid steels of all microstructures but austenite. Their residual standard
    deviation is some 100 MPa, so that one steel's own line has to be told by coupons. Numbers
    from memory; the abstract, with the linear form and the range, was read.

    References
    ----------
    .. [1] E. J. Pavlina, C. J. Van Tyne, Correlation of yield strength and tensile strength with
       hardness for steels, J. Mater. Eng. Perform. 17 (2008) 888-893,
       doi:10.1007/s11665-008-9225-5.

    Examples
    --------
    >>> round(yield_strength_from_hardness(190.0), 2)
    455.74
    """
    return HARDNESS_INTERCEPT + HARDNESS_SLOPE * hardness


def vickers_from_brinell(hardness: Numeric) -> Numeric:
    r"""Vickers hardness of the same steel as a Brinell hardness.

    Parameters
    ----------
    hardness : numeric
        Brinell hardness, :math:`HB`. [-] Up to about 400.

    Returns
    -------
    numeric
        :math:`HB / 0.95`. [-]

    References
    ----------
    .. [1] ISO 18265:2013, table A.1, unalloyed and low-alloy steels (from memory).

    Examples
    --------
    >>> round(vickers_from_brinell(190.0), 6)
    200.0
    """
    return hardness / BRINELL_OVER_VICKERS
