"""Chloride profiles that cannot be used: increments without place, order, depth or basis."""

from collections.abc import Collection, Iterator, Mapping, Sequence

import numpy as np

from assess.case.reader import Case, Evidence
from assess.errors import Fault


def unusable_increments(item: Evidence, convection: Mapping[str, float]) -> Iterator[Fault]:
    """Find increments of no place or no thickness, and profiles with none that diffusion rules.

    Parameters
    ----------
    item : Evidence
        One table of profiles.
    convection : mapping
        Convection depth of each zone. [mm]

    Yields
    ------
    Fault
        In the line of the row, or of the profile's first row.
    """
    file, lines = str(item.table.path), item.table.lines
    start, end = item.table.numbers["from"], item.table.numbers["to"]
    nowhere = (item.location == "") & (item.section == "")
    for row in np.flatnonzero(nowhere):
        what = "the increment names neither a location nor a section"
        mend = "rows of one location are one profile: fill in the column location"
        yield Fault(file, int(lines[row]), what, mend=mend)
    for row in np.flatnonzero(start < 0.0):
        what, given = "the increment begins above the surface", f"{start[row]:g} mm"
        yield Fault(file, int(lines[row]), what, given, "at least 0 mm")
    for row in np.flatnonzero(end <= start):
        what, given = "the increment ends before it begins", f"{start[row]:g} to {end[row]:g} mm"
        yield Fault(file, int(lines[row]), what, given, "`to` deeper than `from`")
    # A place without a row that can be used teaches nothing, whatever its rows look like.
    names = np.char.add(np.char.add(item.section, "|"), item.location)
    depth = np.array([convection[zone] for zone in item.zone.tolist()])
    for name in dict.fromkeys(names[~nowhere].tolist()):
        here = np.flatnonzero(names == name)
        if np.all(start[here] < depth[here]):
            yield Fault(
                file,
                int(lines[here[0]]),
                "no increment of this profile begins below the convection depth",
                f"{name.strip('|')}, down from {start[here].max():g} mm",
                f"at least {depth[here[0]]:g} mm, as the zone says",
                "leave the profile out, or see whether convection reaches that deep",
            )


def contradicting_binders(
    case: Case, stated: Sequence[tuple[Evidence, float | None]]
) -> Iterator[Fault]:
    """Find entries that give the concrete of a zone another binder content than entries before.

    Parameters
    ----------
    case : Case
        The case.
    stated : sequence of (Evidence, float or None)
        Tables with the binder's share of the concrete's mass; None where contents are of binder.

    Yields
    ------
    Fault
        In the line of the later entry.
    """
    first: dict[str, tuple[float, int]] = {}
    for item, share in stated:
        for zone in dict.fromkeys(item.zone.tolist()):
            if share is None:
                continue
            known, line = first.setdefault(zone, (share, case.document.line(item.keys)))
            if abs(share - known) > 1e-9:
                yield case.document.fault(
                    item.keys,
                    f"zone {zone!r} has another share of binder in line {line}",
                    given=f"{100.0 * share:.4g} % of its mass",
                    allowed=f"{100.0 * known:.4g} %",
                    mend="one concrete has one binder content: say the same in both",
                )


def restated_scores(case: Case, names: Collection[str]) -> Iterator[Fault]:
    """Find scores of profiles that the case gives a prior or a dependence of their own.

    Parameters
    ----------
    case : Case
        The case.
    names : collection of str
        Names of all scores.

    Yields
    ------
    Fault
        In the line of the prior, or of the dependence.
    """
    what = "the local values of a profile have the zone's distribution and no other"
    mend = "state the zone's median and scatter"
    for name in case.spec.priors:
        if name in names:
            yield case.document.fault(("priors", name), what, given=name, mend=mend)
    for index, pair in enumerate(case.spec.dependence):
        for k, name in enumerate(pair.between):
            if name in names:
                keys = ("dependence", index, "between", k)
                yield case.document.fault(keys, what, given=name, mend=mend)
