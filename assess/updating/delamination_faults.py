"""Delaminated shares that cannot be, and surveys of one surface that contradict each other."""

from collections.abc import Iterator, Sequence

import numpy as np

from assess.case.doubts import written_column
from assess.case.forms import EvidenceForm
from assess.case.reader import Evidence
from assess.errors import Fault
from assess.updating.kind import IntArray, Rows


def impossible_shares(form: EvidenceForm, item: Evidence) -> Iterator[Fault]:
    """Find shares beyond all or nothing, and patches that are not whole.

    Parameters
    ----------
    form : EvidenceForm
        That of the shares.
    item : Evidence
        One table.

    Yields
    ------
    Fault
        In the line of the row.
    """
    table = item.table
    file, lines = str(table.path), table.lines
    share, patches = table.numbers["share"], table.numbers["patches"]
    written = written_column(form, table, "share")
    for row in np.flatnonzero((share < 0.0) | (share > 1.0)):
        mend = "in percent? write share [%]" if 1.0 < share[row] <= 100.0 else ""
        yield Fault(
            file,
            int(lines[row]),
            "a share is between nothing and all",
            written.show(float(share[row])),
            written.show_range(0.0, 1.0),
            mend,
        )
    for row in np.flatnonzero(patches != np.round(patches)):
        what = "a number of patches must be whole"
        yield Fault(file, int(lines[row]), what, f"{patches[row]:g}", "1, 2, 3, ...")


def contradicting_surveys(
    rows: Rows, previous: IntArray, items: Sequence[tuple[int, Evidence]]
) -> Iterator[Fault]:
    """Find surfaces surveyed twice at a time, shrunken shares and changed patches.

    Parameters
    ----------
    rows : Rows
        All shares, table after table; a place is a surface.
    previous : ndarray of int, shape (n_row,)
        Row of the survey before of the same surface, -1 for none.
    items : sequence of (int, Evidence)
        The tables that the rows came from, in the same order.

    Yields
    ------
    Fault
        In the line of the later row.
    """
    origin = [(str(item.table.path), int(line)) for _, item in items for line in item.table.lines]
    age, share, patches = rows.extra["age"], rows.value, rows.extra["patches"]
    for row in np.flatnonzero(previous >= 0):
        before = int(previous[row])
        first = f"{origin[before][0]}:{origin[before][1]}"
        surface = rows.places[rows.place[row]]
        if age[row] == age[before]:
            yield Fault(
                *origin[row],
                what="a surface has two shares at one time",
                given=surface,
                allowed=f"one; the other stands in {first}",
                mend="name different surfaces under location",
            )
        elif share[row] < share[before]:
            yield Fault(
                *origin[row],
                what="the delaminated share of a surface has shrunk",
                given=f"{surface}, from {share[before]:g} to {share[row]:g}",
                allowed=f"at least the share in {first}",
                mend="if it was repaired, give it another location from then on",
            )
        elif patches[row] != patches[before]:
            yield Fault(
                *origin[row],
                what="a surface has another number of patches than before",
                given=f"{surface}, {patches[row]:g}",
                allowed=f"{patches[before]:g}, as in {first}",
                mend="its patches are the same at every survey",
            )
