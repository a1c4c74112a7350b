"""Core strength to strength in the structure: ACI 214.4R factors with their uncertainty."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

# ACI 214.4R-10, table 9.1; all numbers from memory.
_LENGTH_COEFFICIENT = {"as received": 0.130, "soaked": 0.117, "air dried": 0.144}
_MOISTURE_FACTOR = {"as received": 1.00, "soaked": 1.09, "air dried": 0.96}
_STRENGTH_COEFFICIENT = 4.3e-4  # [1/MPa] 3e-6 per psi
_DIAMETER = np.array([50.0, 100.0, 150.0])  # [mm]
_DIAMETER_FACTOR = np.array([1.06, 1.00, 0.98])
_DIAMETER_VARIATION = np.array([0.118, 0.0, 0.018])
_DAMAGE_FACTOR = 1.06
_MOISTURE_VARIATION = 0.025
_DAMAGE_VARIATION = 0.025
_LENGTH_VARIATION = 0.025  # times (2 - l/d)²

MOISTURES = tuple(_MOISTURE_FACTOR)
DIAMETER_RANGE = (47.5, 157.5)  # [mm] the table's 50 to 150 mm with 5 % for the drill's size
RATIO_RANGE = (1.0, 2.1)  # [-] above 2 counts as 2


@dataclass(frozen=True, slots=True, eq=False)
class CoreCorrection:
    """Factor from core strength to strength in the structure; arrays of one shape.

    The ``V_`` are coefficients of variation of the single factors [-]. Each is an error of the
    factor, not of the core: it is the same for all cores of one kind, and does not average out.
    """

    factor: FloatArray
    V_length: FloatArray
    V_diameter: FloatArray
    V_moisture: FloatArray
    V_damage: FloatArray

    @property
    def V_total(self) -> FloatArray:
        """All four together as independent, a coefficient of variation."""
        squares = self.V_length**2 + self.V_diameter**2 + self.V_moisture**2 + self.V_damage**2
        return np.asarray(np.sqrt(squares))


def correction(
    strength: ArrayLike,
    diameter: ArrayLike,
    length: ArrayLike,
    moisture: str | ArrayLike,
    *,
    drilling_damage: bool = True,
) -> CoreCorrection:
    r"""Correct core strengths for shape, size, moisture and drilling.

    Parameters
    ----------
    strength : array_like
        Strength as measured on the core, :math:`f_{core}`. [MPa]
    diameter, length : array_like
        Of the core as tested. [mm] Diameter 50 to 150 mm (5 % beyond is taken as the end value),
        length over diameter 1 to 2 (up to 2.1 is taken as 2).
    moisture : str or array_like of str
        ``"as received"``, ``"soaked"`` (48 h in water) or ``"air dried"``.
    drilling_damage : bool, default True
        Whether the factor for damage by drilling applies; False leaves it and its variation out.

    Returns
    -------
    CoreCorrection
        Corrected strength is ``factor * strength``. Arguments broadcast; NaN gives NaN.

    Raises
    ------
    ValueError
        If a diameter, or length over diameter, is outside its range, or a moisture is unknown.

    Notes
    -----
    .. math:: f_c = F_{l/d} F_{dia} F_{mc} F_d f_{core}, \quad
       F_{l/d} = 1 - (k - \alpha f_{core}) (2 - l/d)^2

    with :math:`\alpha = 4.3 \cdot 10^{-4}` /MPa and k by moisture, 0.130 as received, 0.117
    soaked, 0.144 air dried; :math:`V_{l/d} = 0.025 (2 - l/d)^2`. :math:`F_{dia}` is 1.06, 1.00
    and 0.98 (V 0.118, 0, 0.018) at 50, 100 and 150 mm, both linear between; :math:`F_{mc}` is
    1.00, 1.09, 0.96 (V 0.025) and :math:`F_d` 1.06 (V 0.025). The corrected value is the strength
    in the structure at its usual moisture, not that of a standard specimen.

    All numbers are from memory; no page that shows the table was found.

    References
    ----------
    .. [1] ACI 214.4R-10, Guide for Obtaining Cores and Interpreting Compressive Strength
       Results, chapter 9, eq. 9-1, table 9.1 (from memory).
    .. [2] F. M. Bartlett, J. G. MacGregor, Equivalent specified concrete strength from core test
       data, Concr. Int. 17 (1995) no. 3, 52-58 (from memory).

    Examples
    --------
    >>> core = correction(30.0, 100.0, 150.0, "soaked")
    >>> round(float(30.0 * core.factor), 3), round(float(core.V_total), 4)
    (33.76, 0.0359)
    """
    strengths, diameters, lengths, moistures = np.broadcast_arrays(
        np.asarray(strength, dtype=np.float64),
        np.asarray(diameter, dtype=np.float64),
        np.asarray(length, dtype=np.float64),
        np.asarray(moisture, dtype=np.str_),
    )
    ratio = lengths / diameters
    require_shape(diameters, ratio, DIAMETER_RANGE, RATIO_RANGE)
    lack = (2.0 - np.minimum(ratio, 2.0)) ** 2
    coefficient = _by_moisture(moistures, _LENGTH_COEFFICIENT)
    length_factor = 1.0 - (coefficient - _STRENGTH_COEFFICIENT * strengths) * lack
    diameter_factor = np.interp(diameters, _DIAMETER, _DIAMETER_FACTOR)
    factor = length_factor * diameter_factor * _by_moisture(moistures, _MOISTURE_FACTOR)
    return CoreCorrection(
        factor=np.asarray(factor * (_DAMAGE_FACTOR if drilling_damage else 1.0)),
        V_length=np.asarray(_LENGTH_VARIATION * lack),
        V_diameter=np.asarray(np.interp(diameters, _DIAMETER, _DIAMETER_VARIATION)),
        V_moisture=np.full(ratio.shape, _MOISTURE_VARIATION),
        V_damage=np.full(ratio.shape, _DAMAGE_VARIATION if drilling_damage else 0.0),
    )


def _by_moisture(moistures: NDArray[np.str_], table: dict[str, float]) -> FloatArray:
    result = np.full(moistures.shape, np.nan)
    for name, value in table.items():
        result[moistures == name] = value
    if np.any(np.isnan(result)):
        unknown = moistures[np.isnan(result)].flat[0]
        raise ValueError(f"unknown core moisture {str(unknown)!r}; known: {', '.join(table)}")
    return result


def require_shape(
    diameter: FloatArray,
    ratio: FloatArray,
    diameters: tuple[float, float],
    ratios: tuple[float, float],
) -> None:
    """Refuse cores whose diameter, or length over diameter, is outside a rule's range.

    Raises
    ------
    ValueError
        With the first value outside.
    """
    for name, value, (low, high) in (
        ("core diameter [mm]", diameter, diameters),
        ("core length over diameter", ratio, ratios),
    ):
        outside = (value < low) | (value > high)
        if np.any(outside):
            raise ValueError(
                f"{name} must be from {low:g} to {high:g}, got {value[outside].flat[0]:.4g}"
            )
