"""Case to draws to reliability to decisions to report: what runs, in which order."""

import time
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

from assess import store
from assess.case.reader import Case, CaseReading, read_case
from assess.case.spec import NamedTarget
from assess.crew import Crew
from assess.decisions.results import (
    Provenance,
    RunRecord,
    SectionResult,
    Target,
)
from assess.decisions.sections import (
    Question,
    Task,
    pasts_of,
    stage_results,
    used_variables,
)
from assess.decisions.targets import target, user_target
from assess.errors import CaseError, NotConvergedError
from assess.input_checks import further_faults
from assess.recording import run_record
from assess.reliability.section import Precision
from assess.updating.checks import data_sets
from assess.updating.model import Spec, specify
from assess.updating.sampling import Settings
from assess.updating.stages import (
    EVENTS,
    StageDraws,
    posterior_draws,
    prior_draws,
    reweighted,
    stage_list,
)
from assess.vocabulary import vocabulary

Observer = Callable[[str, float], None]  # what is being done, share done (0 to 1)
PACKAGES = ("assess", "numpy", "scipy", "pandas", "pymc", "pytensor", "nutpie", "arviz-stats")


@dataclass(frozen=True, slots=True)
class RunOptions:
    """How to run a case."""

    out: Path
    seed: int | None = None  # in place of the case's own
    accept_unconverged: bool = False
    command: str = ""


@dataclass(slots=True)
class _Clock:
    """Seconds spent in each part of a run."""

    seconds: dict[str, float] = field(default_factory=dict)

    @contextmanager
    def measure(self, part: str) -> Iterator[None]:
        begun = time.perf_counter()
        try:
            yield
        finally:
            self.seconds[part] = self.seconds.get(part, 0.0) + time.perf_counter() - begun


def check_case(path: Path) -> CaseReading:
    """Read and check a case with its tables, without sampling.

    Parameters
    ----------
    path : Path
        The case file.

    Returns
    -------
    CaseReading
        The case where there is no fault; every fault; every doubt.
    """
    reading = read_case(path, vocabulary())
    faults = [] if reading.readable is None else further_faults(reading.readable)
    if not faults:
        return reading
    everything = tuple(sorted({*reading.faults, *faults}))
    return CaseReading(None, everything, reading.doubts, reading.readable)


def case_target(case: Case) -> Target:
    """Look the case's target up.

    Raises
    ------
    ValueError
        If its set has no such class or period.
    """
    stated = case.spec.decision.target
    if isinstance(stated, NamedTarget):
        return target(stated.set, stated.class_, int(stated.period))
    return user_target(stated.index, int(stated.period), stated.source)


def run_case(path: Path, options: RunOptions, observe: Observer) -> RunRecord:
    """Run a case from its files to its report.

    Parameters
    ----------
    path : Path
        The case file.
    options : RunOptions
        Where to write, which seed.
    observe : callable
        Told which part runs and how far it is.

    Returns
    -------
    RunRecord
        What was written.

    Raises
    ------
    CaseError
        If the input is faulty.
    NotConvergedError
        If the chains of a stage are not to be relied on and that was not accepted.
    """
    started = datetime.now(UTC).isoformat(timespec="seconds")
    clock = _Clock()
    with clock.measure("reading"):
        observe("reading the case", 0.0)
        reading = check_case(path)
        if reading.case is None:
            raise CaseError(list(reading.faults))
        case, spec = reading.case, specify(reading.case)
    settings = _settings(case, options.seed)
    key = store.sampling_key(spec, stage_list(case), settings)
    question = Question(
        case_target(case),
        Precision(settings.chains, case.spec.sampling.integration_error, settings.seed),
        settings.seed,
    )
    stages, results, sampler = _sample_and_integrate(
        case, spec, settings, key, question, options, observe, clock
    )
    with clock.measure("checks of fit"):
        observe("checking the fit", 0.0)
        sets = data_sets(case, spec, stages, settings.seed)
    record = replace(
        run_record(case, spec, stages, results, sets, question.target, settings.seed),
        doubts=[str(doubt) for doubt in reading.doubts],
        accepted_unconverged=options.accept_unconverged
        and not all(draws.diagnostics.passed for draws in stages),
    )
    provenance = Provenance(
        options.command,
        started,
        settings.seed,
        case.inputs,
        _versions(),
        clock.seconds,
        sampler,
    )
    return _write(record, provenance, stages, spec, key, options.out, observe, clock)


