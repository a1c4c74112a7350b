"""Rows that say nothing, or speak of sections that do not exist, in tables that need no zone."""

from collections.abc import Iterator

import numpy as np

from assess.case.reader import Case, Evidence
from assess.case.yamlfile import listed, nearest
from assess.errors import Fault


def unknown_sections(case: Case, item: Evidence) -> Iterator[Fault]:
    """Find rows at sections that do not exist, for tables whose rows need no zone.

    Parameters
    ----------
    case : Case
        The case.
    item : Evidence
        One table.

    Yields
    ------
    Fault
        In the line of the first row at each.
    """
    known = case.spec.sections()
    for name in dict.fromkeys(item.section.tolist()):
        if name and name not in known:
            row = int(np.flatnonzero(item.section == name)[0])
            what, near = "there is no section of this name", nearest(name, known)
            line = int(item.table.lines[row])
            yield Fault(str(item.table.path), line, what, repr(name), listed(known), near)


def silent_rows(item: Evidence, columns: tuple[str, ...]) -> Iterator[Fault]:
    """Find rows with no number in any of the columns.

    Parameters
    ----------
    item : Evidence
        One table.
    columns : tuple of str
        Names of number columns.

    Yields
    ------
    Fault
        In the line of the row.
    """
    said = np.any([np.isfinite(item.table.numbers[name]) for name in columns], axis=0)
    for row in np.flatnonzero(~said):
        line = int(item.table.lines[row])
        yield Fault(str(item.table.path), line, "the row says nothing", "", listed(columns))
