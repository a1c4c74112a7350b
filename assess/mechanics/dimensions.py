"""Geometry of reinforced sections, and how far built dimensions stray from the drawings."""

from collections.abc import Mapping, Sequence
from types import MappingProxyType
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
Numeric = Any  # float, ndarray or PyTensor variable


class Deviation(NamedTuple):
    """Mean and standard deviation of built minus nominal, both in mm."""

    mean: FloatArray
    sd: FloatArray


class DeviationRange(NamedTuple):
    """Intervals for mean and standard deviation of built minus nominal, in mm."""

    mean: tuple[float, float]
    sd: tuple[float, float]


DIMENSION_SOURCE = "JCSS Probabilistic Model Code, part 3.10 (dimensions)"

# Cover by kind of member; the code calls them very gross first estimates. Normal is a poor model.
COVER_DEVIATIONS: Mapping[str, DeviationRange] = MappingProxyType(
    {
        "column or wall": DeviationRange((0.0, 5.0), (5.0, 10.0)),
        "slab bottom": DeviationRange((0.0, 10.0), (5.0, 10.0)),
        "beam bottom": DeviationRange((-10.0, 0.0), (5.0, 10.0)),
        "slab or beam top": DeviationRange((0.0, 10.0), (10.0, 15.0)),
    }
)
# The code's text gives a mean of about 10 mm without a sign for shallower; sd about 10 mm.
EFFECTIVE_DEPTH_SD = 10.0  # [mm]


def effective_depth(
    depth: Numeric, cover: Numeric, link_diameter: Numeric, bar_diameter: Numeric
) -> Numeric:
    """Compressed face to the centre of a single layer of bars.

    Parameters
    ----------
    depth : numeric
        Overall depth of the section. [mm]
    cover : numeric
        Concrete outside the links on the tension side. [mm] Where the cover given is that of the
        main bars, the link diameter is 0.
    link_diameter, bar_diameter : numeric
        Of links and main bars. [mm]

    Returns
    -------
    numeric
        ``depth - cover - link_diameter - bar_diameter / 2``. [mm] Arguments broadcast, and may be
        PyTensor variables.

    Examples
    --------
    >>> effective_depth(500.0, 30.0, 10.0, 20.0)
    450.0
    """
    return depth - cover - link_diameter - 0.5 * bar_diameter


def effective_depth_of_layers(
    depth: ArrayLike,
    cover: ArrayLike,
    link_diameter: ArrayLike,
    bar_diameters: Sequence[ArrayLike],
    areas: Sequence[ArrayLike],
    clear_distances: Sequence[ArrayLike],
) -> FloatArray:
    """Compressed face to the centroid of several layers of bars.

    Parameters
    ----------
    depth, cover, link_diameter : array_like
        As for `effective_depth`. [mm]
    bar_diameters : sequence of array_like
        Sound diameter of the bars of each layer, from the tension face inwards. [mm]
    areas : sequence of array_like
        Steel left in each layer, same order. [mm²] Layers that corrode differently move the
        centroid. At least one area must be above zero.
    clear_distances : sequence of array_like
        Clear distance between successive layers, one fewer than layers. [mm]

    Returns
    -------
    ndarray
        Effective depth of all layers together. [mm]

    Raises
    ------
    ValueError
        If the three sequences do not belong to the same number of layers.

    Notes
    -----
    The resistance formulas take all the steel at its centroid: outer layers strain more, so this
    is right only where all layers yield.

    Examples
    --------
    >>> float(effective_depth_of_layers(500, 30, 10, [20, 20], [942.5, 942.5], [20]))
    430.0
    """
    layers = len(bar_diameters)
    if layers == 0 or len(areas) != layers or len(clear_distances) != layers - 1:
        raise ValueError(
            "layers of bars need one diameter and one area each and one clear distance fewer, got "
            f"{layers} diameters, {len(areas)} areas, {len(clear_distances)} clear distances"
        )
    edge = np.asarray(cover, dtype=np.float64) + np.asarray(link_diameter)
    area_sum: FloatArray = np.zeros(())
    moment_sum: FloatArray = np.zeros(())
    for layer in range(layers):
        if layer > 0:
            edge = edge + np.asarray(clear_distances[layer - 1])
        diameter = np.asarray(bar_diameters[layer], dtype=np.float64)
        area = np.asarray(areas[layer], dtype=np.float64)
        area_sum = area_sum + area
        moment_sum = moment_sum + area * (edge + 0.5 * diameter)
        edge = edge + diameter
    return np.asarray(np.asarray(depth) - moment_sum / area_sum)


def dimension_deviation(nominal: ArrayLike) -> Deviation:
    r"""Deviation of an outer concrete dimension from its nominal value.

    Parameters
    ----------
    nominal : array_like
        Nominal dimension, :math:`X_{nom} > 0`. [mm] Beyond 1000 mm the values of 1000 mm hold.

    Returns
    -------
    Deviation
        Mean :math:`0.003 X_{nom} \le 3` mm and standard deviation
        :math:`4 + 0.006 X_{nom} \le 10` mm of a normal distribution.

    Raises
    ------
    ValueError
        If a dimension is not positive.

    Notes
    -----
    For cast-in-place and precast members together. Width and depth are nearly uncorrelated (about
    0.12).

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.10, eqs 2 and 3; read in the code's text
       repository (JCSS-PMC/PMC on GitHub, part-03/dimensions.md).

    Examples
    --------
    >>> mean, sd = dimension_deviation(500.0)
    >>> float(mean), float(sd)
    (1.5, 7.0)
    """
    nominal = np.asarray(nominal, dtype=np.float64)
    if np.any(nominal <= 0):
        raise ValueError(f"a nominal dimension must be positive [mm], got {np.min(nominal):g}")
    return Deviation(
        np.asarray(np.minimum(0.003 * nominal, 3.0)),
        np.asarray(np.minimum(4.0 + 0.006 * nominal, 10.0)),
    )