def _settings(case: Case, seed: int | None) -> Settings:
    said = case.spec.sampling
    return Settings(
        said.chains,
        said.draws,
        said.tune,
        said.target_accept,
        said.seed if seed is None else seed,
    )


def _sample_and_integrate(
    case: Case,
    spec: Spec,
    settings: Settings,
    key: str,
    question: Question,
    options: RunOptions,
    observe: Observer,
    clock: _Clock,
) -> tuple[list[StageDraws], list[SectionResult], str]:
    """Go through the stages; sections of a stage are integrated while the next is sampled."""
    used = used_variables(case)
    last = len(case.stages)
    stages: list[StageDraws] = []
    tasks: list[Task[list[SectionResult]]] = []
    with Crew(case, spec) as crew:

        def take(draws: StageDraws) -> None:
            stages.append(draws)
            final = draws.number == last and not case.spec.events
            tasks.extend(stage_results(case, draws, question, crew, final=final))

        with clock.measure("sampling"):
            kept = store.read_draws(options.out / store.DRAWS, key, used)
            if kept is not None:
                observe("reading back the draws of the earlier run", 0.0)
                _require_converged(kept[0], accept=options.accept_unconverged)
                for draws in kept[0]:
                    if draws.number <= last:  # events are looked at anew
                        take(draws)
                sampler = kept[1]
            else:
                take(prior_draws(spec, settings, used))
                sampler = "none: no survey"
                for draws in posterior_draws(
                    case,
                    spec,
                    settings,
                    used,
                    observe,
                    accept_unconverged=options.accept_unconverged,
                ):
                    take(draws)
                if last:
                    sampler = _sampler_name()
        with clock.measure("reliability"):
            if case.spec.events:
                observe("weighing what has happened", 0.0)
                pasts, weight = pasts_of(case, stages[-1], question, crew)
                stages.append(reweighted(stages[-1], weight, EVENTS, settings.seed))
                named = replace(stages[last], name=EVENTS)
                tasks.extend(stage_results(case, named, question, crew, final=True, pasts=pasts))
            # The others begin with the first: this process helps from the last.
            for done, task in enumerate(reversed(tasks)):
                observe("integrating the sections", done / len(tasks))
                task.begin_here()
            results = [result for task in tasks for result in task.result()]
    return stages, results, sampler


def _require_converged(stages: Sequence[StageDraws], *, accept: bool) -> None:
    for draws in stages:
        if not draws.diagnostics.passed and not accept:
            raise NotConvergedError(draws.name, list(draws.diagnostics.failures))


def _sampler_name() -> str:
    found = _versions()
    inner = f"nutpie {found['nutpie']} on " if "nutpie" in found else ""
    return f"NUTS, {inner}PyMC {found['pymc']}"


def _versions() -> dict[str, str]:
    """Give the versions of Python and of the packages that the numbers depend on."""
    import platform

    found = {"python": platform.python_version()}
    for package in PACKAGES:
        try:
            found[package] = version(package)
        except PackageNotFoundError:
            continue
    return found


def _write(
    record: RunRecord,
    provenance: Provenance,
    stages: Sequence[StageDraws],
    spec: Spec,
    key: str,
    out: Path,
    observe: Observer,
    clock: _Clock,
) -> RunRecord:
    """Write all files of a run into its folder, whole."""
    from assess.report.summary import write_summary
    from assess.report.writer import write_report

    with store.whole_folder(out) as folder:
        with clock.measure("writing data"):
            observe("writing the draws", 0.0)
            store.write_draws(stages, spec, key, provenance.sampler, folder / store.DRAWS)
            store.write_reliability(record, folder / store.RELIABILITY)
            write_summary(record, folder / store.SUMMARY)
        finished = replace(record, provenance=replace(provenance, timings=_rounded(clock)))
        with clock.measure("report"):
            observe("writing the report", 0.5)
            write_report(finished, folder / store.REPORT)
        finished = replace(record, provenance=replace(provenance, timings=_rounded(clock)))
        store.write_run(finished, folder / store.RUN)
    observe("done", 1.0)
    return finished


def _rounded(clock: _Clock) -> Mapping[str, float]:
    return {part: round(seconds, 2) for part, seconds in clock.seconds.items()}
