"""Cores whose shape the correction factors do not cover."""

import numpy as np

from assess.case.doubts import capped, written_column
from assess.case.forms import EvidenceForm, Table
from assess.errors import Fault
from assess.mechanics.core_corrections import DIAMETER_RANGE, RATIO_RANGE

_ELSE = "leave it out, or correct all strengths by other means and say correction: none"


def uncorrectable_cores(form: EvidenceForm, table: Table) -> list[Fault]:
    """Find cores that ACI 214.4R gives no factors for.

    Parameters
    ----------
    form : EvidenceForm
        That of the cores.
    table : Table
        One table of cores to be corrected, diameter and length in mm.

    Returns
    -------
    list of Fault
        Each with its line, the value as written and the range that is covered. A core that is
        too thick or too thin is not complained of a second time for its slenderness.
    """
    diameter, length = table.numbers["diameter"], table.numbers["length"]
    written = written_column(form, table, "diameter")
    file, faults = str(table.path), []
    low, high = DIAMETER_RANGE
    odd = (diameter < low) | (diameter > high)
    for row in np.flatnonzero(odd):
        what = "the core's diameter is outside what ACI 214.4R corrects"
        given, allowed = written.show(float(diameter[row])), written.show_range(low, high)
        faults.append(Fault(file, int(table.lines[row]), what, given, allowed, _ELSE))
    ratio = length / diameter
    low, high = RATIO_RANGE
    for row in np.flatnonzero(~odd & ((ratio < low) | (ratio > high))):
        what = "the core's length over diameter is outside what ACI 214.4R corrects"
        swapped = low <= 1.0 / ratio[row] <= high
        mend = "are length and diameter swapped?" if swapped else _ELSE
        given, allowed = f"{ratio[row]:.3g}", f"{low:g} to {high:g}"
        faults.append(Fault(file, int(table.lines[row]), what, given, allowed, mend))
    return capped(sorted(faults), "cores that cannot be corrected")
