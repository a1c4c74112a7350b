"""Target reliability indices of named documents, each with its reference period."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from importlib import resources
from types import MappingProxyType

import yaml

from assess.decisions.results import Target


@dataclass(frozen=True, slots=True)
class TargetSet:
    """Targets of one document: ``classes`` maps class -> reference period [yr] -> index."""

    name: str
    source: str
    place: str
    seen: str  # "from memory", or where the numbers were read
    note: str
    classes: Mapping[str, Mapping[int, float]]


def _load() -> Mapping[str, TargetSet]:
    file = resources.files("assess.decisions") / "data" / "targets.yaml"
    raw = yaml.safe_load(file.read_text(encoding="utf-8"))
    return MappingProxyType(
        {
            name: TargetSet(
                name=name,
                source=entry["source"],
                place=entry["place"],
                seen=entry["seen"],
                note=entry["note"],
                classes=MappingProxyType(
                    {
                        label: MappingProxyType({int(p): float(b) for p, b in row.items()})
                        for label, row in entry["classes"].items()
                    }
                ),
            )
            for name, entry in raw.items()
        }
    )


TARGET_SETS: Mapping[str, TargetSet] = _load()


def target(set_name: str, class_name: str, period: int) -> Target:
    """Target of a named document.

    Parameters
    ----------
    set_name : str
        A key of `TARGET_SETS`, e.g. ``"EN 1990"``.
    class_name : str
        A class of that set, e.g. ``"RC2"``.
    period : int
        Reference period. [yr] Only periods that the document gives: an index is never converted
        from one period to another, since that would take failures of different years as
        independent.

    Returns
    -------
    Target
        With source and place; the source says where a value is from memory.

    Raises
    ------
    ValueError
        If set, class or period is not known; the message lists those that are.

    References
    ----------
    .. [1] The documents named in ``data/targets.yaml``, each with its place and how it was seen.

    Examples
    --------
    >>> target("EN 1990", "RC2", 50).index
    3.8
    """
    known = TARGET_SETS.get(set_name)
    if known is None:
        raise ValueError(f"no target set {set_name!r}; known: {'; '.join(TARGET_SETS)}")
    row = known.classes.get(class_name)
    if row is None:
        raise ValueError(
            f"target set {set_name!r} has no class {class_name!r}; known: "
            f"{'; '.join(known.classes)}"
        )
    if period not in row:
        periods = ", ".join(f"{years}" for years in row)
        raise ValueError(
            f"target set {set_name!r}, class {class_name!r}, has no reference period of {period} "
            f"years; known: {periods} (targets are not converted between periods)"
        )
    return Target(
        index=row[period],
        period=int(period),
        set_name=set_name,
        class_name=class_name,
        source=f"{known.source}, {known.place} ({known.seen})",
    )


def user_target(index: float, period: int, source: str) -> Target:
    """Target that the engineer sets, with the document it comes from.

    Parameters
    ----------
    index : float
        Required reliability index. [-]
    period : int
        Reference period, at least 1. [yr]
    source : str
        Document and place that give it.

    Returns
    -------
    Target
        Of the set ``"user"``.

    Raises
    ------
    ValueError
        If the index is not finite, the period is not a whole number of years from 1, or the
        source is empty.

    Examples
    --------
    >>> user_target(3.3, 15, "client's brief of 3 May, section 2").class_name
    'as given'
    """
    if not math.isfinite(index):
        raise ValueError(f"a target index must be a finite number, got {index}")
    if period < 1 or int(period) != period:
        raise ValueError(f"a reference period is a whole number of years from 1, got {period}")
    if not source.strip():
        raise ValueError("a target of the user's own must name its source, got an empty text")
    return Target(float(index), int(period), "user", "as given", source.strip())
