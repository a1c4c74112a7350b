"""Sampling the posterior: one compilation for all stages, the gate, one retry."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from assess.updating.model import WHITENED, Spec, build_model

FloatArray = NDArray[np.float64]
Progress = Callable[[float], None]  # share of the draws that is done, 0 to 1

RHAT_LIMIT = 1.01  # Vehtari et al., Bayesian Anal. 16 (2021) 667-718, section 4
ESS_LIMIT = 400.0  # same, bulk and tail
RETRY_ACCEPT = 0.99


@dataclass(frozen=True, slots=True)
class Settings:
    """How to sample."""

    chains: int
    draws: int
    tune: int
    target_accept: float
    seed: int


@dataclass(frozen=True, slots=True, eq=False)
class Chains:
    """What the sampler gave for one stage."""

    whitened: FloatArray  # (chain, draw, variable)
    log_likelihood: FloatArray  # (chain, draw)
    divergences: int


@dataclass(frozen=True, slots=True)
class Diagnostics:
    """What the gate looks at, over the variables that limit states use."""

    rhat_max: float
    ess_bulk_min: float
    ess_tail_min: float
    divergences: int
    worst: str
    failures: tuple[str, ...]

    @property
    def passed(self) -> bool:
        """Whether the draws may be relied on."""
        return not self.failures

    def without_judgement(self) -> "Diagnostics":
        """Keep the figures and drop the verdict: independent draws have nothing to converge."""
        return replace(self, failures=())


class Sampler(Protocol):
    """A compiled model that can be sampled with the data of any stage."""

    name: str

    def sample(self, stage: int, settings: Settings, progress: Progress) -> Chains:
        """Sample the posterior of a stage."""
        ...


def compile_sampler(spec: Spec, stage: int) -> Sampler:
    """Compile the model of a case; uses nutpie where it is installed, else PyMC's own NUTS."""
    model = build_model(spec, stage)
    try:
        import nutpie  # noqa: F401 - only asks whether it is there
    except ModuleNotFoundError:
        return PymcSampler(spec, model)
    return NutpieSampler(spec, model)


class NutpieSampler:
    """NUTS by nutpie, compiled from PyMC's model once; other data need no new compilation.

    Its mass matrix is diagonal plus low rank: the means of several zones lie on one ridge with
    the bias of the meter that read them all, which a diagonal matrix cannot follow.
    """

    def __init__(self, spec: Spec, model: Any) -> None:
        import nutpie
        import pymc

        self.name = f"NUTS, nutpie {nutpie.__version__} on PyMC {pymc.__version__}"
        self._spec = spec
        self._compiled = nutpie.compile_pymc_model(model)

    def sample(self, stage: int, settings: Settings, progress: Progress) -> Chains:
        """Sample the posterior of a stage."""
        return self.sample_data(self._spec.data(stage), settings, progress)

    def sample_data(
        self, data: dict[str, NDArray[Any]], settings: Settings, progress: Progress
    ) -> Chains:
        """Sample the posterior given any data of the same design."""
        import nutpie

        def report(chains: Sequence[Any]) -> None:
            done = sum(chain.finished_draws for chain in chains)
            total = sum(chain.total_draws for chain in chains)
            progress(done / total if total else 0.0)

        # What the graph does not use, compilation dropped.
        used = {variable.name for variable in self._compiled.shared_var_keys}
        trace = nutpie.sample(
            self._compiled.with_data(**{k: v for k, v in data.items() if k in used}),
            draws=settings.draws,
            tune=settings.tune,
            chains=settings.chains,
            seed=settings.seed,
            target_accept=settings.target_accept,
            adaptation="low_rank",
            save_warmup=False,
            progress_bar=False,
            progress_callback=report,
        )
        if trace["posterior"].sizes["draw"] < settings.draws:
            # nutpie takes an interrupt for itself and gives what it has so far.
            raise KeyboardInterrupt
        return _chains(trace, "logp")


