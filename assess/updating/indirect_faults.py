"""Indirect readings of strength that no line leads from, and such as lie beyond their curve."""

from collections.abc import Iterator
from typing import Any, cast

import numpy as np

from assess.case.doubts import capped, written_column
from assess.case.forms import EvidenceForm, Table
from assess.case.reader import Case
from assess.case.yamlfile import Keys
from assess.errors import Fault
from assess.updating.kind import gather, place_keys

_SHOWN = "EN 13791, or level, slope and scatter with their sources"


def curve_faults(case: Case, form: EvidenceForm) -> Iterator[Fault]:
    """Find devices that have two curves, or neither a curve nor a place with cores.

    Parameters
    ----------
    case : Case
        The case.
    form : EvidenceForm
        Of the indirect test.

    Yields
    ------
    Fault
        In the line of the entry: of the second curve, or of the device's first use.
    """
    cored = {key for _, item in gather(case, "cores") for key in place_keys(item) if key}
    stated: dict[str, tuple[object, int]] = {}
    first: dict[str, Keys] = {}
    paired: set[str] = set()
    for _, item in gather(case, form.key):
        entry = cast(Any, item.entry)
        name = entry.device.name
        first.setdefault(name, (*item.keys, "device"))
        if cored.intersection(place_keys(item)):
            paired.add(name)
        if entry.curve is None:
            continue
        keys = (*item.keys, "curve")
        curve, line = stated.setdefault(name, (entry.curve, case.document.line(keys)))
        if curve != entry.curve:
            yield case.document.fault(
                keys,
                f"device {name!r} has another curve in line {line}",
                mend="a name stands for one line of readings against strength: state it once, or "
                "use another name",
            )
    for name, keys in first.items():
        if name not in stated and name not in paired:
            yield case.document.fault(
                keys,
                f"nothing leads from the readings of device {name!r} to strength",
                given="no curve, and no location that has cores, too",
                allowed=f"curve: {_SHOWN}",
                mend="add curve: to the entry, or give the cores of some places the same location "
                "or section",
            )


def uncounted_readings(table: Table) -> Iterator[Fault]:
    """Find numbers of single readings that are no counts.

    Parameters
    ----------
    table : Table
        With a number column ``readings``.

    Yields
    ------
    Fault
        In the line of the row.
    """
    count = table.numbers["readings"]
    for row in np.flatnonzero(np.isfinite(count) & (count != np.round(count))):
        what = "a number of readings must be whole"
        line = int(table.lines[row])
        yield Fault(str(table.path), line, what, f"{count[row]:g}", "1, 2, 3, ...")


def beyond_curve(
    form: EvidenceForm, table: Table, valid: tuple[float, float], curve: str
) -> list[Fault]:
    """Doubt readings outside the range that a published curve was drawn for.

    Parameters
    ----------
    form : EvidenceForm
        Of the indirect test.
    table : Table
        As read.
    valid : tuple of float
        Range of the curve, in the column's unit.
    curve : str
        Its name.

    Returns
    -------
    list of Fault
        Doubts, in the lines of the rows.
    """
    written = written_column(form, table, form.value)
    low, high = valid
    reading = table.numbers[form.value]
    doubts = [
        Fault(
            str(table.path),
            int(table.lines[row]),
            f"the {form.value} is outside what the curve of {curve} was drawn for",
            written.show(float(reading[row])),
            written.show_range(low, high),
            "the line is only extrapolated there; cores at such places would tell",
        )
        for row in np.flatnonzero((reading < low) | (reading > high))
    ]
    return capped(doubts, f"readings outside the curve of {curve}")
