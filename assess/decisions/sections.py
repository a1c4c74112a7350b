"""All sections of a case at one stage: reliability, verdicts, dependence dropped, options."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from assess.case.events import Event
from assess.case.reader import Case
from assess.decisions.options import LEAVE, OPTIONS
from assess.decisions.results import SectionResult, Target, Verdict
from assess.decisions.verdicts import verdict
from assess.reliability.importance import Proposal
from assess.reliability.index import probability_from_index
from assess.reliability.limit_state import Action
from assess.reliability.problem import (
    SectionState,
    ages,
    calendar_years,
    common_names,
    section_state,
    without_dependence,
)
from assess.reliability.section import (
    Past,
    Precision,
    SectionReliability,
    load_factor,
    section_reliability,
    section_sensitivities,
    solve_load_factor,
)
from assess.updating.model import Spec
from assess.updating.stages import StageDraws

FloatArray = NDArray[np.float64]


class Task[T](Protocol):
    """Something under way."""

    def begin_here(self) -> None:
        """Do it in this process, unless another has it already."""
        ...

    def result(self) -> T:
        """Wait for the result."""
        ...


class Crew(Protocol):
    """Works on a case, in this process or in others."""

    def submit[T](self, work: Callable[..., T], *arguments: Any, **named: Any) -> Task[T]:
        """Set ``work(case, spec, *arguments, **named)`` going; ``work`` is a module's function."""
        ...


@dataclass(frozen=True, slots=True)
class Question:
    """What every section is asked."""

    target: Target
    precision: Precision
    seed: int


def used_variables(case: Case) -> list[str]:
    """Name the common variables that any limit state uses, in order of first use."""
    return list(
        dict.fromkeys(
            name
            for entry in case.spec.sections().values()
            for name in common_names(case.spec, entry)
        )
    )


def member_of(case: Case, section: str) -> str:
    """Name the member that a section belongs to."""
    return next(
        member.name
        for member in case.spec.members
        if any(entry.name == section for entry in member.sections)
    )


def actions(case: Case, section: str) -> dict[str, Action | None]:
    """Give what each stated option does to a section, None for nothing; without `leave`."""
    years, age = calendar_years(case), ages(case)
    member = member_of(case, section)
    found: dict[str, Action | None] = {}
    for option in case.spec.decision.options:
        applies = not option.members or member in option.members
        kind = OPTIONS[option.kind]
        found[option.name] = kind.action(option, case.spec, years, age) if applies else None
    return found


def stage_results(
    case: Case,
    draws: StageDraws,
    question: Question,
    crew: Crew,
    *,
    final: bool,
    pasts: Mapping[str, Past] | None = None,
) -> list[Task[list[SectionResult]]]:
    """Set all sections of a stage to work; each task gives one section's results.

    Parameters
    ----------
    case : Case
        The case.
    draws : StageDraws
        State of knowledge.
    question : Question
        Target, precision, seed.
    crew : Crew
        Does the work; numbers do not depend on how much it does at a time.
    final : bool
        Whether this is the last stage, for which options are computed too.
    pasts : mapping of str to Past, optional
        What has happened, by section, from `pasts_of`.

    Returns
    -------
    list of Task
        In the order of the case's sections.
    """
    known = Knowledge.of(draws)
    return [
        crew.submit(
            _section,
            name,
            known,
            question,
            final=final,
            past=(pasts or {}).get(name),
        )
        for name in case.spec.sections()
    ]


@dataclass(frozen=True, slots=True, eq=False)
class Knowledge:
    """What a section needs of a stage's draws."""

    stage: str
    surveys: int  # number of them that count
    values: Mapping[str, FloatArray]  # each (n_draw,)

    @staticmethod
    def of(draws: StageDraws) -> "Knowledge":
        """Take it from the draws."""
        return Knowledge(draws.name, draws.number, draws.values())


def _section(
    case: Case,
    spec: Spec,
    name: str,
    known: Knowledge,
    question: Question,
    *,
    final: bool,
    past: Past | None = None,
) -> list[SectionResult]:
    """Give results of one section: `leave`, then at the last stage each option."""
    state = _state(case, spec, name, known)
    left = _reliability(case, state, Action(), question, past=past)
    results = [_result(case, state, known.stage, LEAVE, Action(), left, question, past)]
    if past is None:  # a past ties the draws together: there is no dropping that
        torn = without_dependence(state, question.seed)
        dropped = _reliability(case, torn, Action(), question)
        results[0] = replace(
            results[0],
            independent=dropped.reference,
            verdict_independent=_judge(dropped, question, results[0].verdict.governing),
        )
    if final:
        for option, action in actions(case, name).items():
            if action is None:  # the option leaves this member as it is
                results.append(
                    replace(
                        results[0],
                        option=option,
                        independent=None,
                        verdict_independent=None,
                        evaluations=0,
                    )
                )
                continue
            # On the points of `leave`, unless these are too few for the option: what differs
            # between options is then not noise.
            found = _reliability(case, state, action, question, left.proposal, past)
            results.append(_result(case, state, known.stage, option, action, found, question, past))
    return results


