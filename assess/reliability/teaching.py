"""What surveys and kinds of evidence taught about the load capacity of a section."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from assess.case.reader import Case
from assess.reliability.importance import normal_points
from assess.reliability.limit_state import Action
from assess.reliability.problem import (
    SectionState,
    capacity_now,
    dimensions,
    section_state,
)
from assess.updating.kind import Rows
from assess.updating.kinds import KINDS
from assess.updating.model import Spec
from assess.updating.stages import StageDraws

FloatArray = NDArray[np.float64]

THINNED = 1000  # draws at which the likelihood of each kind is looked at
BINS = 30
WORST_SHAPE = 0.7  # Pareto shape above which importance weights are not to be relied on


@dataclass(frozen=True, slots=True)
class Taught:
    """How much one thing taught about one section's load capacity."""

    by: str  # name of the survey's stage, or title of the kind
    variance_explained: float | None  # share of the variance before; None: cannot be told
    nats: float | None  # information gained


@dataclass(frozen=True, slots=True)
class Teaching:
    """What was taught about one section."""

    section: str
    surveys: tuple[Taught, ...]  # each against the state before it
    kinds: tuple[Taught, ...]  # each against the last state without it


def capacity_draws(case: Case, state: SectionState, seed: int) -> FloatArray:
    """Draw this year's load capacity, local variables included, one value for each draw.

    Parameters
    ----------
    case : Case
        The case.
    state : SectionState
        The section in one state of knowledge.
    seed : int
        Of the local variables.

    Returns
    -------
    ndarray, shape (n_draw,)
        Variable load effect that uses the section up.
    """
    z = normal_points(len(dimensions(state)), state.draws, seed)[0]
    return capacity_now(case, state, z[:, None, :], np.arange(state.draws), Action())[:, 0]


def taught(by: str, before: FloatArray, after: FloatArray, weight: FloatArray | None) -> Taught:
    r"""Compare two states of knowledge of one quantity.

    Parameters
    ----------
    by : str
        What lies between them.
    before, after : ndarray, shape (n,)
        Values before and after.
    weight : ndarray, shape (n,), or None
        Weights of the values before.

    Returns
    -------
    Taught
        Share of the variance removed, and :math:`\int p \ln (p/q)` of after against before.

    Notes
    -----
    The integral is summed over bins that are equally probable before, less the bias of finite
    samples, (bins - 1)/2 (1/n_after + 1/n_before) for independent ones [1]_.

    References
    ----------
    .. [1] G. A. Miller, Note on the bias of information estimates, in: Information Theory in
       Psychology, 1955, 95-100 (first-order bias of a plug-in estimate).
    """
    order = np.argsort(before)
    share = np.ones(len(before)) if weight is None else weight
    share = share[order] / share.sum()
    effective = 1.0 / np.sum(share**2)
    cumulative = np.cumsum(share)
    edges = before[order][np.searchsorted(cumulative, np.arange(1, BINS) / BINS)]
    place_before = np.searchsorted(edges, before[order], side="right")
    q = np.bincount(place_before, weights=share, minlength=BINS)
    counts = np.bincount(np.searchsorted(edges, after, side="right"), minlength=BINS)
    p = counts / counts.sum()
    filled = p > 0.0
    plain = float(np.sum(p[filled] * np.log(p[filled] / np.maximum(q[filled], 1e-12))))
    bias = 0.5 * (BINS - 1) * (1.0 / len(after) + 1.0 / effective)
    mean = float(share @ before[order])
    variance = float(share @ (before[order] - mean) ** 2)
    return Taught(by, 1.0 - float(after.var()) / variance, max(plain - bias, 0.0))


