"""Readings of dimensions that teach nothing, and those that contradict the drawings."""

from collections.abc import Iterator

import numpy as np

from assess.case.forms import BoolArray, FloatArray, SectionEntry
from assess.case.processes import dimension_key
from assess.case.reader import Case, Evidence
from assess.case.yamlfile import listed
from assess.errors import Fault
from assess.mechanics.dimensions import Deviation

FAR = 6.0  # standard deviations beyond which a reading contradicts what is stated


def zones_that_state(case: Case, item: Evidence) -> BoolArray:
    """Tell of each row whether its zone states how its dimension deviates.

    Parameters
    ----------
    case : Case
        The case.
    item : Evidence
        One table, with a text column ``dimension``.

    Returns
    -------
    ndarray of bool, shape (n_row,)
        Whether there is a common variable for it.
    """
    states = {zone: set(one.variables()) for zone, one in case.spec.zones.items()}
    rows = zip(item.zone.tolist(), item.table.texts["dimension"].tolist(), strict=True)
    found = [f"{dimension_key(what)}_deviation" in states[zone] for zone, what in rows]
    return np.array(found, dtype=np.bool_)


def unusable_readings(case: Case, item: Evidence) -> Iterator[Fault]:
    """Find readings without a nominal dimension, or that no section or zone asks for.

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
    sections = case.spec.sections()
    rows = zip(
        item.table.lines.tolist(),
        item.section.tolist(),
        item.zone.tolist(),
        item.table.texts["dimension"].tolist(),
        item.table.numbers["nominal"].tolist(),
        zones_that_state(case, item).tolist(),
        strict=True,
    )
    for line, section, zone, what, nominal, states in rows:
        if section:
            complaint = _at_section(sections[section], what, nominal, states=states)
        else:
            complaint = _in_zone(zone, what, nominal, states=states)
        if complaint is not None:
            yield Fault(str(item.table.path), line, *complaint)


_Complaint = tuple[str, str, str, str]  # what, given, allowed, mend


def _at_section(
    entry: SectionEntry, what: str, nominal: float, *, states: bool
) -> _Complaint | None:
    """Say what is wrong with a reading at a section."""
    stated = entry.dimensions()
    if what not in stated:
        complaint = f"section {entry.name!r} has no {what}"
        return complaint, "", listed(stated) or "no dimension", "is it another section?"
    own = stated[what]
    if np.isfinite(nominal) and abs(nominal - own.nominal) > 1e-6 * own.nominal:
        complaint = f"the nominal {what} is not that of section {entry.name!r}"
        mend = "leave the cell empty, or mend the section"
        return complaint, f"{nominal:g} mm", f"{own.nominal:g} mm", mend
    if own.sd == 0.0 and not states:
        complaint = f"the {what} of section {entry.name!r} is stated as exactly known"
        return complaint, f"{what}_sd: 0", "more than 0", "leave it out: JCSS part 3.10 is taken"
    return None


def _in_zone(zone: str, what: str, nominal: float, *, states: bool) -> _Complaint | None:
    """Say what is wrong with a reading that names no section."""
    if not np.isfinite(nominal):
        mend = "write it under nominal, or name the section"
        return f"the row names no section and no nominal {what}", "", "", mend
    if not states:
        key = f"{dimension_key(what)}_deviation"
        complaint = f"zone {zone!r} does not state how its {what} deviates, so nothing is learned"
        return complaint, "", f"zones with dimensions: {{{key}: ...}}", "or name the row's section"
    return None


def contradictions(
    item: Evidence, nominal: FloatArray, prior: Deviation, error: float
) -> Iterator[Fault]:
    """Find readings so far from the nominal dimension that the drawings must be wrong.

    Parameters
    ----------
    item : Evidence
        One table.
    nominal : ndarray, shape (n_row,)
        Nominal dimensions. [mm]
    prior : Deviation of ndarray (n_row,)
        Mean and standard deviation of built less nominal before any reading. [mm]
    error : float
        Standard deviation of a reading. [mm]

    Yields
    ------
    Fault
        In the line of the row.
    """
    measured = item.table.numbers["measured"]
    reach = FAR * np.hypot(prior.sd, error)
    low, high = nominal + prior.mean - reach, nominal + prior.mean + reach
    for row in np.flatnonzero((measured < low) | (measured > high)):
        what = item.table.texts["dimension"][row]
        yield Fault(
            str(item.table.path),
            int(item.table.lines[row]),
            f"the measured {what} contradicts the nominal one",
            f"{measured[row]:.4g} of {nominal[row]:.4g} mm",
            f"{low[row]:.4g} to {high[row]:.4g} mm, {FAR:g} standard deviations either way",
            "another dimension or unit? if the drawings are wrong, mend the nominal dimension",
        )
