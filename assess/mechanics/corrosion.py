"""Corrosion of reinforcing bars: from current density to what is left of the bar."""

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from assess import operations

FloatArray = NDArray[np.float64]
Numeric = Any  # float, ndarray or PyTensor variable

FARADAY = 96485.33212  # [C/mol] CODATA 2018
IRON_MOLAR_MASS = 55.845  # [g/mol] IUPAC
IRON_VALENCE = 2  # [-] Fe -> Fe2+ + 2 e-
IRON_DENSITY = 7.87  # [g/cm³] pure iron; steel 7.85 gives 0.3 % more
SECONDS_PER_YEAR = 365.25 * 86400.0  # [s/yr]
UNIT_PENETRATION = (1e-6 * SECONDS_PER_YEAR * 10.0 * IRON_MOLAR_MASS) / (
    IRON_VALENCE * FARADAY * IRON_DENSITY
)  # [(mm/yr)/(µA/cm²)], 0.01160

# Stewart (2004), Stewart & Al-Harthy (2008): bar diameter [mm], location [-] and inverse scale
# [-] of the largest pitting factor over the tested length [mm]. Values from memory.
_PITTING_DIAMETER = np.array([10.0, 16.0, 27.0])
_PITTING_LOCATION = np.array([5.08, 5.56, 6.55])
_PITTING_INVERSE_SCALE = np.array([1.02, 1.16, 1.07])
_PITTING_LENGTH = np.array([125.0, 100.0, 100.0])
_REFERENCE_LENGTH = 100.0

YIELD_LOSS_SLOPE = 0.5  # [-] per fraction of section lost: alpha_y = 0.005 per percent, from memory


class PittingFactor(NamedTuple):
    """Gumbel distribution (maxima) of the largest pitting factor of one bar length."""

    location: FloatArray  # mode [-]
    inverse_scale: FloatArray  # [-]


def time_corroding(age: Numeric, onset: Numeric) -> Numeric:
    """Years for which a bar has been corroding; zero before depassivation.

    Parameters
    ----------
    age : numeric
        Age of the structure. [yr]
    onset : numeric
        Age at depassivation. [yr]

    Returns
    -------
    numeric
        Time of active corrosion, ``max(0, age - onset)``. [yr] Arguments broadcast, and may be
        PyTensor variables.

    Examples
    --------
    >>> float(time_corroding(40.0, 25.0)), float(time_corroding(20.0, 25.0))
    (15.0, 0.0)
    """
    return operations.maximum(age - onset, 0.0)


def penetration_depth(current: Numeric, age_of_corrosion: Numeric) -> Numeric:
    r"""Radius of steel lost at a bar by uniform corrosion.

    Parameters
    ----------
    current : numeric
        Mean corrosion current density since onset, :math:`i_{corr}`. [µA/cm²]
    age_of_corrosion : numeric
        Time since depassivation, see `time_corroding`. [yr]

    Returns
    -------
    numeric
        Mean penetration, :math:`p`. [mm] Arguments broadcast: draws ``(draw, 1)`` against years
        ``(year,)`` give ``(draw, year)``. PyTensor variables are accepted.

    Notes
    -----
    .. math:: p = \frac{M}{z F \rho} \, i_{corr} \, t

    Faraday's law for iron dissolving as Fe2+; the constant is 0.0116 mm/yr for 1 µA/cm² [1]_. The
    bar diameter shrinks by twice this depth.

    References
    ----------
    .. [1] C. Andrade, C. Alonso, Test methods for on-site corrosion rate measurement of steel
       reinforcement in concrete by means of the polarization resistance method (RILEM TC
       154-EMC), Mater. Struct. 37 (2004) 623-643. Paper not seen; 0.0116 read in a secondary
       source.

    Examples
    --------
    >>> round(penetration_depth(1.0, 50.0), 3)
    0.58
    """
    return UNIT_PENETRATION * current * age_of_corrosion


