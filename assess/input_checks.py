"""What is wrong with a case that reads well: checks that need models, limit states and targets."""

from collections.abc import Iterator
from dataclasses import replace

from assess.case.dependence import matrix_faults
from assess.case.reader import Case
from assess.case.spec import GradedConcrete, NamedTarget
from assess.case.yamlfile import listed
from assess.decisions.targets import TARGET_SETS
from assess.errors import Fault
from assess.mechanics.concrete import GRADES
from assess.probability.dependence import PairDependence
from assess.reliability.limit_states import LIMIT_STATES
from assess.updating.kinds import KINDS
from assess.updating.prior import joint_prior
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
    faults += _section_faults(case)
    faults += _target_faults(case)
    grades = list(_grade_faults(case))
    faults += grades or _dependence_faults(case)  # the prior needs its grades
    return sorted(set(faults))


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


def _dependence_faults(case: Case) -> list[Fault]:
    """Check the stated dependence with the true marginals of all variables."""
    document = case.document
    independent = replace(case, spec=case.spec.model_copy(update={"dependence": ()}), evidence=())
    variables = joint_prior(independent).variables
    marginals = {one.name: one.marginal for one in variables if isinstance(one, Variable)}
    faults, pairs = [], []
    for index, stated in enumerate(case.spec.dependence):
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
