"""From draws and a section of the case to the integral's problem."""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import special

from assess.case.events import Event, LoadTest
from assess.case.forms import SectionEntry
from assess.case.reader import Case
from assess.case.spec import CaseSpec
from assess.probability.normal_space import normal_scores
from assess.reliability.importance import IntArray, Problem
from assess.reliability.limit_state import Action, LimitState, Surroundings
from assess.reliability.limit_states import LIMIT_STATES
from assess.updating.kinds import KINDS
from assess.updating.local import LocalModel
from assess.updating.model import Spec

FloatArray = NDArray[np.float64]

# The group, in words, that a local variable counts to in the sensitivities.
GROUPS = {
    "strength": "concrete strength",
    "cover": "cover and depth",
    "onset": "onset of corrosion",
    "current": "corrosion rate",
    "current through its onset": "corrosion rate",
    "bar diameter": "size of the bars",
    "width deviation": "dimensions",
    "flange thickness deviation": "dimensions",
}


@dataclass(frozen=True, slots=True, eq=False)
class SectionState:
    """One section in one state of knowledge: what is left to chance, given each draw."""

    entry: SectionEntry
    locals: tuple[LocalModel, ...]
    kinds: tuple[str, ...]  # of evidence that each of `locals` comes from
    common: Mapping[str, FloatArray]  # common variables of the section, each (n_draw,)
    measured: frozenset[str]  # kinds of evidence that a survey brought from the section itself

    @property
    def draws(self) -> int:
        """Number of draws."""
        return len(next(iter(self.common.values())))


def common_names(spec: CaseSpec, entry: SectionEntry) -> tuple[str, ...]:
    """Name the common variables that a section's limit state uses."""
    state = LIMIT_STATES[entry.limit_state]
    zone = spec.zones[entry.zone]
    return (
        *(f"{entry.zone}.{name}" for name in zone.variables()),
        *(
            variable
            for name in state.steels(entry)
            for variable in (f"steel.{name}", *_scatter_of(spec, name))
        ),
        *(f"quantity.{name}" for name in state.quantities(entry)),
        *(
            f"load.{name}.{key}"
            for name in state.load_models(entry)
            for key, _, _ in spec.load_models[name].priors()
        ),
    )


def _scatter_of(spec: CaseSpec, steel: str) -> tuple[str, ...]:
    """Name the scatter of a reinforcement where it is uncertain."""
    known = isinstance(spec.steel[steel].local_sd, float)
    return () if known else (f"steel.{steel}.scatter",)


def section_state(
    case: Case,
    spec: Spec,
    entry: SectionEntry,
    stage: int,
    values: Mapping[str, FloatArray],
) -> SectionState:
    """Condition a section's local variables on what was measured there.

    Parameters
    ----------
    case, spec : Case, Spec
        The case and its measurements.
    entry : SectionEntry
        The section.
    stage : int
        Number of surveys that count.
    values : mapping of str to ndarray (n_draw,)
        Draws of all common variables.

    Returns
    -------
    SectionState
        With local variables in a fixed order.
    """
    locals_: list[LocalModel] = []
    kinds: list[str] = []
    measured: set[str] = set()
    for key, kind in KINDS.items():
        rows = spec.rows.get(key)
        for model in kind.local(rows, stage, entry.name, entry.zone, values):
            earlier = [i for i, old in enumerate(locals_) if set(old.names) & set(model.names)]
            if earlier:  # it says what that kind knew too: the variable stays that kind's
                locals_[earlier[0]] = model
                measured.add(kinds[earlier[0]])
            else:
                locals_.append(model)
                kinds.append(key)
        place = None if rows is None else rows.place_of(entry.name)
        if (
            rows is not None
            and place is not None
            and rows.stage[rows.place == place].min() <= stage
        ):
            measured.add(key)
    names = common_names(case.spec, entry)
    return SectionState(
        entry,
        tuple(locals_),
        tuple(kinds),
        {name: values[name] for name in names},
        frozenset(measured),
    )


def without_dependence(state: SectionState, seed: int) -> SectionState:
    """Permute every common variable, and every measured local one, on its own.

    The marginals stay what they are; the dependence between them goes. Used only to show what
    ignoring the dependence would do.

    Parameters
    ----------
    state : SectionState
        With dependence.
    seed : int
        Of the permutations.

    Returns
    -------
    SectionState
        With the same marginals.
    """
    rng = np.random.default_rng([seed, 99])
    common = {name: rng.permutation(draws) for name, draws in state.common.items()}
    locals_: list[LocalModel] = []
    kinds: list[str] = []
    for key, kind in KINDS.items():
        own = [m for m, of in zip(state.locals, state.kinds, strict=True) if of == key]
        if key in state.measured:
            found = [model.without_dependence(rng) for model in own]
        else:  # without measurements of its own the section follows its (permuted) zone
            found = list(kind.local(None, 0, state.entry.name, state.entry.zone, common))
        locals_ += found
        kinds += [key] * len(found)
    return SectionState(state.entry, tuple(locals_), tuple(kinds), common, state.measured)


def dimensions(state: SectionState) -> dict[str, str]:
    """Name the standard normals of a section in order, each with its group in words.

    A local variable takes the place of the limit state's own standard normal of its name.
    """
    limit_state = LIMIT_STATES[state.entry.limit_state]
    return {
        **{
            normal: GROUPS.get(normal, normal) for model in state.locals for normal in model.normals
        },
        **limit_state.chances(state.entry),
    }


