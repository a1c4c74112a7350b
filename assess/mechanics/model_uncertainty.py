"""Model uncertainties and self weights of the JCSS Probabilistic Model Code, as data."""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Literal


@dataclass(frozen=True, slots=True)
class ModelUncertainty:
    """Factor on what a model gives: distribution, mean [-] and coefficient of variation [-]."""

    mean: float
    variation: float
    distribution: Literal["lognormal"]
    source: str


@dataclass(frozen=True, slots=True)
class SelfWeight:
    """Weight density: mean [kN/m³] and coefficient of variation over a large population [-]."""

    density: float
    variation: float
    source: str


_TABLE_SOURCE = "JCSS Probabilistic Model Code, part 3.9, table 3.9.1"
_WEIGHT_SOURCE = "JCSS Probabilistic Model Code, part 2.1, table of weight densities"


def _lognormal(mean: float, variation: float) -> ModelUncertainty:
    return ModelUncertainty(mean, variation, "lognormal", _TABLE_SOURCE)


# Read in the code's text repository (JCSS-PMC/PMC on GitHub, part-03/model-uncertainties.md).
# Its rows for stresses in solids print a mean of 0.0, which no factor can have; left out.
MODEL_UNCERTAINTIES: Mapping[str, ModelUncertainty] = MappingProxyType(
    {
        "load effect: moments in frames": _lognormal(1.0, 0.10),
        "load effect: axial forces in frames": _lognormal(1.0, 0.05),
        "load effect: shear forces in frames": _lognormal(1.0, 0.10),
        "load effect: moments in plates": _lognormal(1.0, 0.20),
        "load effect: forces in plates": _lognormal(1.0, 0.10),
        "steel: bending": _lognormal(1.0, 0.05),
        "steel: shear": _lognormal(1.0, 0.05),
        "steel: welded connection": _lognormal(1.15, 0.15),
        "steel: bolted connection": _lognormal(1.25, 0.15),
        "concrete: bending": _lognormal(1.2, 0.15),  # including normal and shear force
        "concrete: shear": _lognormal(1.4, 0.25),
        "concrete: connection": _lognormal(1.0, 0.10),
    }
)

# Read in the same repository, part-02/self-weight.md. High-strength concrete is printed as a
# range of 24 to 26; its middle is taken. Steel is printed as below 0.01; 0.01 is taken.
SELF_WEIGHTS: Mapping[str, SelfWeight] = MappingProxyType(
    {
        "ordinary concrete": SelfWeight(24.0, 0.04, _WEIGHT_SOURCE),
        "high-strength concrete": SelfWeight(25.0, 0.03, _WEIGHT_SOURCE),
        "steel": SelfWeight(77.0, 0.01, _WEIGHT_SOURCE),
    }
)
SELF_WEIGHT_CORRELATION_MEMBER = 0.85  # [-] rho_0, far points of one member, part 2.1
SELF_WEIGHT_CORRELATION_STRUCTURE = 0.70  # [-] rho_m, members of one structure, part 2.1


def model_uncertainty(name: str) -> ModelUncertainty:
    """Look up a row of the JCSS table of model uncertainties.

    Parameters
    ----------
    name : str
        A key of `MODEL_UNCERTAINTIES`, e.g. ``"concrete: bending"``.

    Returns
    -------
    ModelUncertainty
        With its source.

    Raises
    ------
    ValueError
        If the table has no such row; the message lists those it has.

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.9, table 3.9.1.

    Examples
    --------
    >>> row = model_uncertainty("concrete: bending")
    >>> row.mean, row.variation
    (1.2, 0.15)
    """
    try:
        return MODEL_UNCERTAINTIES[name]
    except KeyError:
        known = "; ".join(MODEL_UNCERTAINTIES)
        raise ValueError(f"no model uncertainty {name!r}; known: {known}") from None


def large_part_variation(variation: float, correlation: float) -> float:
    r"""Coefficient of variation of the weight of a part much larger than the correlation length.

    Parameters
    ----------
    variation : float
        Of the weight density at a point, V. [-]
    correlation : float
        Between its distant points, :math:`\rho` in [0, 1]. [-]

    Returns
    -------
    float
        :math:`V \sqrt\rho`. [-]

    Raises
    ------
    ValueError
        If `correlation` is outside [0, 1].

    Notes
    -----
    The mean of many equally correlated values has variance :math:`\rho V^2`. The stored text of
    the code prints :math:`V \rho`, most likely with the root lost; the root is the derivation's
    and on the safe side.

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 2.1, note on spatial correlation.

    Examples
    --------
    >>> round(large_part_variation(0.04, SELF_WEIGHT_CORRELATION_MEMBER), 5)
    0.03688
    """
    if not 0 <= correlation <= 1:
        raise ValueError(f"correlation must be in [0, 1], got {correlation:g}")
    return float(variation * correlation**0.5)
