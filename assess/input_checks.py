"""What is wrong with a case that reads well: checks that need models, limit states and targets."""

from collections.abc import Iterator
from dataclasses import replace

from pydantic import ValidationError

from assess.case.dependence import matrix_faults
from assess.case.events import LoadTest
from assess.case.reader import Case
from assess.case.spec import GradedConcrete, NamedTarget
from assess.case.yamlfile import listed, nearest
from assess.decisions.targets import TARGET_SETS
from assess.errors import Fault
from assess.mechanics.concrete import GRADES
from assess.probability.dependence import PairDependence
from assess.reliability.limit_states import LIMIT_STATES
from assess.units import QuantityError
from assess.updating.kinds import KINDS
from assess.updating.prior import joint_prior, overridden
from assess.updating.variables import Variable

_RANKS = "state a rank correlation: spearman or kendall"


def further_faults(case: Case) -> list[Fault]:
    """Find everything that the reading of a case cannot know to be wrong.

    Parameters
    ----------
    case : Case
        Sound as far as its file goes; tables that could not be read may be left out.

    Returns
    -------
    list of Fault
        Sorted, each with its line.
    """
    faults = [fault for kind in KINDS.values() for fault in kind.faults(case)]
    if faults:
        case = _without_measuring(case)
    faults += _section_faults(case)
    faults += _target_faults(case)
    faults += _event_faults(case)
    names = list(_grade_faults(case)) + list(_pooling_faults(case))
    faults += names or list(_prior_faults(case)) or _dependence_faults(case)  # in this order
    return sorted(set(faults))


def _without_measuring(case: Case) -> Case:
    """Leave out what was measured, where it cannot be arranged, and all that speaks of it."""
    kinds = tuple(KINDS)
    kept = tuple(
        stated
        for stated in case.spec.dependence
        if not any(name.startswith(kinds) for name in stated.between)
    )
    priors = {name: said for name, said in case.spec.priors.items() if not name.startswith(kinds)}
    spec = case.spec.model_copy(update={"dependence": kept, "priors": priors})
    return replace(case, spec=spec, evidence=())


def _section_faults(case: Case) -> Iterator[Fault]:
    """Ask each section's limit state."""
    for i, member in enumerate(case.spec.members):
        for j, entry in enumerate(member.sections):
            for one in LIMIT_STATES[entry.limit_state].faults(entry, case.spec):
                keys = ("members", i, "sections", j, *one.keys)
                yield case.document.fault(
                    keys, one.what, given=one.given, allowed=one.allowed, mend=one.mend
                )


def _grade_faults(case: Case) -> Iterator[Fault]:
    """Find grades that exist, but not of this production."""
    for name, zone in case.spec.zones.items():
        concrete = zone.concrete
        if isinstance(concrete, GradedConcrete):
            known = GRADES[concrete.production]
            if concrete.grade not in known:
                what = f"there is no published strength prior of this grade, {concrete.production}"
                yield case.document.fault(
                    ("zones", name, "concrete", "grade"),
                    what,
                    given=concrete.grade,
                    allowed=listed(known),
                    mend="or say mean, V and equivalent_tests",
                )


def _pooling_faults(case: Case) -> Iterator[Fault]:
    """Find pooled zones that do not exist, lack the variable, or are pooled twice."""
    seen: set[str] = set()
    for index, stated in enumerate(case.spec.pooling):
        for j, zone in enumerate(stated.zones):
            keys = ("pooling", index, "zones", j)
            name = f"{zone}.{stated.variable}"
            if zone not in case.spec.zones:
                known = case.spec.zones
                what, near = "there is no zone of this name", nearest(zone, known)
                yield case.document.fault(keys, what, given=zone, allowed=listed(known), mend=near)
            elif stated.variable not in case.spec.zones[zone].variables():
                known_here = case.spec.zones[zone].variables()
                what = f"zone {zone!r} has no such variable"
                near = nearest(stated.variable, known_here)
                yield case.document.fault(
                    keys, what, given=stated.variable, allowed=listed(known_here), mend=near
                )
            elif name in seen:
                yield case.document.fault(keys, "the variable is pooled twice", given=name)
            seen.add(name)


def _without(case: Case, *parts: str) -> Case:
    """Give the case without what is to be checked."""
    return replace(
        case,
        spec=case.spec.model_copy(
            update={part: type(getattr(case.spec, part))() for part in parts}
        ),
    )