def kind_weights(
    spec: Spec, draws: StageDraws
) -> tuple[NDArray[np.int64], dict[str, FloatArray | None]]:
    """Weigh draws so that they stand for the state of knowledge without one kind of evidence.

    Parameters
    ----------
    spec : Spec
        Prior and measurements.
    draws : StageDraws
        Last state of knowledge.

    Returns
    -------
    chosen : ndarray of int
        Thinned draws that the weights belong to.
    weights : dict of str to ndarray or None
        By kind; None where importance weights are not to be relied on, for what the kind taught
        is more than reweighting can undo.

    References
    ----------
    .. [1] A. Vehtari, D. Simpson, A. Gelman, Y. Yao, J. Gabry, Pareto smoothed importance
       sampling, J. Mach. Learn. Res. 25 (2024) 1-58.
    """
    from arviz_stats.base import array_stats

    count = draws.physical.shape[0] * draws.physical.shape[1]
    chosen = np.unique(np.linspace(0, count - 1, min(THINNED, count)).astype(np.int64))
    values = {name: series[chosen] for name, series in draws.values().items()}
    found: dict[str, FloatArray | None] = {}
    for key in spec.rows:
        lost = lost_log_likelihood(spec, key, values, draws.number)
        if np.ptp(lost) == 0.0:
            found[key] = np.ones(len(chosen))
            continue
        smoothed, shape = array_stats.psislw(lost)  # takes what is lost, gives weights without it
        found[key] = np.exp(smoothed - smoothed.max()) if float(shape) <= WORST_SHAPE else None
    return chosen, found


def lost_log_likelihood(
    spec: Spec, key: str, values: Mapping[str, FloatArray], stage: int
) -> FloatArray:
    """Log-likelihood that leaving one kind out takes away, of each draw.

    Parameters
    ----------
    spec : Spec
        Prior and measurements.
    key : str
        Of the kind.
    values : mapping of str to ndarray (n_draw,)
        Draws of all common variables.
    stage : int
        Number of surveys that count.

    Returns
    -------
    ndarray, shape (n_draw,)
        The kind's own log-likelihood, and what that of kinds that are given it changes by.
    """

    def of(name: str, rows: Rows) -> FloatArray:
        kind = KINDS[name]
        found = kind.log_likelihood(rows, values, kind.data(rows, stage))
        # A kind that tells no common variable anything has one number for all draws.
        return np.broadcast_to(np.asarray(found, dtype=np.float64), count)

    count = len(next(iter(values.values())))
    lost = of(key, spec.rows[key])
    for name, rows in spec.rows.items():
        other = KINDS[name].without(rows, key)
        if other is not rows:
            lost = lost + of(name, rows) - of(name, other)
    return lost


def section_teaching(
    case: Case,
    states: Mapping[str, SectionState],
    section: str,
    chosen: NDArray[np.int64],
    weights: Mapping[str, FloatArray | None],
    seed: int,
) -> Teaching:
    """Say what each survey and each kind taught about a section.

    Parameters
    ----------
    case : Case
        The case.
    states : mapping of str to SectionState
        The section after each survey, by the name of the stage, the prior first.
    section : str
        Its name.
    chosen, weights
        From `kind_weights`, of the last state.
    seed : int
        Of the local variables.

    Returns
    -------
    Teaching
        The local variables of a section that was measured itself stay conditioned where a kind
        is left out: what the kind taught of the zone is what is compared.
    """
    capacities = {name: capacity_draws(case, state, seed) for name, state in states.items()}
    names = list(capacities)
    surveys = [
        taught(after, capacities[before], capacities[after], None)
        for before, after in zip(names[:-1], names[1:], strict=True)
    ]
    last = capacities[names[-1]]
    kinds = [
        Taught(KINDS[key].form.title, None, None)
        if weight is None
        # Both sides on the same draws and local values: only the weights differ.
        else taught(KINDS[key].form.title, last[chosen], last[chosen], weight)
        for key, weight in weights.items()
    ]
    return Teaching(section, tuple(surveys), tuple(kinds))


def teachings(case: Case, spec: Spec, stages: Sequence[StageDraws], seed: int) -> list[Teaching]:
    """Say what was taught about each section.

    Parameters
    ----------
    case, spec : Case, Spec
        The case and its measurements.
    stages : sequence of StageDraws
        The prior and the states after each survey.
    seed : int
        Of the local variables.

    Returns
    -------
    list of Teaching
        In the order of the case's sections; empty where there was no survey.
    """
    if len(stages) < 2:
        return []
    chosen, weights = kind_weights(spec, stages[-1])
    values = [(stage, stage.values()) for stage in stages]
    return [
        section_teaching(
            case,
            {
                stage.name: section_state(case, spec, entry, stage.number, found)
                for stage, found in values
            },
            name,
            chosen,
            weights,
            seed,
        )
        for name, entry in case.spec.sections().items()
    ]
