"""Break-outs that contradict each other."""

from collections.abc import Callable, Iterator, Sequence

import numpy as np

from assess.case.forms import BoolArray, Table
from assess.case.reader import Evidence
from assess.errors import Fault
from assess.updating.kind import Rows
from assess.updating.loss_readings import STEEL_DENSITY


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
    row = rows.extra["row"].astype(np.int64)  # a row of the tables may bring two readings
    file, line = origin[row[none[first_none]]]
    found_file, found_line = origin[row[found[first_found]]]
    return Fault(
        file,
        line,
        "loss was found at a place and none at a later survey",
        place,
        "loss that does not shrink",
        f"it was found in {found_file}:{found_line}; give the two break-outs different locations, "
        "or mend the table",
    )


def impossible_losses(table: Table) -> Iterator[Fault]:
    """Find rows that say nothing, or more than a bar can have lost.

    Parameters
    ----------
    table : Table
        Of break-outs.

    Yields
    ------
    Fault
        In the line of the row.
    """
    count = len(table)
    nothing = np.full(count, np.nan)
    original = table.numbers["original diameter"]
    diameter = table.numbers.get("residual diameter", nothing)
    mass, pit = table.numbers.get("residual mass", nothing), table.numbers.get("pit depth", nothing)
    none = table.absent.get("residual diameter", np.zeros(count, dtype=bool))
    silent = ~(np.isfinite(diameter) | none | np.isfinite(mass) | np.isfinite(pit))
    sound = STEEL_DENSITY * np.pi * original**2 / 4.0
    checks: tuple[tuple[BoolArray, str, Callable[[int], str], str, str], ...] = (
        (
            silent,
            "the row says nothing of the bar's loss",
            lambda row: "",
            "residual diameter, residual mass or pit depth",
            "write 'none' under residual diameter where no loss was found",
        ),
        (
            diameter > original,
            "residual diameter exceeds the original one",
            lambda row: f"{diameter[row]:g} of {original[row]:g} mm",
            "at most the original diameter",
            "write 'none' where no loss was found",
        ),
        (
            np.isfinite(mass) & np.isfinite(diameter),
            "the row states both a residual diameter and a residual mass",
            lambda row: "",
            "one of them",
            "",
        ),
        (
            mass > 1.05 * sound,
            "residual mass exceeds that of the sound bar",
            lambda row: f"{mass[row]:.4g} g/mm",
            "at most that of the original diameter, 7.85 g/cm³",
            "in kg/m of one bar?",
        ),
        (
            pit > original,
            "the pit is deeper than the bar is thick",
            lambda row: f"{pit[row]:g} of {original[row]:g} mm",
            "at most the original diameter",
            "",
        ),
    )
    for wrong, what, given, allowed, mend in checks:
        for row in np.flatnonzero(wrong):
            line = int(table.lines[row])
            yield Fault(str(table.path), line, what, given(int(row)), allowed, mend)