def residual_area_uniform(diameter: Numeric, penetration: Numeric) -> Numeric:
    r"""Area of a bar after uniform corrosion all around.

    Parameters
    ----------
    diameter : numeric
        Sound diameter, :math:`D`. [mm]
    penetration : numeric
        Radius lost, :math:`p`. [mm]

    Returns
    -------
    numeric
        Residual area, :math:`\pi (D - 2p)_+^2 / 4`. [mm²] Arguments broadcast, and may be
        PyTensor variables.

    Examples
    --------
    >>> round(float(residual_area_uniform(16.0, 1.0)), 2)
    153.94
    """
    remaining = operations.maximum(diameter - 2.0 * penetration, 0.0)
    return 0.25 * np.pi * remaining**2


def pit_depth(penetration: Numeric, pitting_factor: Numeric) -> Numeric:
    r"""Depth of the deepest pit from the mean penetration.

    Parameters
    ----------
    penetration : numeric
        Mean penetration, :math:`p_{av}`. [mm]
    pitting_factor : numeric
        Deepest over mean penetration, :math:`R`; 1 is uniform attack. [-]

    Returns
    -------
    numeric
        Pit depth, :math:`R \, p_{av}`. [mm]

    References
    ----------
    .. [1] J. A. González, C. Andrade, C. Alonso, S. Feliu, Comparison of rates of general
       corrosion and maximum pitting penetration on concrete embedded steel reinforcement, Cem.
       Concr. Res. 25 (1995) 257-264: R from 4 to 8 in natural exposure (from memory).
    """
    return pitting_factor * penetration


def residual_area_pit(diameter: ArrayLike, pit_depth: ArrayLike) -> FloatArray:
    r"""Area of a bar at a hemispherical pit.

    Parameters
    ----------
    diameter : array_like
        Sound diameter, :math:`D > 0`. [mm]
    pit_depth : array_like
        Depth of the pit, :math:`p`, from the original surface. [mm] Below 0 counts as no pit,
        above `diameter` as a bar cut through.

    Returns
    -------
    ndarray
        Residual area. [mm²] Arguments broadcast.

    Notes
    -----
    Val and Melchers [1]_ take the pit as the part of the bar inside a circle of radius :math:`p`
    about a point of the bar's surface, and write its area in three branches (up to
    :math:`D/\sqrt 2`, up to :math:`D`, beyond). All three are the common area (lens) of the two
    circles, hence one expression for what is left. With :math:`q = p/D` held to [0, 1],

    .. math:: A = \frac{D^2}{2} \left[(1 - 2 q^2) \arccos q + q \sqrt{1 - q^2}\right]

    which costs one inverse cosine and one root, and has no branch to be continuous across.

    References
    ----------
    .. [1] D. V. Val, R. E. Melchers, Reliability of deteriorating RC slab bridges, J. Struct.
       Eng. 123 (1997) 1638-1644. Paper not seen; geometry from memory, checked against the
       lens area of two circles.

    Examples
    --------
    >>> round(float(residual_area_pit(16.0, 4.0)), 3)
    178.613
    """
    diameter = np.asarray(diameter, dtype=np.float64)
    ratio = np.minimum(np.maximum(np.asarray(pit_depth) / diameter, 0.0), 1.0)
    square = ratio * ratio
    bracket = (1.0 - 2.0 * square) * np.arccos(ratio) + ratio * np.sqrt(1.0 - square)
    # Next to a cut bar the two terms cancel to rounding; an area is never below zero.
    return np.asarray(0.5 * diameter * diameter * np.maximum(bracket, 0.0))


