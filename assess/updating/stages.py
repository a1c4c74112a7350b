"""States of knowledge: prior, then after each survey, all from one compiled model."""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from assess.case.reader import Case
from assess.errors import NotConvergedError
from assess.updating.model import Spec
from assess.updating.sampling import (
    RETRY_ACCEPT,
    Diagnostics,
    Sampler,
    Settings,
    compile_sampler,
    diagnose,
)

FloatArray = NDArray[np.float64]
PRIOR = "prior"
EVENTS = "after events"  # load tests survived, years served
StageProgress = Callable[[str, float], None]  # what is being done, share done


@dataclass(frozen=True, slots=True, eq=False)
class StageDraws:
    """Joint draws of all common variables in one state of knowledge."""

    name: str
    date: str  # ISO; "" for the prior
    number: int  # surveys that count
    names: tuple[str, ...]  # of the variables
    whitened: FloatArray  # (chain, draw, variable)
    physical: FloatArray  # (chain, draw, variable)
    log_likelihood: FloatArray  # (chain, draw); 0 for the prior
    divergences: int
    retried: bool
    diagnostics: Diagnostics
    note: str = ""  # how the draws came about, where it was not by a chain of their own

    @property
    def chains(self) -> int:
        """Number of chains."""
        return int(self.physical.shape[0])

    def values(self) -> dict[str, FloatArray]:
        """Draws by variable name, chains one after the other, each (chain * draw,)."""
        flat = self.physical.reshape(-1, self.physical.shape[-1])
        return {name: flat[:, i] for i, name in enumerate(self.names)}


def stage_list(case: Case) -> list[tuple[str, str]]:
    """Names and ISO dates of all stages, the prior first."""
    return [(PRIOR, ""), *((name, date.isoformat()) for name, date in case.stages)]


def prior_draws(spec: Spec, settings: Settings, used: Sequence[str]) -> StageDraws:
    """Draw the prior directly: independent draws, no Markov chain.

    Parameters
    ----------
    spec : Spec
        Prior and measurements.
    settings : Settings
        Chains and draws (the chains are only a shape here) and the seed.
    used : sequence of str
        Variables that limit states use.

    Returns
    -------
    StageDraws
        Of the stage ``prior``.
    """
    rng = np.random.default_rng([settings.seed, 0])
    shape = (settings.chains, settings.draws, len(spec.prior.names))
    whitened = rng.standard_normal(shape)
    physical = spec.prior.physical(whitened)
    diagnostics = diagnose(physical, spec.prior.names, used, 0)
    return StageDraws(
        PRIOR,
        "",
        0,
        spec.prior.names,
        whitened,
        physical,
        np.zeros(shape[:2]),
        0,
        False,
        diagnostics.without_judgement(),
    )


def posterior_draws(
    case: Case,
    spec: Spec,
    settings: Settings,
    used: Sequence[str],
    progress: StageProgress,
    *,
    accept_unconverged: bool = False,
) -> Iterator[StageDraws]:
    """Sample the stages after each survey, one after the other.

    Parameters
    ----------
    case, spec : Case, Spec
        The case and what `specify` made of it.
    settings : Settings
        How to sample.
    used : sequence of str
        Variables that limit states use; the gate judges them.
    progress : callable
        Told what is being done and the share done.
    accept_unconverged : bool, default False
        Go on with chains that failed the gate.

    Yields
    ------
    StageDraws
        In order of date.

    Raises
    ------
    NotConvergedError
        If a stage fails the gate twice and that is not accepted.
    """
    stages = stage_list(case)[1:]
    if not stages:
        return
    progress("compiling the model", 0.0)
    sampler = compile_sampler(spec, len(stages))
    for number, (name, date) in enumerate(stages, start=1):
        seeded = replace(settings, seed=_stage_seed(settings.seed, number))
        draws = _sample_once(spec, sampler, number, seeded, used, name, date, progress)
        if not draws.diagnostics.passed:
            harder = replace(
                seeded,
                target_accept=max(RETRY_ACCEPT, settings.target_accept),
                tune=2 * settings.tune,
                draws=settings.draws,
                seed=_stage_seed(settings.seed, number + 1000),
            )
            draws = replace(
                _sample_once(spec, sampler, number, harder, used, name, date, progress),
                retried=True,
            )
        if not draws.diagnostics.passed and not accept_unconverged:
            raise NotConvergedError(name, list(draws.diagnostics.failures))
        yield draws


def reweighted(draws: StageDraws, weight: FloatArray, name: str, seed: int) -> StageDraws:
    r"""Take draws by their weights: the state of knowledge after what the weights stand for.

    Parameters
    ----------
    draws : StageDraws
        Of the state before.
    weight : ndarray, shape (chain * draw,)
        Non-negative.
    name : str
        Of the new state.
    seed : int
        Of the resampling.

    Returns
    -------
    StageDraws
        As many draws, some of them several times.

    Notes
    -----
    Systematic resampling keeps the number of copies of a draw within one of its expectation;
    the effective number of draws is :math:`(\sum w)^2 / \sum w^2` [1]_.

    References
    ----------
    .. [1] J. S. Liu, Monte Carlo Strategies in Scientific Computing, Springer 2001, section 2.5.
    """
    count = len(weight)
    edges = np.cumsum(weight / weight.sum())
    start = np.random.default_rng([seed, draws.number, 5]).uniform()
    chosen = np.minimum(np.searchsorted(edges, (start + np.arange(count)) / count), count - 1)
    shape = draws.physical.shape

    def take(values: FloatArray) -> FloatArray:
        return values.reshape(count, -1)[chosen].reshape(values.shape)

    effective = weight.sum() ** 2 / (weight**2).sum()
    return replace(
        draws,
        name=name,
        number=draws.number + 1,
        whitened=take(draws.whitened),
        physical=take(draws.physical).reshape(shape),
        log_likelihood=take(draws.log_likelihood),
        note=f"the draws before, weighted by what has happened; {effective:.0f} of {count} count",
    )


def _sample_once(
    spec: Spec,
    sampler: Sampler,
    number: int,
    settings: Settings,
    used: Sequence[str],
    name: str,
    date: str,
    progress: StageProgress,
) -> StageDraws:
    """Sample one stage and judge it."""
    what = f"sampling {name}"
    progress(what, 0.0)
    chains = sampler.sample(number, settings, lambda share: progress(what, share))
    progress(what, 1.0)
    physical = spec.prior.physical(chains.whitened)
    return StageDraws(
        name,
        date,
        number,
        spec.prior.names,
        chains.whitened,
        physical,
        chains.log_likelihood,
        chains.divergences,
        False,
        diagnose(physical, spec.prior.names, used, chains.divergences),
    )


def _stage_seed(seed: int, number: int) -> int:
    """Derive a stage's seed; neighbouring case seeds give unrelated streams."""
    state: int = np.random.SeedSequence([seed, number]).generate_state(1).item()
    return state
