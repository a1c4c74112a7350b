"""What the parts of a case file say of one another: names, dates, dependence.

These checks look at the parsed file and not at the model, so that a fault elsewhere in the file
does not hide theirs. What has not the shape they look for is the model's to refuse.
"""

from collections.abc import Callable, Iterator, Mapping
from datetime import date
from typing import TYPE_CHECKING, Any

from pydantic import BaseModel, TypeAdapter, ValidationError

from assess.case.distributions import (
    CurrentDistribution,
    Distribution,
    LengthDistribution,
    NumberDistribution,
    YearsDistribution,
)
from assess.case.forms import FloatArray, Vocabulary
from assess.case.spec import Built, IsoDate, Zone
from assess.case.yamlfile import Document, Keys, listed, nearest
from assess.errors import Fault
from assess.units import QuantityError, convert

if TYPE_CHECKING:
    from assess.probability.dependence import PairDependence
    from assess.probability.marginal import Marginal

_ISO_DATE: TypeAdapter[date] = TypeAdapter(IsoDate)
_BUILT: TypeAdapter[date] = TypeAdapter(Built)
ALL = "all"  # in place of a name: every one of them

# Where the marginal of a zone's common variable is said outright, and as what.
_SAID: dict[str, tuple[str, str, type[Distribution]]] = {
    "cover_mean": ("cover", "mean", LengthDistribution),
    "cover_scatter": ("cover", "scatter", LengthDistribution),
    "onset": ("corrosion", "onset", YearsDistribution),
    "onset_scatter": ("corrosion", "onset_scatter", NumberDistribution),
    "current": ("corrosion", "current", CurrentDistribution),
    "current_scatter": ("corrosion", "current_scatter", NumberDistribution),
}


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
        *_option_years(document),
        *_dependence(document),
    ]
    wrong, doubts = _survey_dates(document, today)
    return sorted({*faults, *wrong}), sorted(set(doubts))


# Walking the parsed file ----------------------------------------------------------------------


def mapping_at(data: Any, *keys: Any) -> dict[Any, Any]:
    """Give the mapping at a place, an empty one where there is none."""
    for key in keys:
        data = data.get(key) if isinstance(data, dict) else None
    return data if isinstance(data, dict) else {}


def items_at(data: Any, key: Any) -> Iterator[tuple[int, dict[Any, Any]]]:
    """Go through the mappings of a list."""
    found = data.get(key) if isinstance(data, dict) else None
    if isinstance(found, list):
        yield from ((i, item) for i, item in enumerate(found) if isinstance(item, dict))


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


def _read[T](read: Callable[[Any], T], value: Any) -> T | None:
    """Read a value, None where the model will refuse it."""
    try:
        return read(value)
    except (ValidationError, QuantityError):
        return None


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
    built = _read(_BUILT.validate_python, structure.get("built"))
    assessed, horizon = (_whole(structure.get(key)) for key in ("assessed", "horizon"))
    return built, assessed, 200 if horizon is None else horizon


def _whole(value: Any) -> int | None:
    return value if isinstance(value, int) and not isinstance(value, bool) else None


def _survey_dates(document: Document, today: date) -> tuple[list[Fault], list[Fault]]:
    built, assessed, _ = _years(document)
    faults, doubts = [], []
    seen: dict[date, int] = {}
    for index, survey in items_at(document.data, "surveys"):
        keys = ("surveys", index, "date")
        day = _read(_ISO_DATE.validate_python, survey.get("date"))
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
        if day in seen:
            what = f"the survey of line {seen[day]} has the same date"
            faults.append(document.fault(keys, what, given=given, mend="make them one survey"))
        seen.setdefault(day, document.line(keys))
    return faults, doubts


def _option_years(document: Document) -> Iterator[Fault]:
    _, assessed, horizon = _years(document)
    if assessed is None:
        return
    for index, option in items_at(mapping_at(document.data, "decision"), "options"):
        for key in ("from", "from_year"):
            year = _whole(option.get(key))
            if year is not None and not assessed <= year <= assessed + horizon:
                what = "the option starts outside the years that are looked at"
                allowed = f"{assessed} to {assessed + horizon}"
                keys = ("decision", "options", index, key)
                yield document.fault(keys, what, given=year, allowed=allowed)


# Dependence -----------------------------------------------------------------------------------


def known_variables(data: Mapping[Any, Any]) -> dict[str, Keys]:
    """Name the common variables that `dependence` may speak of.

    Parameters
    ----------
    data : mapping
        The parsed case file.

    Returns
    -------
    dict
        Place of the zone or steel by the variable's full name, such as ``deck.onset``.
    """
    found: dict[str, Keys] = {}
    for name in mapping_at(data, "zones"):
        corroding = bool(mapping_at(data, "zones", name, "corrosion"))
        for variable in Zone.variable_names(corroding):
            found[f"{name}.{variable}"] = ("zones", name)
    for name in mapping_at(data, "steel"):
        found[f"steel.{name}"] = ("steel", name)
    return found


