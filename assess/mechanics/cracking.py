"""Cracks along corroding bars: the loss that cracks the cover, and the width that follows.

Formulas are arithmetic, so that arguments may be PyTensor variables.
"""

from typing import Any

import numpy as np

Numeric = Any  # float, ndarray or PyTensor variable

WIDTH_PER_AREA = 0.0575  # [mm/mm²] Vidal, Castel, François 2004; from memory
CRACKING_CONSTANT = 7.53e-3  # [mm] Alonso et al. 1998; from memory
CRACKING_SLOPE = 9.32e-3  # [mm] per cover over diameter; from memory
UNIFORM = 2.0  # concentration of uniform attack: the bar loses radius all around


def cracking_penetration(diameter: Numeric, cover: Numeric) -> Numeric:
    r"""Mean loss of radius at which the cover cracks along a bar.

    Parameters
    ----------
    diameter : numeric
        Sound diameter, :math:`\phi`. [mm]
    cover : numeric
        Cover of the bar, :math:`c`. [mm]

    Returns
    -------
    numeric
        :math:`x_0 = (7.53 + 9.32\, c/\phi) \cdot 10^{-3}`. [mm]

    Notes
    -----
    Fitted to accelerated tests on bars of 3 to 16 mm with covers of 10 to 70 mm; the first
    visible crack (0.05 mm).

    References
    ----------
    .. [1] C. Alonso, C. Andrade, J. Rodriguez, J. M. Diez, Factors controlling cracking of concrete
       affected by reinforcement corrosion, Mater. Struct. 31 (1998) 435-441. Not seen: formula
       and range from memory.

    Examples
    --------
    >>> round(cracking_penetration(16.0, 30.0), 6)
    0.025005
    """
    return CRACKING_CONSTANT + CRACKING_SLOPE * cover / diameter  # [1]


def area_loss(diameter: Numeric, penetration: Numeric, concentration: Numeric) -> Numeric:
    r"""Area of steel lost at a bar whose mean loss of radius is known.

    Parameters
    ----------
    diameter : numeric
        Sound diameter, :math:`\phi`. [mm]
    penetration : numeric
        Mean loss of radius, :math:`x`, at most :math:`\phi / \alpha`. [mm]
    concentration : numeric
        Concentration of the attack, :math:`\alpha`: 2 uniform, 4 to 8 local. [-]

    Returns
    -------
    numeric
        :math:`\Delta A_s = A_s [1 - (1 - \alpha x / \phi)^2]`. [mm²]

    References
    ----------
    .. [1] T. Vidal, A. Castel, R. François, Analyzing crack width to predict corrosion in
       reinforced concrete, Cem. Concr. Res. 34 (2004) 165-174. Abstract read, formulas from
       memory.

    Examples
    --------
    >>> round(area_loss(16.0, 0.025005, 2.0), 4)
    1.2549
    """
    remaining = 1.0 - concentration * penetration / diameter
    return 0.25 * np.pi * diameter**2 * (1.0 - remaining**2)


def penetration_from_area_loss(diameter: Numeric, loss: Numeric, concentration: Numeric) -> Numeric:
    r"""Mean loss of radius from an area of steel lost; inverse of `area_loss`.

    Parameters
    ----------
    diameter : numeric
        Sound diameter, :math:`\phi`. [mm]
    loss : numeric
        Area lost, :math:`\Delta A_s`, at most the bar's. [mm²]
    concentration : numeric
        :math:`\alpha`, as in `area_loss`. [-]

    Returns
    -------
    numeric
        :math:`x = (\phi / \alpha) [1 - \sqrt{1 - \Delta A_s / A_s}]`. [mm]

    Examples
    --------
    >>> round(float(penetration_from_area_loss(16.0, area_loss(16.0, 0.1, 4.0), 4.0)), 9)
    0.1
    """
    share = loss / (0.25 * np.pi * diameter**2)
    return diameter / concentration * (1.0 - np.sqrt(1.0 - share))


def crack_width(
    diameter: Numeric, cover: Numeric, penetration: Numeric, concentration: Numeric = UNIFORM
) -> Numeric:
    r"""Width of the crack along a corroding bar.

    Parameters
    ----------
    diameter, cover : numeric
        Of the bar. [mm]
    penetration : numeric
        Mean loss of radius, :math:`x`, beyond `cracking_penetration`. [mm]
    concentration : numeric, default 2
        :math:`\alpha`, as in `area_loss`. [-]

    Returns
    -------
    numeric
        :math:`w = 0.0575 (\Delta A_s - \Delta A_{s0})`, with :math:`\Delta A_{s0}` the area lost
        at :math:`x_0`; below zero before the cover cracks. [mm]

    References
    ----------
    .. [1] T. Vidal, A. Castel, R. François, Cem. Concr. Res. 34 (2004) 165-174. Abstract read,
       formula from memory; two beams kept under load in salt fog for 14 and 17 years, bars of
       12 and 16 mm.

    Examples
    --------
    >>> x = penetration_from_area_loss(16.0, 9.9506, 2.0)
    >>> round(float(crack_width(16.0, 30.0, x)), 4)
    0.5
    """
    first = area_loss(diameter, cracking_penetration(diameter, cover), concentration)
    return WIDTH_PER_AREA * (area_loss(diameter, penetration, concentration) - first)  # [1]


def penetration_from_width(
    diameter: Numeric, cover: Numeric, width: Numeric, concentration: Numeric = UNIFORM
) -> Numeric:
    r"""Mean loss of radius from the width of the crack along a bar; inverse of `crack_width`.

    Parameters
    ----------
    diameter, cover : numeric
        Of the bar. [mm]
    width : numeric
        Of the crack, :math:`w`; 0 gives the loss that just cracks the cover. [mm]
    concentration : numeric, default 2
        :math:`\alpha`, as in `area_loss`. [-]

    Returns
    -------
    numeric
        :math:`x`. [mm] NaN where the crack would need more than the bar's area.

    Examples
    --------
    >>> round(float(penetration_from_width(16.0, 30.0, 0.0)), 6)
    0.025005
    """
    first = area_loss(diameter, cracking_penetration(diameter, cover), concentration)
    return penetration_from_area_loss(diameter, first + width / WIDTH_PER_AREA, concentration)


def widest_crack(diameter: Numeric, cover: Numeric, concentration: Numeric = UNIFORM) -> Numeric:
    """Give the width at which the relation has used the bar up, beyond which it says nothing.

    Parameters
    ----------
    diameter, cover : numeric
        Of the bar. [mm]
    concentration : numeric, default 2
        As in `area_loss`. [-]

    Returns
    -------
    numeric
        Width. [mm]

    Examples
    --------
    >>> round(widest_crack(16.0, 30.0), 2)
    11.49
    """
    return crack_width(diameter, cover, diameter / concentration, concentration)