class PymcSampler:
    """PyMC's own NUTS, for where nutpie is missing."""

    def __init__(self, spec: Spec, model: Any) -> None:
        import pymc

        self.name = f"NUTS, PyMC {pymc.__version__}"
        self._spec = spec
        self._model = model

    def sample(self, stage: int, settings: Settings, progress: Progress) -> Chains:
        """Sample the posterior of a stage."""
        import pymc as pm

        total = settings.chains * (settings.draws + settings.tune)
        done = 0

        def count(**_: Any) -> None:
            nonlocal done
            done += 1
            if done % 50 == 0:
                progress(done / total)

        with self._model:
            pm.set_data(self._spec.data(stage))
            trace = pm.sample(
                draws=settings.draws,
                tune=settings.tune,
                chains=settings.chains,
                cores=1,  # the callback counts in this process
                random_seed=settings.seed,
                target_accept=settings.target_accept,
                nuts_sampler="pymc",
                progressbar=False,
                compute_convergence_checks=False,
                callback=count,
            )
        return _chains(trace, "lp")


def _chains(trace: Any, log_density: str) -> Chains:
    """Take the draws; the log-likelihood is the model's log-density less that of the prior."""
    whitened = np.asarray(trace["posterior"][WHITENED].to_numpy(), dtype=np.float64)
    statistics = trace["sample_stats"]
    density = np.asarray(statistics[log_density].to_numpy(), dtype=np.float64)
    prior = -0.5 * (whitened**2).sum(axis=-1) - 0.5 * whitened.shape[-1] * np.log(2.0 * np.pi)
    return Chains(whitened, density - prior, int(statistics["diverging"].to_numpy().sum()))


def diagnose(
    physical: FloatArray, names: Sequence[str], used: Sequence[str], divergences: int
) -> Diagnostics:
    """Judge chains by rank-normalised split R-hat, bulk and tail effective sample size.

    Parameters
    ----------
    physical : ndarray, shape (chain, draw, variable)
        Draws of the common variables.
    names, used : sequence of str
        All variables in order, and those that limit states use; only these are judged.
    divergences : int
        Divergent transitions after tuning.

    Returns
    -------
    Diagnostics
        With one sentence for each failure.

    References
    ----------
    .. [1] A. Vehtari et al., Rank-normalization, folding, and localization: an improved R-hat,
       Bayesian Anal. 16 (2021) 667-718, doi:10.1214/20-BA1221.
    """
    from arviz_stats.base import array_stats

    chosen = [i for i, name in enumerate(names) if name in set(used)]
    chosen = [i for i in chosen if np.ptp(physical[..., i]) > 0.0]  # constants always converge
    divergent = [f"{divergences} divergent transitions"] if divergences else []
    if not chosen:
        size = float(physical.shape[0] * physical.shape[1])
        return Diagnostics(1.0, size, size, divergences, "", tuple(divergent))
    draws = physical[..., chosen]
    axes = {"chain_axis": 0, "draw_axis": 1}
    with np.errstate(divide="ignore", invalid="ignore"):  # chains that never moved
        rhat = np.atleast_1d(array_stats.rhat(draws, **axes))
        bulk = np.atleast_1d(array_stats.ess(draws, method="bulk", **axes))
        tail = np.atleast_1d(array_stats.ess(draws, method="tail", prob=(0.05, 0.95), **axes))
    failures = []
    for k, i in enumerate(chosen):
        faults = []
        if not rhat[k] <= RHAT_LIMIT:
            faults.append(f"R-hat {rhat[k]:.3f} above {RHAT_LIMIT}")
        if not bulk[k] >= ESS_LIMIT:
            faults.append(f"bulk ESS {bulk[k]:.0f} below {ESS_LIMIT:.0f}")
        if not tail[k] >= ESS_LIMIT:
            faults.append(f"tail ESS {tail[k]:.0f} below {ESS_LIMIT:.0f}")
        if faults:
            failures.append(f"{names[i]}: {', '.join(faults)}")
    failures += divergent
    return Diagnostics(
        float(rhat.max()),
        float(bulk.min()),
        float(tail.min()),
        divergences,
        names[chosen[int(rhat.argmax())]],
        tuple(failures),
    )