def ages(case: Case) -> FloatArray:
    """Age of the structure at the end of each year of the horizon, (n_year,) [yr]."""
    structure = case.spec.structure
    built = structure.built.year + (structure.built.timetuple().tm_yday - 1) / 365.25
    return np.asarray(structure.assessed + 1.0 + np.arange(structure.horizon) - built)


def calendar_years(case: Case) -> NDArray[np.int64]:
    """Calendar years of the horizon, the year of assessment first."""
    return case.spec.structure.assessed + np.arange(case.spec.structure.horizon)


def build_problem(
    case: Case,
    state: SectionState,
    action: Action,
    events: Sequence[Event] = (),
    draw_weight: FloatArray | None = None,
) -> Problem:
    """Put a section under an option as the integral sees it.

    Parameters
    ----------
    case : Case
        The case.
    state : SectionState
        The section in one state of knowledge.
    action : Action
        What the option does to it.
    events : sequence of Event
        What has happened to this very section.
    draw_weight : ndarray, shape (n_draw,), optional
        Weights of the draws by what has happened to other sections.

    Returns
    -------
    Problem
        Its hazard is minus the log-probability that the year's largest effect stays below the
        load capacity, `AnnualMaximum.log_hazard`.
    """
    limit_state: LimitState = LIMIT_STATES[state.entry.limit_state]
    names = list(dimensions(state))
    age = ages(case)
    maximum = limit_state.annual_maximum(
        state.entry, case.spec, calendar_years(case).astype(np.float64), state.common
    ).scaled(np.broadcast_to(np.asarray(action.load_factor, dtype=np.float64), age.shape))

    def log_hazard(z: FloatArray, draws: IntArray, years: IntArray) -> FloatArray:
        here = _surroundings(state, names, z, draws, age[years], action)
        capacity = limit_state.load_capacity(state.entry, case.spec, here)
        return maximum.log_hazard(capacity, draws, years)

    return Problem(
        log_hazard,
        len(names),
        state.draws,
        len(age),
        maximum.ratio,
        _features(state.common),
        _log_survival(case, state, names, events) if events else None,
        draw_weight,
        maximum.shape,
    )


def capacity_now(
    case: Case, state: SectionState, z: FloatArray, draws: IntArray, action: Action
) -> FloatArray:
    """Load capacity in the first year, for chosen draws and points, (n, k)."""
    limit_state: LimitState = LIMIT_STATES[state.entry.limit_state]
    here = _surroundings(state, list(dimensions(state)), z, draws, ages(case)[:1], action)
    capacity = limit_state.load_capacity(state.entry, case.spec, here)
    return np.broadcast_to(capacity, (*z.shape[:2], 1))[..., 0]


def _log_survival(
    case: Case, state: SectionState, names: Sequence[str], events: Sequence[Event]
) -> Callable[[FloatArray, IntArray], FloatArray]:
    r"""Give the log-probability of what has happened, for chosen draws and points.

    Notes
    -----
    A load test is survived where the load capacity q of its year exceeds the effect Q, known up
    to a lognormal error of standard deviation s: :math:`\ln \Phi(\ln(q/Q)/s)`. Years served
    without failure have the probability :math:`\prod_y F_y(q_y)`, as those to come.
    """
    limit_state: LimitState = LIMIT_STATES[state.entry.limit_state]
    structure = case.spec.structure

    def capacity(z: FloatArray, draws: IntArray, years: FloatArray) -> FloatArray:
        age = years - structure.assessed + ages(case)[0]
        here = _surroundings(state, names, z, draws, age, Action())
        return limit_state.load_capacity(state.entry, case.spec, here)

    def log_survival(z: FloatArray, draws: IntArray) -> FloatArray:
        total = np.zeros(z.shape[:2])
        for event in events:
            if isinstance(event, LoadTest):
                carried = capacity(z, draws, np.array([float(event.year)]))[..., 0]
                spread = np.sqrt(np.log1p(event.error**2))
                ratio = np.log(np.maximum(carried, 1e-300) / event.effect) / spread
                total += special.log_ndtr(np.maximum(ratio, -37.0))
                continue
            years = np.arange(event.from_year, event.to_year + 1.0)
            maximum = limit_state.annual_maximum(state.entry, case.spec, years, state.common)
            maximum = maximum.scaled(np.full(len(years), event.load_factor))
            log_hazard = maximum.log_hazard(capacity(z, draws, years), draws, np.arange(len(years)))
            hazard = np.exp(np.minimum(log_hazard, 50.0))
            total -= np.minimum(hazard.sum(axis=-1), 700.0)
        return total

    return log_survival


def _features(common: Mapping[str, FloatArray]) -> FloatArray | None:
    """Scores of the common variables that vary, (n_draw, n_variable)."""
    columns = [draws for draws in common.values() if np.ptp(draws) > 0.0]
    return normal_scores(np.column_stack(columns)) if columns else None


def _surroundings(
    state: SectionState,
    names: Sequence[str],
    z: FloatArray,
    draws: IntArray,
    age: FloatArray,
    action: Action,
) -> Surroundings:
    """Give local and common values for chosen draws and points."""
    local: dict[str, FloatArray] = {}
    first = 0
    for model in state.locals:
        last = first + len(model.normals)
        found = model.values(z[..., first:last], draws)
        local |= {name: value[..., None] for name, value in found.items()}
        first = last
    return Surroundings(
        local=local,
        common={name: value[draws][:, None, None] for name, value in state.common.items()},
        chance={name: z[..., i, None] for i, name in enumerate(names) if i >= first},
        age=age,
        action=action,
    )
