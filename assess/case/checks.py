"""What the parts of a case file say of one another: names, dates, dependence.

These checks look at the parsed file and not at the model, so that a fault elsewhere in the file
does not hide theirs. What has not the shape they look for is the model's to refuse.
"""

from collections.abc import Iterator, Mapping
from datetime import date
from typing import Any

from pydantic import TypeAdapter

from assess.case.dependence import dependence_faults
from assess.case.forms import Vocabulary
from assess.case.spec import Built, IsoDate
from assess.case.walking import items_at, mapping_at, read_or_none
from assess.case.yamlfile import Document, Keys, listed, nearest
from assess.errors import Fault

_ISO_DATE: TypeAdapter[date] = TypeAdapter(IsoDate)
_BUILT: TypeAdapter[date] = TypeAdapter(Built)
_LONGEST = 200  # years of horizon that the model allows
ALL = "all"  # in place of a name: every one of them


def cross_check(
    document: Document, vocabulary: Vocabulary, today: date
) -> tuple[list[Fault], list[Fault]]:
    """Check what the parts of a case file say of one another.

    Parameters
    ----------
    document : Document
        As read, with the members' defaults handed down.
    vocabulary : Vocabulary
        Kinds, target sets and grades that exist.
    today : date
        Surveys after this day are doubted.

    Returns
    -------
    faults : list of Fault
        Sorted, each with its line.
    doubts : list of Fault
        Likewise.
    """
    faults = [
        *_zone_names(document),
        *_references(document),
        *_repeated_names(document),
        *_grades(document, vocabulary),
        *_target(document, vocabulary),
        *_assessment(document),
        *_option_years(document),
        *dependence_faults(document, vocabulary.evidence),
    ]
    wrong, doubts = _survey_dates(document, today)
    return sorted({*faults, *wrong}), sorted(set(doubts))


# Walking the parsed file ----------------------------------------------------------------------


def sections_of(data: Any) -> Iterator[tuple[Keys, dict[Any, Any]]]:
    """Go through all sections of all members with their places."""
    for i, member in items_at(data, "members"):
        for j, section in items_at(member, "sections"):
            yield ("members", i, "sections", j), section


def entries_of(data: Any, vocabulary: Vocabulary) -> Iterator[tuple[Keys, str, dict[Any, Any]]]:
    """Go through all evidence entries of all surveys: place, kind, entry."""
    for i, survey in items_at(data, "surveys"):
        for kind in vocabulary.evidence:
            if isinstance(survey.get(kind), dict):
                yield ("surveys", i, kind), kind, survey[kind]
            for j, entry in items_at(survey, kind):
                yield ("surveys", i, kind, j), kind, entry


def section_zones(data: Any) -> dict[str, str]:
    """Give the zone of each section."""
    found = [(s.get("name"), s.get("zone")) for _, s in sections_of(data)]
    return {n: z for n, z in found if isinstance(n, str) and isinstance(z, str)}


# Names ----------------------------------------------------------------------------------------


def _zone_names(document: Document) -> Iterator[Fault]:
    for top in ("zones", "steel"):
        seen: dict[str, Any] = {}
        for name in mapping_at(document.data, top):
            text = " ".join(str(name).lower().split())
            if "." in text:
                mend = "leave the dot out: it parts zone and variable in dependence"
                yield document.fault((top, name), "a name must not have a dot", mend=mend)
            if top == "zones" and text == "steel":
                yield document.fault((top, name), "a zone cannot be called steel")
            if text in seen:
                what = f"the name differs from {seen[text]!r} only in capitals or blanks"
                yield document.fault((top, name), what, mend="use two clearly different names")
            seen.setdefault(text, name)
    both = set(mapping_at(document.data, "zones")) & set(mapping_at(document.data, "steel"))
    for name in both:
        yield document.fault(("steel", name), "a zone has the same name", mend="rename one")


def _references(document: Document) -> Iterator[Fault]:
    """Look up each zone, steel, section and member that is named anywhere."""
    data = document.data
    known = {
        "zone": list(mapping_at(data, "zones")),
        "steel": list(mapping_at(data, "steel")),
        "section": [section.get("name") for _, section in sections_of(data)],
        "member": [member.get("name") for _, member in items_at(data, "members")],
    }
    in_sections = {name: known[name] for name in ("zone", "steel")}
    for keys, section in sections_of(data):
        yield from _named(document, keys, section, in_sections)
    for i, option in items_at(mapping_at(data, "decision"), "options"):
        yield from _named(document, ("decision", "options", i), option, known)
    for i, survey in items_at(data, "surveys"):
        yield from _named(document, ("surveys", i), survey, {"zone": known["zone"]})


def _named(
    document: Document, keys: Keys, node: Any, known: Mapping[str, list[Any]]
) -> Iterator[Fault]:
    pairs = node.items() if isinstance(node, dict) else enumerate(node)
    for key, value in pairs:
        word = str(key).removesuffix("s")
        if word in known and isinstance(node, dict):
            names = value if isinstance(value, list) else [value]
            for index, name in enumerate(names):
                if isinstance(name, str) and name != ALL and name not in known[word]:
                    place = (*keys, key, index) if isinstance(value, list) else (*keys, key)
                    mend = nearest(name, known[word])
                    what = f"there is no {word} of this name"
                    allowed = listed(known[word])
                    yield document.fault(place, what, given=name, allowed=allowed, mend=mend)
        if isinstance(value, dict | list):
            yield from _named(document, (*keys, key), value, known)


