"""Bars found that contradict what a section states, or each other."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from assess.case.reader import Case, Evidence
from assess.errors import Fault
from assess.mechanics.reinforcement import BAR_DIAMETER_VARIATION

FAR = 6.0  # standard deviations beyond which a diameter is not that of the nominal bar
_COLUMNS = ("count", "nominal diameter")
_REPLACE = "mend the section's bars, or say replaces: true if what was found holds from here on"


@dataclass(frozen=True, slots=True, eq=False)
class Looked:
    """One table of one survey, with what its entry says."""

    stage: int
    item: Evidence
    error: float  # of a diameter [mm]
    replaces: bool


def impossible_bars(case: Case, item: Evidence) -> Iterator[Fault]:
    """Find rows that name no section with bars, and counts that are no numbers of bars.

    Parameters
    ----------
    case : Case
        The case.
    item : Evidence
        One table.

    Yields
    ------
    Fault
        In the line of the row.
    """
    sections, file = case.spec.sections(), str(item.table.path)
    rows = zip(
        item.table.lines.tolist(),
        item.section.tolist(),
        item.table.numbers["count"].tolist(),
        strict=True,
    )
    for line, section, count in rows:
        if not section:
            what, mend = "the row names no section", "bars are those of a section: add a column"
            yield Fault(file, line, what, mend=mend)
        elif sections[section].stated_bars() is None:
            yield Fault(file, line, f"section {section!r} has no bars to be found")
        elif np.isfinite(count) and count != round(count):
            what = "column 'count': not a number of bars"
            yield Fault(file, line, what, f"{count:g}", "whole numbers")


def latest(items: Sequence[tuple[int, Evidence]], column: str) -> dict[str, float]:
    """Give the latest value of a column at each section.

    Parameters
    ----------
    items : sequence of (int, Evidence)
        All tables in order of date.
    column : str
        ``count`` or ``nominal diameter``.

    Returns
    -------
    dict of str to float
        By section, for those where any row says it.
    """
    found: dict[str, float] = {}
    for _, item in items:
        value = item.table.numbers[column]
        known = np.isfinite(value)
        found |= dict(zip(item.section[known].tolist(), value[known].tolist(), strict=True))
    return found


def nominal_diameters(case: Case, items: Sequence[tuple[int, Evidence]]) -> dict[str, float]:
    """Give the nominal diameter of the bars of each section: found, else stated.

    Parameters
    ----------
    case : Case
        The case.
    items : sequence of (int, Evidence)
        All tables in order of date.

    Returns
    -------
    dict of str to float
        By section, for those with bars. [mm]
    """
    bars = {name: entry.stated_bars() for name, entry in case.spec.sections().items()}
    stated = {name: one.diameter for name, one in bars.items() if one is not None}
    return stated | latest(items, "nominal diameter")


def contradicted_bars(case: Case, looked: Sequence[Looked]) -> Iterator[Fault]:
    """Find counts and diameters that differ from the section's, and from one another.

    Parameters
    ----------
    case : Case
        The case.
    looked : sequence of Looked
        All tables in order of date, each row at a section with bars.

    Yields
    ------
    Fault
        In the line of the row.
    """
    nominal = nominal_diameters(case, [(one.stage, one.item) for one in looked])
    first: dict[str, dict[tuple[str, int], float]] = {name: {} for name in _COLUMNS}
    for one in looked:
        if not one.replaces:
            yield from _other_bars(case, one.item)
        yield from _far_diameters(one, nominal)
        # Bars may be counted anew; their nominal diameter is what it is.
        yield from _disagreeing(one.item, "count", one.stage, first["count"])
        yield from _disagreeing(one.item, "nominal diameter", 0, first["nominal diameter"])


def _other_bars(case: Case, item: Evidence) -> Iterator[Fault]:
    """Find bars that are not those of the section."""
    bars = {name: entry.stated_bars() for name, entry in case.spec.sections().items()}
    for row, section in enumerate(item.section.tolist()):
        stated = bars[section]
        if stated is None:
            continue
        for column, own, unit in zip(
            _COLUMNS, (stated.count, stated.diameter), ("", " mm"), strict=True
        ):
            found = float(item.table.numbers[column][row])
            if np.isfinite(found) and abs(found - own) > 1e-6 * own:
                yield Fault(
                    str(item.table.path),
                    int(item.table.lines[row]),
                    f"the {column} found is not that of section {section!r}",
                    f"{found:g}{unit}",
                    f"{own:g}{unit}",
                    _REPLACE,
                )


def _far_diameters(looked: Looked, nominals: Mapping[str, float]) -> Iterator[Fault]:
    """Find diameters that no bar of the nominal diameter has."""
    item = looked.item
    nominal = np.array([nominals[section] for section in item.section.tolist()])
    reach = FAR * np.hypot(BAR_DIAMETER_VARIATION * nominal, looked.error)
    read = item.table.numbers["diameter"]
    for row in np.flatnonzero(np.abs(read - nominal) > reach):
        low, high = nominal[row] - reach[row], nominal[row] + reach[row]
        yield Fault(
            str(item.table.path),
            int(item.table.lines[row]),
            f"the diameter contradicts the nominal one of section {str(item.section[row])!r}",
            f"{read[row]:g} mm",
            f"{low:.4g} to {high:.4g} mm for {nominal[row]:g} mm",
            "state the nominal diameter found, with replaces: true; a bar that has lost section "
            "belongs into section_loss",
        )


def _disagreeing(
    item: Evidence, column: str, stage: int, first: dict[tuple[str, int], float]
) -> Iterator[Fault]:
    """Find rows that say another thing of a section than earlier ones, and note what they say."""
    value = item.table.numbers[column]
    for row in np.flatnonzero(np.isfinite(value)):
        section = str(item.section[row])
        before = first.setdefault((section, stage), float(value[row]))
        if value[row] != before:
            yield Fault(
                str(item.table.path),
                int(item.table.lines[row]),
                f"rows of section {section!r} differ in {column}",
                f"{value[row]:g} and {before:g}",
                mend="keep the right one",
            )
