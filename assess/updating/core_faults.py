"""Cores whose shape the correction factors do not cover."""

import numpy as np

from assess.case.doubts import capped, written_column
from assess.case.forms import EvidenceForm, Table
from assess.errors import Fault
from assess.mechanics.core_corrections import DIAMETER_RANGE, RATIO_RANGE
from assess.mechanics.core_corrections_en import DIAMETER_RANGE_EN, RATIO_RANGE_EN
from assess.updating.core_values import BARS

RANGES = {
    "ACI 214.4R": (DIAMETER_RANGE, RATIO_RANGE),
    "EN 13791": (DIAMETER_RANGE_EN, RATIO_RANGE_EN),
}
_ELSE = "leave it out, or correct all strengths by other means and say correction: none"


def uncorrectable_cores(form: EvidenceForm, table: Table, rule: str) -> list[Fault]:
    """Find cores that a rule gives no factors for.

    Parameters
    ----------
    form : EvidenceForm
        That of the cores.
    table : Table
        One table of cores to be corrected, diameter and length in mm.
    rule : str
        A key of `RANGES`.

    Returns
    -------
    list of Fault
        Each with its line, the value as written and the range that is covered. A core that is
        too thick or too thin is not complained of a second time for its slenderness.
    """
    diameter, length = table.numbers["diameter"], table.numbers["length"]
    written = written_column(form, table, "diameter")
    file, faults = str(table.path), []
    (low, high), ratios = RANGES[rule]
    odd = (diameter < low) | (diameter > high)
    for row in np.flatnonzero(odd):
        what = f"the core's diameter is outside what {rule} corrects"
        given, allowed = written.show(float(diameter[row])), written.show_range(low, high)
        faults.append(Fault(file, int(table.lines[row]), what, given, allowed, _ELSE))
    ratio = length / diameter
    low, high = ratios
    for row in np.flatnonzero(~odd & ((ratio < low) | (ratio > high))):
        what = f"the core's length over diameter is outside what {rule} corrects"
        swapped = low <= 1.0 / ratio[row] <= high
        mend = "are length and diameter swapped?" if swapped else _ELSE
        given, allowed = f"{ratio[row]:.3g}", f"{low:g} to {high:g}"
        faults.append(Fault(file, int(table.lines[row]), what, given, allowed, mend))
    return capped(sorted(faults), "cores that cannot be corrected")


def impossible_bars(form: EvidenceForm, table: Table) -> list[Fault]:
    """Find bars in cores that are half described, or lie beyond the middle of their core.

    Parameters
    ----------
    form : EvidenceForm
        That of the cores.
    table : Table
        One table of cores.

    Returns
    -------
    list of Fault
        Each with its line.
    """
    file, faults = str(table.path), []
    for diameter, distance in BARS:
        bar, place = table.numbers[diameter], table.numbers[distance]
        for row in np.flatnonzero(np.isnan(bar) != np.isnan(place)):
            given = f"only {diameter if np.isnan(place[row]) else distance!r}".replace("'", "")
            what = "a bar in a core needs its diameter and its distance from the nearer end"
            mend = "give both, or leave both empty"
            faults.append(Fault(file, int(table.lines[row]), what, given, "", mend))
        half = 0.5 * table.numbers["length"]
        written = written_column(form, table, distance)
        for row in np.flatnonzero(place > half):
            what = "a bar lies further from the nearer end of its core than the core's middle"
            given = written.show(float(place[row]))
            allowed = f"at most {half[row]:.4g} mm"
            mend = "measure from the nearer end, to the bar's axis"
            faults.append(Fault(file, int(table.lines[row]), what, given, allowed, mend))
    return capped(sorted(faults), "bars in cores")