def _prior_faults(case: Case) -> Iterator[Fault]:
    """Check what the case puts in place of the tool's own priors."""
    known = {one.name: one for one in joint_prior(_without(case, "priors", "dependence")).variables}
    for name in case.spec.priors:
        keys = ("priors", name)
        if name not in known:
            what, near = "there is no such variable", nearest(name, known)
            yield case.document.fault(keys, what, given=name, allowed=listed(known), mend=near)
            continue
        try:
            overridden(known[name], case.spec)
        except ValidationError as error:
            for item in error.errors(include_url=False):
                said = item.get("ctx", {}).get("error")
                place = (*keys, *item["loc"])
                if isinstance(said, QuantityError):
                    yield case.document.fault(
                        place, said.what, given=said.given, allowed=said.allowed, mend=said.mend
                    )
                else:
                    yield case.document.fault(place, item["msg"].lower())


def _dependence_faults(case: Case) -> list[Fault]:
    """Check the stated dependence with the true marginals of all variables."""
    document = case.document
    variables = joint_prior(_without(case, "dependence")).variables
    known = [one.name for one in variables]
    marginals = {one.name: one.marginal for one in variables if isinstance(one, Variable)}
    faults, pairs = [], []
    for index, stated in enumerate(case.spec.dependence):
        strangers = [(i, name) for i, name in enumerate(stated.between) if name not in known]
        for i, name in strangers:
            what, near = "there is no such variable", nearest(name, known)
            place = ("dependence", index, "between", i)
            faults.append(document.fault(place, what, given=name, allowed=listed(known), mend=near))
        if strangers:
            continue
        without = [name for name in stated.between if name not in marginals]
        if stated.measure == "pearson" and without:
            what = "a Pearson coefficient needs a variable whose distribution stands by itself"
            given = f"{listed(without)} (it depends on the scatter of the strength)"
            keys = ("dependence", index, "pearson")
            faults.append(document.fault(keys, what, given=given, mend=_RANKS))
            continue
        pair = PairDependence(*stated.between, coefficient=stated.coefficient, kind=stated.measure)
        try:
            pair.score(marginals)
        except ValueError as error:  # a Pearson coefficient that the marginals do not allow
            keys = ("dependence", index, stated.measure)
            faults.append(document.fault(keys, str(error), mend=_RANKS))
        else:
            pairs.append(pair)
    return [*faults, *matrix_faults(document, pairs, marginals)]


def _event_faults(case: Case) -> Iterator[Fault]:
    """Find events at sections that do not exist, or at times that cannot be."""
    sections, structure = case.spec.sections(), case.spec.structure
    built, assessed = structure.built.year, structure.assessed
    for index, event in enumerate(case.spec.events):
        keys = ("events", index)
        if event.section not in sections:
            what, near = "there is no section of this name", nearest(event.section, sections)
            yield case.document.fault(
                (*keys, "section"), what, given=event.section, allowed=listed(sections), mend=near
            )
        if isinstance(event, LoadTest):
            spans = [("year", event.year, built, assessed)]
        else:
            spans = [
                ("from", event.from_year, built, assessed - 1),
                ("to", event.to_year, max(built, event.from_year), assessed - 1),
            ]
        for key, year, low, high in spans:
            if not low <= year <= high:
                what = "the year is before construction, after the assessment or out of order"
                allowed = f"{low} to {high}"
                yield case.document.fault((*keys, key), what, given=str(year), allowed=allowed)


def _target_faults(case: Case) -> Iterator[Fault]:
    """Find what the target asks for and the horizon or its document cannot give."""
    stated, horizon = case.spec.decision.target, case.spec.structure.horizon
    keys = ("decision", "target", "period")
    given = f"{stated.period:g}"
    whole = stated.period == int(stated.period)
    if isinstance(stated, NamedTarget):
        periods = TARGET_SETS[stated.set].classes[stated.class_]
        if stated.period not in periods:
            what = f"{stated.set}, {stated.class_}, has no target of this reference period"
            allowed = listed(periods)
            mend = "targets are not converted from one period to another"
            yield case.document.fault(keys, what, given=given, allowed=allowed, mend=mend)
            return
    if not whole or stated.period > horizon:
        what = "the reference period must be whole years within the horizon"
        mend = "take a target of another period or a longer horizon"
        allowed = f"1 to {horizon}"
        yield case.document.fault(keys, what, given=given, allowed=allowed, mend=mend)
