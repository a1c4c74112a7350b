"""Cores as tested to logarithms of strength in the structure, with the errors of the factors."""

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from assess.case.forms import Table
from assess.mechanics.core_corrections import correction
from assess.mechanics.core_corrections_en import (
    BAR_UNCERTAINTY,
    bar_correction,
    length_correction_en,
)
from assess.updating.kind import Numeric, Rows

FloatArray = NDArray[np.float64]

# Errors that all cores share, each in its own standard deviations.
CORRECTIONS = ("length", "diameter", "moisture", "damage", "bar")
BARS = (("bar diameter", "bar distance"), ("second bar diameter", "second bar distance"))


class CoreValues(NamedTuple):
    """What a table of cores says."""

    log_strength: FloatArray  # of strength in the structure [ln MPa], (n_core,)
    loading: FloatArray  # of each core on the errors of `CORRECTIONS`, (n_core, 5)


def core_values(table: Table, rule: str) -> CoreValues:
    """Correct a table of cores.

    Parameters
    ----------
    table : Table
        Cores as tested: MPa and mm.
    rule : str
        ``"ACI 214.4R"``, ``"EN 13791"`` or ``"none"``.

    Returns
    -------
    CoreValues
        Corrected strengths; where the rule is none, as they stand in the table.
    """
    strength = table.numbers["strength"]
    loading = np.zeros((len(strength), len(CORRECTIONS)))
    if rule == "none":
        return CoreValues(np.log(strength), loading)
    diameter, length = table.numbers["diameter"], table.numbers["length"]
    if rule == "EN 13791":
        shape = length_correction_en(diameter, length)
        factor = shape.factor
        loading[:, 0] = shape.V
    else:
        found = correction(strength, diameter, length, table.texts["moisture"])
        factor = found.factor
        parts = (found.V_length, found.V_diameter, found.V_moisture, found.V_damage)
        loading[:, : len(parts)] = np.stack(parts, axis=-1)
    bars, distances = (np.stack([table.numbers[pair[k]] for pair in BARS], axis=-1) for k in (0, 1))
    for_bars = bar_correction(diameter, length, bars, distances)
    loading[:, 4] = BAR_UNCERTAINTY * (for_bars - 1.0)
    return CoreValues(np.log(strength * factor * for_bars), loading)


def correction_shift(rows: Rows, values: Mapping[str, Numeric]) -> Numeric:
    """Sum the errors of the correction factors of each core, last axis row."""
    shift: Numeric = 0.0
    for k, name in enumerate(CORRECTIONS):
        error = values.get(f"cores.{name}_correction")
        if error is not None:
            shift = shift + error[..., None] * rows.extra["loading"][:, k]
    return shift