def _repeated_names(document: Document) -> Iterator[Fault]:
    data = document.data
    options = items_at(mapping_at(data, "decision"), "options")
    groups: dict[str, list[tuple[Keys, dict[Any, Any]]]] = {
        "section": list(sections_of(data)),
        "member": [(("members", i), member) for i, member in items_at(data, "members")],
        "option": [(("decision", "options", i), option) for i, option in options],
        "survey": [(("surveys", i), survey) for i, survey in items_at(data, "surveys")],
    }
    for word, group in groups.items():
        seen: dict[str, int] = {}
        for keys, node in group:
            name, place = node.get("name"), (*keys, "name")
            if not isinstance(name, str):
                continue
            if name in seen:
                what = f"the {word} of line {seen[name]} has the same name"
                yield document.fault(place, what, given=name, mend="give each its own name")
            seen.setdefault(name, document.line(place))
            if word == "survey" and name == "prior":
                yield document.fault(place, "prior is the name of the state before all surveys")


def _grades(document: Document, vocabulary: Vocabulary) -> Iterator[Fault]:
    for name in mapping_at(document.data, "zones"):
        grade = mapping_at(document.data, "zones", name, "concrete").get("grade")
        if isinstance(grade, str) and grade not in vocabulary.concrete_grades:
            known = vocabulary.concrete_grades
            mend = nearest(grade, known) or "or say mean, V and equivalent_tests"
            keys = ("zones", name, "concrete", "grade")
            what = "there is no published strength prior of this grade"
            yield document.fault(keys, what, given=grade, allowed=listed(known), mend=mend)


def _target(document: Document, vocabulary: Vocabulary) -> Iterator[Fault]:
    keys = ("decision", "target")
    target = mapping_at(document.data, *keys)
    name, level = target.get("set"), target.get("class")
    if not isinstance(name, str):
        return
    if name not in vocabulary.targets:
        known: Any = list(vocabulary.targets)
        what, given, place = "there is no such target set", name, (*keys, "set")
    elif isinstance(level, str) and level not in vocabulary.targets[name]:
        known = vocabulary.targets[name]
        what, given, place = f"{name} has no such class", level, (*keys, "class")
    else:
        return
    mend = nearest(given, known)
    yield document.fault(place, what, given=given, allowed=listed(known), mend=mend)


# Time -----------------------------------------------------------------------------------------


def _years(document: Document) -> tuple[date | None, int | None, int]:
    structure = mapping_at(document.data, "structure")
    built = read_or_none(_BUILT.validate_python, structure.get("built"))
    assessed, horizon = (_whole(structure.get(key)) for key in ("assessed", "horizon"))
    if built and assessed and assessed < built.year:
        assessed = None  # complained of once, not by all that follows from it
    return built, assessed, horizon if horizon and 1 <= horizon <= _LONGEST else _LONGEST


def _assessment(document: Document) -> Iterator[Fault]:
    structure = mapping_at(document.data, "structure")
    built = read_or_none(_BUILT.validate_python, structure.get("built"))
    assessed = _whole(structure.get("assessed"))
    if built and assessed is not None and assessed < built.year:
        what, allowed = "the assessment lies before the construction", f"{built.year} or later"
        keys = ("structure", "assessed")
        yield document.fault(keys, what, given=assessed, allowed=allowed, mend="check both years")


def _whole(value: Any) -> int | None:
    return value if isinstance(value, int) and not isinstance(value, bool) else None


def _survey_dates(document: Document, today: date) -> tuple[list[Fault], list[Fault]]:
    built, assessed, _ = _years(document)
    faults, doubts = [], []
    for index, survey in items_at(document.data, "surveys"):
        keys = ("surveys", index, "date")
        day = read_or_none(_ISO_DATE.validate_python, survey.get("date"))
        if day is None:
            continue
        given = day.isoformat()
        if built and day < built:
            what = "the survey lies before the construction"
            allowed = f"{built.isoformat()} or later"
            faults.append(document.fault(keys, what, given=given, allowed=allowed))
        if assessed and day.year > assessed:
            what = "the survey lies after the year of the assessment"
            faults.append(document.fault(keys, what, given=given, allowed=f"up to {assessed}"))
        elif day > today:
            what = f"the survey lies in the future (today is {today.isoformat()})"
            doubts.append(document.fault(keys, what, given=given, mend="check the date"))
    return faults, doubts


def _option_years(document: Document) -> Iterator[Fault]:
    _, assessed, horizon = _years(document)
    if assessed is None:
        return
    for index, option in items_at(mapping_at(document.data, "decision"), "options"):
        for key in ("from", "from_year"):
            year = _whole(option.get(key))
            last = assessed + horizon - 1  # the horizon counts the year assessed
            if year is not None and not assessed <= year <= last:
                what = "the option starts outside the years that are looked at"
                keys = ("decision", "options", index, key)
                mend = "the horizon counts the year of the assessment"
                allowed = f"{assessed} to {last}"
                yield document.fault(keys, what, given=year, allowed=allowed, mend=mend)
