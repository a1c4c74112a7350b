"""Carbonation that was not found, where nobody says how much would have been noticed."""

from collections.abc import Iterator

import numpy as np

from assess.case.reader import Case, Evidence
from assess.errors import Fault


def none_without_limit(case: Case, item: Evidence, limit: float | None) -> Iterator[Fault]:
    """Find a table that says "none found" under an entry without a detection limit.

    Parameters
    ----------
    case : Case
        The case.
    item : Evidence
        One table of carbonation depths.
    limit : float or None
        Detection limit of the entry. [mm]

    Yields
    ------
    Fault
        In the line of the entry, naming the first such row.
    """
    none = item.table.absent["depth"]
    if limit is None and none.any():
        line = int(item.table.lines[np.flatnonzero(none)[0]])
        yield case.document.fault(
            item.keys,
            "no carbonation was found, and the smallest depth that shows is not stated",
            given=f"{item.table.path.name}:{line}",
            allowed="such as detection_limit: 2 mm",
            mend="add detection_limit: to the entry, or write <2 in the table",
        )
