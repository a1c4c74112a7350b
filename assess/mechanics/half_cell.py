"""Half-cell potentials of reinforcement: one reference electrode, and the classes of ASTM C876."""

from collections.abc import Mapping
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

IntArray = NDArray[np.int64]
FloatArray = NDArray[np.float64]

# Potentials against the standard hydrogen electrode at 25 °C [mV]. Copper sulfate, calomel
# (saturated KCl) and silver chloride in saturated KCl: International Journal of Corrosion 2010,
# 756950, "Reference Electrodes in Metal Corrosion", table 2 (read). Silver chloride in 3 M KCl:
# table of common reference electrodes at consultrsr.net (read).
REFERENCE_POTENTIAL: Mapping[str, float] = MappingProxyType(
    {
        "copper sulfate": 316.0,
        "calomel": 241.0,
        "silver chloride, saturated KCl": 197.0,
        "silver chloride, 3 M KCl": 210.0,
    }
)
# ASTM C876 against the copper sulfate electrode [mV]: limits read in a secondary source.
PASSIVE_LIMIT = -200.0
ACTIVE_LIMIT = -350.0
CLASSES = ("above -200 mV", "-200 to -350 mV", "below -350 mV")


def against_copper_sulfate(potential: ArrayLike, electrode: str) -> FloatArray:
    r"""Potential against the copper sulfate electrode from that against another one.

    Parameters
    ----------
    potential : array_like
        Reading against ``electrode``, :math:`E`. [mV]
    electrode : str
        One of `REFERENCE_POTENTIAL`.

    Returns
    -------
    ndarray
        Reading that a copper sulfate electrode would have given. [mV]

    Notes
    -----
    .. math:: E_{CSE} = E + E_{ref} - 316

    with the electrode's potential :math:`E_{ref}` against the standard hydrogen electrode, at
    25 °C; liquid junctions and temperature are left out (a few mV).

    References
    ----------
    .. [1] Reference electrodes in metal corrosion, Int. J. Corros. 2010, 756950, table 2.

    Examples
    --------
    >>> float(against_copper_sulfate(-275.0, "calomel"))
    -350.0
    """
    shift = REFERENCE_POTENTIAL[electrode] - REFERENCE_POTENTIAL["copper sulfate"]
    return np.asarray(potential, dtype=np.float64) + shift


def potential_class(potential: ArrayLike) -> IntArray:
    """Class of ASTM C876 of a potential.

    Parameters
    ----------
    potential : array_like
        Against the copper sulfate electrode. [mV]

    Returns
    -------
    ndarray of int
        Index into `CLASSES`: 0 where more positive than -200 mV, 2 where more negative than
        -350 mV, else 1 (the limits themselves belong to the uncertain class).

    References
    ----------
    .. [1] ASTM C876, Standard test method for corrosion potentials of uncoated reinforcing steel
       in concrete, appendix (limits read in a secondary source).

    Examples
    --------
    >>> potential_class([-150.0, -200.0, -350.0, -351.0]).tolist()
    [0, 1, 1, 2]
    """
    value = np.asarray(potential, dtype=np.float64)
    return (value <= PASSIVE_LIMIT).astype(np.int64) + (value < ACTIVE_LIMIT)
