"""Signs of corrosion that were looked for where the case knows of no corrosion."""

from collections.abc import Iterator, Sequence

import numpy as np

from assess.case.reader import Case, Evidence
from assess.errors import Fault


def zones_without_corrosion(
    case: Case, items: Sequence[tuple[int, Evidence]], what: str
) -> Iterator[Fault]:
    """Find rows that speak of a zone without `corrosion`.

    Parameters
    ----------
    case : Case
        The case.
    items : sequence of (int, Evidence)
        Tables of one kind.
    what : str
        What was measured there, to begin the sentence.

    Yields
    ------
    Fault
        In the line of the first row of each such zone and table.
    """
    for _, item in items:
        for zone in dict.fromkeys(item.zone.tolist()):
            if case.spec.zones[zone].corrosion is None:
                yield Fault(
                    str(item.table.path),
                    int(item.table.lines[np.flatnonzero(item.zone == zone)[0]]),
                    f"{what} in a zone without corrosion",
                    zone,
                    "zones with `corrosion`",
                    "state onset and current of the zone in the case file",
                )