def pitting_factor_distribution(diameter: ArrayLike, length: ArrayLike) -> PittingFactor:
    r"""Distribution of the largest pitting factor along a length of one bar.

    Parameters
    ----------
    diameter : array_like
        Bar diameter. [mm]
    length : array_like
        Length of bar over which the deepest pit counts. [mm] The tests cover 100 to 125 mm;
        shorter lengths extrapolate.

    Returns
    -------
    PittingFactor
        Location and inverse scale of a Gumbel distribution of maxima. [-]

    Raises
    ------
    ValueError
        If a diameter or a length is not positive.

    Notes
    -----
    Gumbel parameters :math:`(\mu_0, \alpha_0)` of bars tested over :math:`L_0`: 8 and 10 mm
    (5.08, 1.02; 125 mm), 16 mm (5.56, 1.16; 100 mm), 27 mm (6.55, 1.07; 100 mm) [1]_ [2]_. For
    another length, with pits at distant places independent,

    .. math:: \mu = \mu_0 + \ln(L / L_0) / \alpha_0

    Between tested diameters, location (at equal length) and scale :math:`1/\alpha` are
    interpolated linearly, so that the length law holds there too; below 10 mm and above 27 mm
    the nearest tested bar is taken. The interpolation is ours, not the papers'.

    **Conflict.** All six parameters are from memory. Mean and coefficient of variation
    remembered beside them are 5.65, 0.22 (10 mm), 6.2, 0.18 (16 mm) and 7.1, 0.17 (27 mm). The
    parameters give 5.65, 6.06 and 7.09: those of 16 mm do not fit their mean, which would ask
    for (5.70, 1.149). The parameters are kept here; the paper has to decide.

    References
    ----------
    .. [1] M. G. Stewart, Spatial variability of pitting corrosion and its influence on
       structural fragility and reliability of RC beams in flexure, Struct. Saf. 26 (2004)
       453-470.
    .. [2] M. G. Stewart, A. Al-Harthy, Pitting corrosion and structural reliability of corroding
       RC structures: experimental data and probabilistic analysis, Reliab. Eng. Syst. Saf. 93
       (2008) 373-382.

    Examples
    --------
    >>> location, inverse_scale = pitting_factor_distribution(16.0, 1000.0)
    >>> round(float(location), 3), round(float(inverse_scale), 2)
    (7.545, 1.16)
    """
    diameter = np.asarray(diameter, dtype=np.float64)
    length = np.asarray(length, dtype=np.float64)
    for name, value in (("bar diameter", diameter), ("bar length", length)):
        if np.any(value <= 0):
            raise ValueError(f"{name} must be positive [mm], got {np.min(value):g}")
    scales = 1.0 / _PITTING_INVERSE_SCALE
    locations = _PITTING_LOCATION + np.log(_REFERENCE_LENGTH / _PITTING_LENGTH) * scales
    scale = np.interp(diameter, _PITTING_DIAMETER, scales)
    location = np.interp(diameter, _PITTING_DIAMETER, locations)
    return PittingFactor(location + np.log(length / _REFERENCE_LENGTH) * scale, 1.0 / scale)


def residual_yield_strength(
    yield_strength: Numeric, section_loss: Numeric, slope: Numeric = YIELD_LOSS_SLOPE
) -> Numeric:
    r"""Yield strength of a corroded bar, on its remaining area.

    Parameters
    ----------
    yield_strength : numeric
        Of the sound bar, :math:`f_{y0}`. [MPa]
    section_loss : numeric
        Lost over sound area, :math:`Q`. [-]
    slope : numeric, default 0.5
        Fraction of strength lost per fraction of area lost, :math:`\alpha_y`. [-]

    Returns
    -------
    numeric
        :math:`f_y = f_{y0} (1 - \alpha_y Q)_+`. [MPa]

    References
    ----------
    .. [1] Y. G. Du, L. A. Clark, A. H. C. Chan, Residual capacity of corroded reinforcing bars,
       Mag. Concr. Res. 57 (2005) 135-147: 0.005 per percent of loss, from memory.

    Examples
    --------
    >>> float(residual_yield_strength(500.0, 0.10))
    475.0
    """
    return yield_strength * operations.maximum(1.0 - slope * section_loss, 0.0)
