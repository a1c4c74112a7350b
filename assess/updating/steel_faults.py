"""Tests of reinforcement of which nobody can tell whose they are."""

from collections.abc import Iterator

from assess.case.reader import Case, Evidence
from assess.case.yamlfile import listed, nearest
from assess.errors import Fault


def steel_of_rows(case: Case, item: Evidence, stated: str | None) -> list[str]:
    """Tell the reinforcement of each row.

    Parameters
    ----------
    case : Case
        The case.
    item : Evidence
        One table, with a text column ``steel``.
    stated : str or None
        What the survey says of the whole table.

    Returns
    -------
    list of str
        The row's own, else the table's, else that of the section if it has but one, else the
        case's if it has but one; "" where none of these tells.
    """
    sections = case.spec.sections()
    only = tuple(case.spec.steel)
    found = []
    for own, section in zip(item.table.texts["steel"].tolist(), item.section.tolist(), strict=True):
        here = sections[section].steels() if section in sections else ()
        default = next((names[0] for names in (here, only) if len(names) == 1), "")
        found.append(own or stated or default)
    return found


def steel_faults(case: Case, item: Evidence, stated: str | None) -> Iterator[Fault]:
    """Find rows whose reinforcement does not exist or is not told.

    Parameters
    ----------
    case, item, stated
        As for `steel_of_rows`.

    Yields
    ------
    Fault
        In the line of the row; in that of the entry where it names the reinforcement.
    """
    known = case.spec.steel
    if stated is not None and stated not in known:
        what, near = "there is no steel of this name", nearest(stated, known)
        keys = (*item.keys, "steel")
        yield case.document.fault(keys, what, given=stated, allowed=listed(known), mend=near)
    seen = {stated}
    file, lines = str(item.table.path), item.table.lines.tolist()
    for line, name in zip(lines, steel_of_rows(case, item, stated), strict=True):
        if name in known or name in seen:
            continue
        seen.add(name)
        if name:
            what, near = "there is no steel of this name", nearest(name, known)
            yield Fault(file, line, what, repr(name), listed(known), near)
        else:
            mend = "add steel: to the table's entry in the case file, or a column steel"
            yield Fault(file, line, "the row names no steel", "", listed(known), mend)
