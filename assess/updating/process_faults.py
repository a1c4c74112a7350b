"""Measurements of a process that their zone does not undergo, or not yet."""

from collections.abc import Iterator, Sequence

import numpy as np

from assess.case.reader import Case, Evidence
from assess.errors import Fault


def rows_without_process(
    case: Case, items: Sequence[tuple[int, Evidence]], process: str, what: str
) -> Iterator[Fault]:
    """Find rows that speak of a zone without a process, and surveys of concrete without age.

    Parameters
    ----------
    case : Case
        The case.
    items : sequence of (int, Evidence)
        Tables of one kind.
    process : str
        Key of the process, one of `assess.case.processes.PROCESSES`.
    what : str
        What was measured, to begin the sentence.

    Yields
    ------
    Fault
        In the line of the first row of each such zone and table, or in that of the survey's entry.
    """
    for _, item in items:
        for zone in dict.fromkeys(item.zone.tolist()):
            if process not in case.spec.zones[zone].processes():
                yield Fault(
                    str(item.table.path),
                    int(item.table.lines[np.flatnonzero(item.zone == zone)[0]]),
                    f"{what} in a zone without {process}",
                    zone,
                    f"zones with `{process}`",
                    f"state {process} under the zone in the case file",
                )
        if item.age <= 0.0:
            said = item.date.isoformat()
            yield case.document.fault(
                item.keys,
                f"{what} on the day of construction",
                given=said,
                allowed=f"later than {said}",
                mend="check the date of the survey and that of construction",
            )