def _state(case: Case, spec: Spec, name: str, known: Knowledge) -> SectionState:
    return section_state(case, spec, case.spec.sections()[name], known.surveys, known.values)


def _reliability(
    case: Case,
    state: SectionState,
    action: Action,
    question: Question,
    proposal: Proposal | None = None,
    past: Past | None = None,
) -> SectionReliability:
    return section_reliability(
        case, state, action, question.target.period, question.precision, proposal, past
    )


def pasts_of(
    case: Case, draws: StageDraws, question: Question, crew: Crew
) -> tuple[dict[str, Past], FloatArray]:
    """Work out what the events of all sections say of the draws.

    Parameters
    ----------
    case : Case
        The case, with events.
    draws : StageDraws
        Last state of knowledge before the events count.
    question : Question
        Target, precision, seed.
    crew : Crew
        Does the work.

    Returns
    -------
    pasts : dict of str to Past
        For each section its own events, and the weight that those of the others give each draw.
    weight : ndarray, shape (n_draw,)
        Weight of each draw by all events, mean 1.

    Notes
    -----
    Given a draw the local variables of different sections are independent, so that a draw's
    weight is the product over sections of the probability of their past given the draw. A
    section's own past enters its integral point by point, not as a weight.
    """
    known = Knowledge.of(draws)
    own: dict[str, tuple[Event, ...]] = {}
    for event in case.spec.events:
        own[event.section] = (*own.get(event.section, ()), event)
    tasks = {name: crew.submit(_survived, name, known, question, own[name]) for name in own}
    weights = {name: task.result() for name, task in tasks.items()}
    whole = np.prod(list(weights.values()), axis=0)
    pasts = {
        name: Past(
            own.get(name, ()),
            np.prod([w for other, w in weights.items() if other != name], axis=0)
            * np.ones_like(whole),
        )
        for name in case.spec.sections()
    }
    return pasts, whole / whole.mean()


def _survived(
    case: Case,
    spec: Spec,
    name: str,
    known: Knowledge,
    question: Question,
    events: tuple[Event, ...],
) -> FloatArray:
    """Weigh the draws by what has happened to one section."""
    state = _state(case, spec, name, known)
    return _reliability(case, state, Action(), question, past=Past(events)).draw_weight


def _result(
    case: Case,
    state: SectionState,
    stage: str,
    option: str,
    action: Action,
    found: SectionReliability,
    question: Question,
    past: Past | None,
) -> SectionResult:
    """Judge one section under one option."""

    def under_load(factor: float) -> SectionReliability:
        scaled = replace(action, load_factor=np.asarray(action.load_factor) * factor)
        return _reliability(case, state, scaled, question, past=past)

    sensitivities = section_sensitivities(state, found)
    governing = next(iter(sensitivities), "")
    return SectionResult(
        section=state.entry.name,
        member=member_of(case, state.entry.name),
        zone=state.entry.zone,
        stage=stage,
        option=option,
        annual=found.annual,
        cumulative=found.cumulative,
        reference=found.reference,
        independent=None,
        verdict=_judge(found, question, governing, under_load),
        verdict_independent=None,
        sensitivities=sensitivities,
        evaluations=found.evaluations,
        note=_note(found, question.precision.tolerance),
    )


def _judge(
    found: SectionReliability,
    question: Question,
    governing: str,
    again: Callable[[float], SectionReliability] | None = None,
) -> Verdict:
    """Judge integrated curves, with the load factor that would meet the target now.

    Where the target is missed a limit is to be proposed: with ``again``, which integrates under a
    scaled load, the factor holds however far from today's load it leads.
    """
    allowed = float(probability_from_index(question.target.index))
    period = question.target.period
    if again is not None and found.reference.index[0] < question.target.index:
        factor = solve_load_factor(found, again, allowed, period)
    else:
        factor = load_factor(found, allowed, period)
    return verdict(
        found.reference, found.conditional, question.target, factor, governing, found.draw_weight
    )


def _note(found: SectionReliability, tolerance: float) -> str:
    """Say what the reader of the index must know."""
    curve = found.annual
    if not np.all(np.isfinite(curve.index)):
        return "the failure probability is below what can be represented"
    worst = float(np.max(curve.integration_error[curve.index > 0.0], initial=0.0))
    if worst > tolerance:
        return f"integration error of the index {worst:.3f}, larger than the {tolerance:g} asked"
    return ""