def _dependence(document: Document) -> Iterator[Fault]:
    from assess.probability.dependence import NotPositiveDefiniteError, score_correlation_matrix

    known = known_variables(document.data)
    marginals = _Marginals(document.data, known)
    pairs: list[PairDependence] = []
    seen: dict[frozenset[str], int] = {}
    for index, node in items_at(document.data, "dependence"):
        keys = ("dependence", index)
        between = node.get("between")
        if not isinstance(between, list) or not all(isinstance(name, str) for name in between):
            continue
        strangers = [(i, name) for i, name in enumerate(between) if name not in known]
        for i, name in strangers:
            yield _unknown_variable(document, (*keys, "between", i), name, known)
        both = frozenset(between)
        if both in seen and not strangers:
            what = f"the dependence of line {seen[both]} is between the same variables"
            yield document.fault(keys, what, mend="keep one of the two")
        elif not strangers and len(between) == 2:
            pair = _pair(document, keys, node, marginals)
            if isinstance(pair, Fault):
                yield pair
            elif pair is not None:
                pairs.append(pair)
        seen.setdefault(both, document.line(keys))
    names = sorted({name for pair in pairs for name in (pair.first, pair.second)})
    try:
        if pairs:
            score_correlation_matrix(names, pairs, marginals.of(names))
    except NotPositiveDefiniteError as error:
        what = "these coefficients cannot hold together: their matrix is not positive definite"
        given = "; ".join(_in_words(pair, pair.coefficient) for pair in pairs)
        mend = f"nearest that hold: {_nearest(names, pairs, error.nearest)}"
        yield document.fault(("dependence",), what, given=given, mend=mend)


def _in_words(pair: "PairDependence", coefficient: float) -> str:
    return f"{pair.first} with {pair.second} {coefficient:.3g}"


def _nearest(names: list[str], pairs: "list[PairDependence]", scores: FloatArray) -> str:
    """Give the nearest coefficients that hold together, each of the kind that was stated."""
    from assess.probability.dependence import score_to_kendall, score_to_spearman

    back: dict[str, Callable[[float], float]] = {
        "spearman": score_to_spearman,
        "kendall": score_to_kendall,
        "pearson": float,
    }
    words = []
    for pair in pairs:
        score = float(scores[names.index(pair.first), names.index(pair.second)])
        words.append(_in_words(pair, back[pair.kind](score)))
    return "; ".join(words)


def _unknown_variable(
    document: Document, keys: Keys, name: str, known: Mapping[str, Keys]
) -> Fault:
    zone, _, variable = name.rpartition(".")
    what = "there is no such variable"
    if variable in Zone.variable_names(True) and f"{zone}.cover_mean" in known:
        what = f"zone {zone!r} has no corrosion, hence no such variable"
    mend = nearest(name, known)
    return document.fault(keys, what, given=name, allowed=listed(known), mend=mend)


def _pair(
    document: Document, keys: Keys, node: dict[Any, Any], marginals: "_Marginals"
) -> "PairDependence | Fault | None":
    """Read one dependence; None where the model refuses its coefficient."""
    from assess.probability.dependence import PairDependence

    first, second = node["between"]
    if first == second:
        return document.fault(keys, "a variable cannot depend on itself", given=first)
    for kind in ("spearman", "kendall", "pearson"):
        value = _read(lambda said: convert(said, "-"), node.get(kind))
        if value is not None and -1.0 < value < 1.0:
            pair = PairDependence(first, second, value, kind)
            try:
                pair.score(marginals.of((first, second)))
            except ValueError as error:
                return document.fault((*keys, kind), str(error))
            return pair
    return None


class _Marginals:
    """Marginals of common variables where the file says them outright.

    Others (those that follow from a grade, a nominal cover, a steel) count as normal here: their
    Pearson coefficient is then the score coefficient. The prior checks with the true ones.
    """

    def __init__(self, data: Mapping[Any, Any], known: Mapping[str, Keys]) -> None:
        self._data, self._known = data, known

    def of(self, names: Any) -> "dict[str, Marginal]":
        """Give the marginals of some variables."""
        return {name: self._one(name) for name in names}

    def _one(self, name: str) -> "Marginal":
        from assess.probability.marginals import make_marginal

        said = _SAID.get(name.rpartition(".")[2])
        if said and self._known[name][0] == "zones":
            part, key, model = said
            node = mapping_at(self._data, *self._known[name], part, key)
            read: BaseModel | None = _read(model.model_validate, node)
            if isinstance(read, Distribution):
                return read.marginal()
        return make_marginal("normal", mean=0.0, sd=1.0)
