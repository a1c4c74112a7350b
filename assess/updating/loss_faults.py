"""Break-outs that contradict each other."""

from collections.abc import Sequence

import numpy as np

from assess.case.reader import Evidence
from assess.errors import Fault
from assess.updating.kind import Rows


def healed_place(rows: Rows, place: str, items: Sequence[tuple[int, Evidence]]) -> Fault:
    """Point to the row that denies a loss found before, and to the row that found it.

    Parameters
    ----------
    rows : Rows
        All break-outs, table after table.
    place : str
        One of `assess.updating.corrosion_history.healed_places`.
    items : sequence of (int, Evidence)
        The tables that the rows came from, in the same order.

    Returns
    -------
    Fault
        In the line of the denying row.
    """
    here = rows.place == rows.places.index(place)
    seen, age, limit = np.isfinite(rows.value), rows.extra["age"], rows.extra["limit"]
    found, none = np.flatnonzero(here & seen), np.flatnonzero(here & ~seen)
    denies = (age[none, None] >= age[found]) & (limit[none, None] <= limit[found])
    first_none, first_found = np.argwhere(denies)[0]
    origin = [(str(item.table.path), int(line)) for _, item in items for line in item.table.lines]
    file, line = origin[none[first_none]]
    found_file, found_line = origin[found[first_found]]
    return Fault(
        file,
        line,
        "loss was found at a place and none at a later survey",
        place,
        "loss that does not shrink",
        f"it was found in {found_file}:{found_line}; give the two break-outs different locations, "
        "or mend the table",
    )
