"""Cracks along bars that no bar could cause, and cracks that closed."""

from collections.abc import Iterator, Sequence
from typing import NamedTuple

import numpy as np

from assess.case.forms import Table
from assess.case.reader import Evidence
from assess.errors import Fault
from assess.mechanics.cracking import widest_crack
from assess.updating.kind import FloatArray, Rows


class Bars(NamedTuple):
    """The bars below cracks, one for each row of a table."""

    diameter: FloatArray  # [mm]
    cover: FloatArray  # [mm]
    concentration: FloatArray  # of the attack [-]


def impossible_widths(table: Table, bars: Bars) -> Iterator[Fault]:
    """Find cracks for which the relation asks more steel than the bar had.

    Parameters
    ----------
    table : Table
        Of cracks.
    bars : Bars
        Below them.

    Yields
    ------
    Fault
        In the line of the row.
    """
    width = table.numbers["crack width"]
    widest = widest_crack(*bars)
    for row in np.flatnonzero(np.isfinite(width) & (width >= widest)):
        yield Fault(
            str(table.path),
            int(table.lines[row]),
            "the crack is wider than the loss of the whole bar explains",
            f"{width[row]:g} mm at a bar of {bars.diameter[row]:g} mm",
            f"less than {max(float(widest[row]), 0.0):.3g} mm",
            "the width of another kind of crack, or a wrong diameter?",
        )


def closed_cracks(rows: Rows, items: Sequence[tuple[int, Evidence]]) -> Iterator[Fault]:
    """Find places where a crack was measured and a visit no earlier found none.

    Parameters
    ----------
    rows : Rows
        All cracks, table after table.
    items : sequence of (int, Evidence)
        The tables that the rows came from, in the same order.

    Yields
    ------
    Fault
        In the line of the row that denies the crack; one for each place.
    """
    origin = [(str(item.table.path), int(line)) for _, item in items for line in item.table.lines]
    cracked, age, limit = np.isfinite(rows.value), rows.extra["age"], rows.extra["limit"]
    for place, name in enumerate(rows.places):
        found = np.flatnonzero((rows.place == place) & cracked)
        none = np.flatnonzero((rows.place == place) & ~cracked)
        denies = (age[none, None] >= age[found]) & (limit[none, None] <= limit[found])
        if denies.any():
            first_none, first_found = np.argwhere(denies)[0]
            file, line = origin[none[first_none]]
            seen_file, seen_line = origin[found[first_found]]
            yield Fault(
                file,
                line,
                "a crack was measured at a place and none at a later survey",
                name,
                "cracks that do not close",
                f"it was measured in {seen_file}:{seen_line}; give the two cracks different "
                "locations, or mend the table",
            )
