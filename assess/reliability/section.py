"""Reliability of one section over the years: curves, conditional indices, sensitivities."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import optimize

from assess.case.events import Event
from assess.case.reader import Case
from assess.probability.generalised_extreme import reduced_variate, standard_value
from assess.reliability.importance import Proposal, Sample
from assess.reliability.lifetime import Probabilities, integrate, probabilities, windows
from assess.reliability.limit_state import Action
from assess.reliability.problem import SectionState, build_problem, calendar_years
from assess.reliability.sensitivity import sensitivity_factors

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

REFINEMENTS = 4  # integrals for a load factor that leads far from today's load
NEARBY = 0.15  # step of ln(load factor) over which one sample serves
LEAST_FACTOR, MOST_FACTOR = 0.02, 5.0  # load factors that are looked for
BAND = (0.05, 0.95)  # quantiles of the index conditional on the draw


@dataclass(frozen=True, slots=True, eq=False)
class IndexCurve:
    """Reliability index of one section over years; every array has shape (n_year,).

    ``period`` is the number of years that each value covers, ending with ``year``.
    ``low`` and ``high`` bound the index conditional on the draw (common variables known).
    """

    year: IntArray
    period: IntArray
    index: FloatArray  # predictive, all uncertainty integrated
    low: FloatArray  # 5 % of the conditional index
    high: FloatArray  # 95 %
    integration_error: FloatArray  # standard error of `index`, numerical integration
    mcmc_error: FloatArray  # standard error of `index`, finite Markov chains
    failure_probability: FloatArray

    @property
    def error(self) -> FloatArray:
        """Both errors together."""
        return np.asarray(np.hypot(self.integration_error, self.mcmc_error))


@dataclass(frozen=True, slots=True, eq=False)
class SectionReliability:
    """What the integral says of one section."""

    annual: IndexCurve
    cumulative: IndexCurve
    reference: IndexCurve
    conditional: FloatArray  # probability given the draw, (n_draw, n_reference)
    draw_weight: FloatArray  # weight of each draw given the section's past, mean 1
    sample: Sample
    load_ratio: FloatArray  # location over scale of the load, (n_year,) or (n_draw, n_year)
    load_shape: FloatArray | float  # of its distribution, (n_draw,) or one for all
    proposal: Proposal
    evaluations: int


@dataclass(frozen=True, slots=True)
class Precision:
    """How exactly to integrate, and from which seed."""

    chains: int
    tolerance: float
    seed: int


@dataclass(frozen=True, slots=True, eq=False)
class Past:
    """What has happened to a section, and what that of others says of each draw."""

    events: tuple[Event, ...] = ()
    draw_weight: FloatArray | None = None  # (n_draw,)


def section_reliability(
    case: Case,
    state: SectionState,
    action: Action,
    period: int,
    precision: Precision,
    proposal: Proposal | None = None,
    past: Past | None = None,
) -> SectionReliability:
    """Integrate one section under one option.

    Parameters
    ----------
    case : Case
        The case.
    state : SectionState
        The section in one state of knowledge.
    action : Action
        What the option does.
    period : int
        Reference period of the target [yr], at most the horizon.
    precision : Precision
        Tolerance and seed.
    proposal : Proposal, optional
        Of the same section under another option, for common random numbers.
    past : Past, optional
        What has happened to this section and to others.

    Returns
    -------
    SectionReliability
        Yearly, cumulative and for every window of the reference period.
    """
    past = past or Past()
    problem = build_problem(case, state, action, past.events, past.draw_weight)
    found = integrate(
        problem,
        chains=precision.chains,
        tolerance=precision.tolerance,
        seed=precision.seed,
        proposal=proposal,
    )
    sample, annual = found.sample, found.annual
    years = calendar_years(case)
    last = np.arange(problem.years)
    cumulative = probabilities(sample, np.zeros_like(last), last, precision.chains)
    if period == 1:
        reference, until = annual, last
    else:
        first, until = windows(problem.years, period)
        reference = probabilities(sample, first, until, precision.chains)
    return SectionReliability(
        _curve(annual, years, np.ones_like(last)),
        _curve(cumulative, years, last + 1),
        _curve(reference, years[until], np.full(len(until), period)),
        reference.conditional,
        reference.draw_weight,
        sample,
        problem.load_ratio,
        problem.load_shape,
        found.proposal,
        found.evaluations,
    )


def _curve(found: Probabilities, year: IntArray, period: IntArray) -> IndexCurve:
    return IndexCurve(
        year,
        period,
        found.index,
        found.index_quantile(BAND[0]),
        found.index_quantile(BAND[1]),
        found.integration_error,
        found.mcmc_error,
        found.probability,
    )


def section_sensitivities(state: SectionState, found: SectionReliability) -> dict[str, float]:
    """Sensitivity factors by group for failure in the last year of the horizon."""
    return sensitivity_factors(state, found.sample, year=-1)


def load_factor(found: SectionReliability, target_probability: float, period: int) -> float | None:
    r"""Factor on the variable load that just meets the target in the first reference period.

    Parameters
    ----------
    found : SectionReliability
        Of the section with today's load.
    target_probability : float
        Failure probability that the target allows in a reference period.
    period : int
        Reference period [yr].

    Returns
    -------
    float or None
        The factor, below 1 where the target is missed today; None where no load at all could be
        carried, or more than five times today's.

    Notes
    -----
    A maximum scaled by f has location f u and scale f b, so that a capacity of q/b scales of
    today's load lies :math:`q/(b f) - u/b` of the scales above its location then. The same weighted
    sample serves all factors (common random numbers); Brent's method on ln f. The points were laid
    for one load: far from it the factor is rough, see `solve_load_factor`.
    """
    sample = found.sample
    weight = sample.given_past()
    hazard = np.maximum(sample.hazard[..., :period], 1e-300)
    ratio = found.load_ratio[..., :period]
    shape = np.asarray(found.load_shape, dtype=np.float64)
    if ratio.ndim > 1:
        ratio = ratio[sample.owner]
    if shape.ndim:
        shape = shape[sample.owner][:, None]
    reduced = -np.log(hazard)
    gumbel = not np.any(shape)
    above = reduced if gumbel else standard_value(reduced, shape)
    capacity = ratio + above  # over the scale of today's load

    def excess(log_factor: float) -> float:
        """Logarithm of the failure probability over the one allowed: nearly straight."""
        under = capacity / np.exp(log_factor) - ratio
        under = under if gumbel else reduced_variate(under, shape)
        scaled = np.exp(np.minimum(-under, 700.0)).sum(axis=-1)
        probability = float(np.sum(weight * -np.expm1(-scaled)) / len(weight))
        return float(np.log(max(probability, 1e-300) / target_probability))

    low, high = np.log(LEAST_FACTOR), np.log(MOST_FACTOR)
    if excess(low) > 0.0 or excess(high) < 0.0:
        return None
    return float(np.exp(optimize.brentq(excess, low, high, xtol=1e-6)))


def solve_load_factor(
    found: SectionReliability,
    again: Callable[[float], SectionReliability],
    target_probability: float,
    period: int,
) -> float | None:
    """Solve for the load factor that meets the target, laying new points where it leads far.

    Parameters
    ----------
    found : SectionReliability
        Of the section with today's load.
    again : callable
        Integrates the section with the variable load scaled by a factor, on points of its own.
    target_probability, period
        As for `load_factor`.

    Returns
    -------
    float or None
        As for `load_factor`.
    """
    factor = 1.0
    for _ in range(REFINEMENTS):
        step = load_factor(found, target_probability, period)
        if step is None:
            return None
        factor *= step
        if abs(np.log(step)) < NEARBY:
            break
        found = again(factor)
    return factor
