"""Case to draws to reliability to decisions to report: what runs, in which order."""

import os
import time
from collections.abc import Callable, Iterator, Mapping, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass, field
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

from assess import store
from assess.case.reader import Case, CaseReading, read_case
from assess.case.spec import NamedTarget
from assess.decisions.economics import option_results
from assess.decisions.results import (
    Conflict,
    DataRecord,
    Provenance,
    RunRecord,
    SectionResult,
    StageRecord,
    Target,
    VariableRecord,
)
from assess.decisions.sections import Question, gather, stage_results, used_variables
from assess.decisions.targets import target, user_target
from assess.errors import CaseError, Fault, NotConvergedError
from assess.reliability.limit_states import LIMIT_STATES
from assess.reliability.section import Precision
from assess.updating.checks import DataSet, data_sets, surprises
from assess.updating.kinds import KINDS
from assess.updating.model import Spec, specify
from assess.updating.prior import joint_prior
from assess.updating.sampling import Settings
from assess.updating.stages import StageDraws, posterior_draws, prior_draws, stage_list
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
    if reading.case is None:
        return reading
    faults = [fault for kind in KINDS.values() for fault in kind.faults(reading.case)]
    faults += _decision_faults(reading.case)
    try:
        joint_prior(reading.case)
    except ValueError as error:  # a Pearson coefficient that the true marginals do not allow
        faults.append(Fault(str(path), 0, f"dependence: {error}"))
    if faults:
        return CaseReading(None, tuple(sorted(faults)), reading.doubts)
    return reading


def _decision_faults(case: Case) -> list[Fault]:
    """Find what the decision asks for and the case cannot give."""
    faults = []
    stated = case.spec.decision.target
    horizon = case.spec.structure.horizon
    if stated.period > horizon or stated.period != int(stated.period):
        faults.append(
            Fault(
                str(case.path),
                0,
                "decision.target: the reference period must be whole years within the horizon",
                f"{stated.period:g}",
                f"1 to {horizon}",
                "take a target of another period or a longer horizon",
            )
        )
    else:
        try:
            case_target(case)
        except (KeyError, ValueError) as error:
            text = str(error.args[0]) if error.args else str(error)
            faults.append(Fault(str(case.path), 0, f"decision.target: {text}"))
    members = {member.name for member in case.spec.members}
    for option in case.spec.decision.options:
        faults += [
            Fault(
                str(case.path),
                0,
                f"decision.options: option {option.name!r} names a member that does not exist",
                name,
                ", ".join(sorted(members)),
            )
            for name in option.members
            if name not in members
        ]
    return faults


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
    question = Question(
        case_target(case),
        Precision(settings.chains, case.spec.sampling.integration_error, settings.seed),
        settings.seed,
    )
    stages, results, sampler = _sample_and_integrate(
        case, spec, settings, question, options, observe, clock
    )
    with clock.measure("checks of fit"):
        observe("checking the fit", 0.0)
        sets = data_sets(case, spec, stages, settings.seed)
    record = _record(case, spec, stages, results, sets, question.target, reading, options)
    provenance = Provenance(
        options.command,
        started,
        settings.seed,
        case.inputs,
        _versions(),
        clock.seconds,
        sampler,
    )
    return _write(record, provenance, stages, spec, settings, case, options.out, observe, clock)


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
    question: Question,
    options: RunOptions,
    observe: Observer,
    clock: _Clock,
) -> tuple[list[StageDraws], list[SectionResult], str]:
    """Go through the stages; sections of a stage are integrated while the next is sampled."""
    used = used_variables(case)
    key = store.sampling_key(spec, stage_list(case), settings)
    last = len(case.stages)
    stages: list[StageDraws] = []
    futures: list[Future[list[SectionResult]]] = []
    with ThreadPoolExecutor(max_workers=min(4, os.cpu_count() or 1)) as executor:

        def take(draws: StageDraws) -> None:
            stages.append(draws)
            futures.extend(
                stage_results(case, spec, draws, question, executor, final=draws.number == last)
            )

        with clock.measure("sampling"):
            kept = store.read_draws(options.out / store.DRAWS, key, used)
            if kept is not None:
                observe("reading back the draws of the earlier run", 0.0)
                _require_converged(kept[0], accept=options.accept_unconverged)
                for draws in kept[0]:
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
            results = []
            for done, future in enumerate(futures):
                observe("integrating the sections", done / len(futures))
                results += list(gather([future]))
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


