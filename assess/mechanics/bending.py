"""Bending resistance of singly reinforced rectangular and T sections."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

STEEL_MODULUS = 200_000.0  # [MPa] EN 1992-1-1:2004, 3.2.7(4)
CRUSHING_STRAIN = 0.0035  # [-] EN 1992-1-1:2004, table 3.1, up to C50/60
BLOCK_STRESS = 0.85  # [-] eta = 1.0 (EN 1992-1-1:2004, 3.1.7(3)) times alpha_cc = 0.85
BLOCK_DEPTH = 0.80  # [-] lambda, EN 1992-1-1:2004, 3.1.7(3), up to C50/60

_TINY = 1e-300  # keeps 0/0 away when there is no steel


def bending_resistance(
    steel_area: ArrayLike,
    yield_strength: ArrayLike,
    concrete_strength: ArrayLike,
    effective_depth: ArrayLike,
    width: ArrayLike,
    flange_width: ArrayLike | None = None,
    flange_thickness: ArrayLike | None = None,
    *,
    block_stress: ArrayLike = BLOCK_STRESS,
    block_depth: ArrayLike = BLOCK_DEPTH,
    crushing_strain: float = CRUSHING_STRAIN,
    steel_modulus: float = STEEL_MODULUS,
) -> FloatArray:
    r"""Moment that a singly reinforced section resists when its concrete crushes.

    Parameters
    ----------
    steel_area : array_like
        Tension steel left after corrosion, :math:`A_s \ge 0`. [mm²]
    yield_strength : array_like
        Of the steel, :math:`f_y \ge 0`. [MPa]
    concrete_strength : array_like
        Cylinder strength in the structure, :math:`f_c > 0`. [MPa]
    effective_depth : array_like
        Compressed face to centroid of the steel, :math:`d`; below 0 counts as 0. [mm]
    width : array_like
        Of a rectangular section, or of the web of a T section, :math:`b_w`. [mm]
    flange_width, flange_thickness : array_like, optional
        Of the flange on the compressed side, :math:`b_f \ge b_w` and :math:`h_f`. [mm]
    block_stress, block_depth : array_like, default 0.85 and 0.80
        Uniform stress over :math:`f_c`, and depth of the stress block over that of the neutral
        axis. [-] See `stress_block_en1992` and `stress_block_aci318`.
    crushing_strain : float, default 0.0035
        Strain of the compressed edge at failure. [-]
    steel_modulus : float, default 200000
        Of the steel, up to yielding; no hardening. [MPa]

    Returns
    -------
    ndarray
        Bending resistance. [N·mm] Arguments broadcast, e.g. ``(draw, point, year)``.

    Raises
    ------
    ValueError
        If only one of the two flange dimensions is given, or a flange is narrower than its web.

    Notes
    -----
    Plane sections, no tension in the concrete. With block depth :math:`a`, its force per unit of
    stress is :math:`C(a) = \min(b_f a, \; b_w a + (b_f - b_w) h_f)`, and that of the steel

    .. math:: T(a) = A_s \min\left(f_y, \; E_s \varepsilon_{cu} \frac{\lambda d - a}{a}\right)

    :math:`C` rises and :math:`T` falls with :math:`a`, so equilibrium has one root. The root of
    a smaller-of-two is the larger (rising side) or smaller (falling side) of the two roots, each
    of which is closed: linear for steel that yields, quadratic for steel that does not. Minima
    and maxima of continuous functions leave no step between the four cases.

    The default block is that of EN 1992-1-1 [1]_ for strengths up to 50 MPa with
    :math:`\alpha_{cc} = 0.85` for sustained load (3.1.6(1)P, a national choice from 0.8 to 1.0);
    0.85 is the factor of ACI 318 [2]_ too. Clauses are quoted from memory.

    References
    ----------
    .. [1] EN 1992-1-1:2004, 3.1.7(3) and table 3.1.
    .. [2] ACI 318-19, 22.2.2.4.

    Examples
    --------
    >>> moment = bending_resistance(1500.0, 500.0, 30.0, 450.0, 300.0)
    >>> round(float(moment) / 1e6, 2)  # kN·m
    300.74
    """
    if (flange_width is None) != (flange_thickness is None):
        raise ValueError(
            "a T section needs both flange dimensions, got only "
            f"{'the thickness' if flange_width is None else 'the width'}"
        )
    stress = np.asarray(block_stress) * np.asarray(concrete_strength, dtype=np.float64)
    depth = np.maximum(np.asarray(effective_depth, dtype=np.float64), 0.0)
    web = np.asarray(width, dtype=np.float64)
    area = np.asarray(steel_area, dtype=np.float64)
    # Areas of concrete at block stress that balance the steel: yielded, and at crushing strain.
    yielded = area * np.asarray(yield_strength) / stress
    elastic = area * (steel_modulus * crushing_strain) / stress
    limit = np.asarray(block_depth) * depth

    if flange_width is None or flange_thickness is None:
        block = np.minimum(yielded / web, _elastic_depth(elastic, limit, web))
        return np.asarray(stress * web * block * (depth - 0.5 * block))

    flange = np.asarray(flange_width, dtype=np.float64)
    if np.any(flange < web):
        raise ValueError(
            f"the flange must be as wide as the web or wider, got a flange of {np.min(flange):g} "
            f"mm on a web of up to {np.max(web):g} mm"
        )
    thickness = np.asarray(flange_thickness, dtype=np.float64)
    overhang = (flange - web) * thickness
    block = np.minimum(
        np.maximum(yielded / flange, (yielded - overhang) / web),
        np.maximum(
            _elastic_depth(elastic, limit, flange), _elastic_depth(elastic, limit, web, overhang)
        ),
    )
    in_flange = np.minimum(block, thickness)
    in_web = web * block * (depth - 0.5 * block)
    return np.asarray(stress * (in_web + (flange - web) * in_flange * (depth - 0.5 * in_flange)))


def _elastic_depth(
    elastic: FloatArray, limit: FloatArray, width: FloatArray, overhang: FloatArray | float = 0.0
) -> FloatArray:
    """Solve ``(width a + overhang) a = elastic (limit - a)`` for the block depth a [mm]."""
    half = overhang + elastic
    root = np.sqrt(half * half + 4.0 * width * elastic * limit)
    return np.asarray(2.0 * elastic * limit / (half + root + _TINY))  # no cancellation


def stress_block_en1992(concrete_strength: ArrayLike) -> tuple[FloatArray, FloatArray]:
    r"""Rectangular stress block of EN 1992-1-1.

    Parameters
    ----------
    concrete_strength : array_like
        Characteristic cylinder strength, :math:`f_{ck}`. [MPa] Up to 90 MPa.

    Returns
    -------
    stress, depth : ndarray
        :math:`\eta` and :math:`\lambda`. [-] :math:`\alpha_{cc}` is not included.

    Raises
    ------
    ValueError
        If a strength is outside (0, 90] MPa.

    Notes
    -----
    :math:`\lambda = 0.8 - (f_{ck} - 50)/400` and :math:`\eta = 1 - (f_{ck} - 50)/200` above
    50 MPa, 0.8 and 1 up to there (eqs 3.19 to 3.22, from memory). A compressed zone that narrows
    towards its edge asks for 10 % less stress (note to 3.1.7(3)).

    References
    ----------
    .. [1] EN 1992-1-1:2004, 3.1.7(3).

    Examples
    --------
    >>> [round(float(value), 3) for value in stress_block_en1992(70.0)]
    [0.9, 0.75]
    """
    strength = np.asarray(concrete_strength, dtype=np.float64)
    if np.any((strength <= 0) | (strength > 90)):
        raise ValueError(
            f"concrete strength must be in (0, 90] MPa for the stress block of EN 1992-1-1, got "
            f"{np.min(strength):g} to {np.max(strength):g}"
        )
    excess = np.maximum(strength - 50.0, 0.0)
    return np.asarray(1.0 - excess / 200.0), np.asarray(0.8 - excess / 400.0)


def stress_block_aci318(concrete_strength: ArrayLike) -> tuple[FloatArray, FloatArray]:
    r"""Rectangular stress block of ACI 318.

    Parameters
    ----------
    concrete_strength : array_like
        Specified cylinder strength, :math:`f'_c`. [MPa] From 17 MPa.

    Returns
    -------
    stress, depth : ndarray
        0.85 and :math:`\beta_1`. [-] Goes with a crushing strain of 0.003.

    Raises
    ------
    ValueError
        If a strength is below 17 MPa.

    Notes
    -----
    :math:`\beta_1 = 0.85` from 17 to 28 MPa, then 0.05 less per 7 MPa, not below 0.65
    (table 22.2.2.4.3, from memory).

    References
    ----------
    .. [1] ACI 318-19, 22.2.2.4.

    Examples
    --------
    >>> [round(float(value), 3) for value in stress_block_aci318(35.0)]
    [0.85, 0.8]
    """
    strength = np.asarray(concrete_strength, dtype=np.float64)
    if np.any(strength < 17):
        raise ValueError(
            "concrete strength must be 17 MPa or more for the stress block of ACI 318, got "
            f"{np.min(strength):g}"
        )
    depth = np.clip(0.85 - 0.05 * (strength - 28.0) / 7.0, 0.65, 0.85)
    return np.full_like(depth, 0.85), np.asarray(depth)
