"""Core strength to strength in the structure by the European standards, and bars in a core."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from assess.mechanics.core_corrections import require_shape

FloatArray = NDArray[np.float64]

SHORT_CORE_FACTOR = 0.82  # EN 13791:2019, core of l/d = 1 to one of l/d = 2; from memory
SMALLEST_DIAMETER = 75.0  # [mm] EN 13791:2019, smaller cores ask for three times as many
DIAMETER_RANGE_EN = (0.95 * SMALLEST_DIAMETER, 210.0)  # [mm] 5 % for the drill's size
RATIO_RANGE_EN = (0.9, 2.1)  # [-] beyond 1 to 2 counts as the end value
BAR_COEFFICIENT = 1.5
BAR_UNCERTAINTY = 0.5  # of what the correction for bars adds. Engineering judgement, no source.
LENGTH_VARIATION = 0.025  # times (2 - l/d)², ACI 214.4R-10: the European standards give none


@dataclass(frozen=True, slots=True, eq=False)
class LengthCorrection:
    """Factor from core strength to that of a core twice as long as wide; arrays of one shape."""

    factor: FloatArray
    V: FloatArray  # its coefficient of variation, common to all cores


def length_correction_en(diameter: ArrayLike, length: ArrayLike) -> LengthCorrection:
    r"""Correct core strengths for their shape as EN 13791:2019 does.

    Parameters
    ----------
    diameter, length : array_like
        Of the core as tested. [mm] Diameter from 75 mm, length over diameter 1 to 2.

    Returns
    -------
    LengthCorrection
        Arguments broadcast; NaN gives NaN.

    Raises
    ------
    ValueError
        If a diameter, or length over diameter, is outside its range.

    Notes
    -----
    EN 13791 expresses strength in the structure as that of a core with l/d = 2 and gives the
    factor 0.82 for one with l/d = 1; cores are to have one of the two shapes. Between them

    .. math:: F = \frac{2}{1.5 + d/l}, \qquad F' = 1 - (1 - F) \frac{1 - 0.82}{1 - 0.8}

    the shape dependence F of BS 1881-120, 0.8 at l/d = 1, scaled to the factor of EN 13791.
    Neither moisture nor drilling is corrected for. The standard deviation of the factor is that
    of ACI 214.4R-10, :math:`V = 0.025 (2 - l/d)^2`, for the European standards state none.

    References
    ----------
    .. [1] EN 13791:2019, Assessment of in-situ compressive strength in structures and precast
       concrete components; EN 12504-1:2019 (both from memory).
    .. [2] BS 1881-120:1983, clause 5.5 (from memory).

    Examples
    --------
    >>> found = length_correction_en(100.0, [100.0, 150.0, 200.0])
    >>> found.factor.round(4).tolist(), found.V.round(4).tolist()
    ([0.82, 0.9308, 1.0], [0.025, 0.0062, 0.0])
    """
    diameters, lengths = np.broadcast_arrays(
        np.asarray(diameter, dtype=np.float64), np.asarray(length, dtype=np.float64)
    )
    ratio = lengths / diameters
    require_shape(diameters, ratio, DIAMETER_RANGE_EN, RATIO_RANGE_EN)
    held = np.clip(ratio, 1.0, 2.0)
    shape = 2.0 / (1.5 + 1.0 / held)
    scaled = 1.0 - (1.0 - shape) * (1.0 - SHORT_CORE_FACTOR) / (1.0 - 0.8)
    return LengthCorrection(np.asarray(scaled), np.asarray(LENGTH_VARIATION * (2.0 - held) ** 2))


def bar_correction(
    diameter: ArrayLike, length: ArrayLike, bar_diameter: ArrayLike, distance: ArrayLike
) -> FloatArray:
    r"""Correct core strengths for bars that cross the core.

    Parameters
    ----------
    diameter, length : array_like
        Of the core, :math:`\phi_c` and l, as tested. [mm]
    bar_diameter : array_like, last axis bar
        Of the bars in the core, :math:`\phi_r`; 0 or NaN where there is none. [mm]
    distance : array_like, last axis bar
        From the axis of each bar to the nearer end of the core, d. [mm]

    Returns
    -------
    ndarray
        Factor, 1 where there is no bar. Arguments broadcast.

    Notes
    -----
    .. math:: F = 1 + 1.5 \, \frac{\sum \phi_r d}{\phi_c \, l}

    for bars across the axis; bars closer to each other than the diameter of the larger count as
    that one alone. A bar along the axis spoils a core.

    References
    ----------
    .. [1] BS 1881-120:1983, clause 5.6; Concrete Society Technical Report 11 (1976), section 3
       (both from memory). EN 12504-1 asks for bars to be avoided and reported.

    Examples
    --------
    >>> round(float(bar_correction(100.0, 150.0, [12.0, 0.0], [40.0, 0.0])), 3)
    1.048
    """
    bars = np.nan_to_num(np.asarray(bar_diameter, dtype=np.float64))
    moment = (bars * np.nan_to_num(np.asarray(distance, dtype=np.float64))).sum(axis=-1)
    return np.asarray(1.0 + BAR_COEFFICIENT * moment / (np.asarray(diameter) * length))