def _record(
    case: Case,
    spec: Spec,
    stages: Sequence[StageDraws],
    results: Sequence[SectionResult],
    sets: Sequence[DataSet],
    wanted: Target,
    reading: CaseReading,
    options: RunOptions,
) -> RunRecord:
    """Assemble what was found; provenance comes when everything is written."""
    structure = case.spec.structure
    costs = case.spec.decision.costs
    names = [draws.name for draws in stages]
    return RunRecord(
        title=structure.name,
        description=" ".join(filter(None, (structure.description, structure.note))),
        built=structure.built.year,
        assessed=structure.assessed,
        horizon=structure.horizon,
        invented=structure.invented,
        target=wanted,
        stages=[_stage_record(draws) for draws in stages],
        variables=_variable_records(case, spec, stages),
        data=[_data_record(item, stages) for item in sets],
        results=results,
        options=option_results(case, results, names[-1]),
        doubts=[str(doubt) for doubt in reading.doubts],
        conflicts=[Conflict(*pair) for pair in surprises(sets, names)],
        assumptions=_assumptions(case),
        currency="" if costs is None else costs.currency,
        discount_rate=None if costs is None else costs.discount_rate,
        failure_cost=None if costs is None else costs.failure,
        provenance=Provenance("", "", 0, {}, {}, {}, ""),
        accepted_unconverged=options.accept_unconverged
        and not all(draws.diagnostics.passed for draws in stages),
    )


def _stage_record(draws: StageDraws) -> StageRecord:
    found = draws.diagnostics
    return StageRecord(
        draws.name,
        draws.date,
        draws.chains,
        draws.physical.shape[1],
        found.rhat_max,
        found.ess_bulk_min,
        found.ess_tail_min,
        draws.divergences,
        found.worst,
        draws.retried,
        found.passed,
        found.failures,
    )


def _variable_records(case: Case, spec: Spec, stages: Sequence[StageDraws]) -> list[VariableRecord]:
    used = set(used_variables(case))
    return [
        VariableRecord(
            name=variable.name,
            label=f"{variable.label}, {variable.zone}" if variable.zone else variable.label,
            symbol=variable.symbol,
            unit=variable.unit,
            zone=variable.zone,
            source=variable.source,
            used=variable.name in used,
            draws={draws.name: draws.physical[..., i] for draws in stages},
        )
        for i, variable in enumerate(spec.prior.variables)
    ]


def _data_record(item: DataSet, stages: Sequence[StageDraws]) -> DataRecord:
    stage = stages[item.stage]
    absent = any(column.absent for column in item.kind.form.columns)
    return DataRecord(
        survey=stage.name,
        date=stage.date,
        kind=item.kind.form.key,
        title=item.kind.form.title,
        zone=item.zone,
        unit=item.kind.unit,
        log_scale=item.kind.log_scale,
        values=item.values,
        count=item.count,
        censored=0 if absent else item.missing,
        absent=item.missing if absent else 0,
        sections=item.sections,
        path="",
        variable=f"{item.zone}.{item.kind.carrier}",
        predictive=item.predictive,
        p_values=item.p_values,
    )


def _assumptions(case: Case) -> list[str]:
    """Collect what was assumed, each sentence once."""
    said = [
        "All variables that a zone shares are updated jointly and their draws stay joint; local "
        "values differ from place to place within the zone.",
    ]
    if case.spec.dependence:
        pairs = "; ".join(
            f"{item.between[0]} with {item.between[1]}: {item.measure} {item.coefficient:g} "
            f"({item.source})"
            for item in case.spec.dependence
        )
        said.append(f"Dependence stated before the surveys: {pairs}.")
    else:
        said.append("No dependence between common variables was stated before the surveys.")
    kinds = dict.fromkeys(item.kind for item in case.evidence)
    said += [KINDS[kind].assumption for kind in kinds]
    for entry in case.spec.sections().values():
        said += LIMIT_STATES[entry.limit_state].assumptions(entry, case.spec)
    return list(dict.fromkeys(said))


def _write(
    record: RunRecord,
    provenance: Provenance,
    stages: Sequence[StageDraws],
    spec: Spec,
    settings: Settings,
    case: Case,
    out: Path,
    observe: Observer,
    clock: _Clock,
) -> RunRecord:
    """Write all files of a run into its folder, whole."""
    from dataclasses import replace

    from assess.report.summary import write_summary
    from assess.report.writer import write_report

    key = store.sampling_key(spec, stage_list(case), settings)
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
