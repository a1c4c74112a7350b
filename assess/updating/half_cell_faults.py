"""Half-cell potentials that have no class, and such as look like something else."""

from collections.abc import Iterator

import numpy as np

from assess.case.forms import Table
from assess.case.reader import Case, Evidence
from assess.errors import Fault
from assess.mechanics.half_cell import REFERENCE_POTENTIAL

NEXT_TO_NOTHING = 3.0  # [mV] a whole table of such potentials was written in volt


def unusable_points(case: Case, item: Evidence, electrode: str | None) -> Iterator[Fault]:
    """Find rows that say no potential or class, or both, and counts that are no counts.

    Parameters
    ----------
    case : Case
        The case.
    item : Evidence
        One table of potentials.
    electrode : str or None
        Reference electrode that the entry states.

    Yields
    ------
    Fault
        In the line of its row, or of the entry where the electrode is missing.
    """
    table = item.table
    file, lines = str(table.path), table.lines
    read = np.isfinite(table.numbers["potential"])
    classed = table.texts["class"] != ""
    for row in np.flatnonzero(read == classed):
        given = "both" if read[row] else "neither"
        what = "a row says either a potential or a class"
        yield Fault(file, int(lines[row]), what, given, "potential [mV], or class")
    count = table.numbers["count"]
    for row in np.flatnonzero(np.isfinite(count) & (count != np.round(count))):
        what = "a number of points must be whole"
        yield Fault(file, int(lines[row]), what, f"{count[row]:g}", "1, 2, 3, ...")
    if electrode is None and read.any():
        yield case.document.fault(
            item.keys,
            "potentials without their reference electrode",
            allowed="; ".join(REFERENCE_POTENTIAL),
            mend="add electrode: to the entry",
        )


def doubtful_potentials(table: Table) -> list[Fault]:
    """Doubt potentials that are written in volt, or without their sign.

    Parameters
    ----------
    table : Table
        As read.

    Returns
    -------
    list of Fault
        Doubts, in the line of the first potential.
    """
    read = np.isfinite(table.numbers["potential"])
    potential = table.numbers["potential"][read]
    if not len(potential):
        return []
    file, line = str(table.path), int(table.lines[np.flatnonzero(read)[0]])
    given = f"{potential.min():g} to {potential.max():g} mV"
    if np.all(np.abs(potential) < NEXT_TO_NOTHING):
        what, mend = "potentials next to nothing", "in volt? write potential [V]"
        return [Fault(file, line, what, given, "usually -600 to 100 mV", mend)]
    if np.median(potential) > 100.0:
        what, mend = "most potentials are positive", "without their sign? steel reads negative"
        return [Fault(file, line, what, given, "usually -600 to 100 mV", mend)]
    return []
