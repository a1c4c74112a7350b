"""What a run found, put together as the records that the report is made from."""

from collections.abc import Sequence

from assess.case.events import Event, LoadTest
from assess.case.reader import Case
from assess.decisions.economics import option_results
from assess.decisions.results import (
    CodeRecord,
    Conflict,
    DataRecord,
    Provenance,
    RunRecord,
    SectionResult,
    StageRecord,
    Target,
    VariableRecord,
)
from assess.decisions.sections import used_variables
from assess.probability.mixtures import predictive_fractile
from assess.reliability.limit_states import LIMIT_STATES
from assess.reliability.teaching import teachings
from assess.updating.checks import DataSet, surprises
from assess.updating.kinds import KINDS
from assess.updating.model import Spec
from assess.updating.power_scaling import power_scaling
from assess.updating.stages import StageDraws
from assess.updating.variables import Variable


def run_record(
    case: Case,
    spec: Spec,
    stages: Sequence[StageDraws],
    results: Sequence[SectionResult],
    sets: Sequence[DataSet],
    wanted: Target,
    seed: int,
) -> RunRecord:
    """Assemble what was found.

    Parameters
    ----------
    case, spec : Case, Spec
        The case and its measurements.
    stages : sequence of StageDraws
        Prior and posteriors.
    results : sequence of SectionResult
        Of all sections, stages and options.
    sets : sequence of DataSet
        Checked data sets.
    wanted : Target
        What indices are held against.
    seed : int
        Of what is drawn for the ledger.

    Returns
    -------
    RunRecord
        Without doubts and provenance, which the run adds.
    """
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
        data=[_data_record(case, item, stages) for item in sets],
        results=results,
        options=option_results(case, results, names[-1]),
        doubts=(),
        conflicts=[Conflict(*pair) for pair in surprises(sets, names)],
        assumptions=_assumptions(case),
        currency="" if costs is None else costs.currency,
        discount_rate=None if costs is None else costs.discount_rate,
        failure_cost=None if costs is None else costs.failure,
        provenance=Provenance("", "", 0, {}, {}, {}, ""),
        power_scaling=power_scaling(stages[len(case.stages)], spec.prior, used_variables(case)),
        teaching=teachings(case, spec, stages[: len(case.stages) + 1], seed),
        code_strengths=_code_records(spec, stages[-1]),
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
        draws.note,
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
        if not (isinstance(variable, Variable) and variable.latent)
    ]


def _code_records(spec: Spec, draws: StageDraws) -> list[CodeRecord]:
    """Set what codes make of the measurements beside the draws."""
    values = draws.values()
    return [
        CodeRecord(
            item.zone,
            item.quantity,
            item.code,
            item.count,
            item.value,
            item.note,
            item.fractile,
            predictive_fractile(values[item.variable[0]], values[item.variable[1]], item.fractile),
        )
        for key, rows in spec.rows.items()
        for item in KINDS[key].code_strengths(rows)
    ]


def _data_record(case: Case, item: DataSet, stages: Sequence[StageDraws]) -> DataRecord:
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
        path=", ".join(_files(case, item, stage.name)),
        variable=".".join(filter(None, (item.zone, item.kind.carrier))),
        predictive=item.predictive,
        p_values=item.p_values,
    )


def _files(case: Case, item: DataSet, survey: str) -> list[str]:
    """Name the tables that a data set came from."""
    return list(
        dict.fromkeys(
            one.table.path.name
            for one in case.evidence
            if one.kind == item.kind.form.key and one.survey == survey and item.zone in one.zone
        )
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
    for event in case.spec.events:
        said.append(_event_words(event))
    kinds = dict.fromkeys(item.kind for item in case.evidence)
    said += [KINDS[kind].assumption for kind in kinds]
    for entry in case.spec.sections().values():
        said += LIMIT_STATES[entry.limit_state].assumptions(entry, case.spec)
    return list(dict.fromkeys(said))


def _event_words(event: Event) -> str:
    if isinstance(event, LoadTest):
        return (
            f"{event.section} carried a load effect of {event.effect / 1e6:g} kN·m in {event.year} "
            f"(V {event.error:g}; {event.source})."
        )
    lighter = "" if event.load_factor == 1.0 else f" scaled by {event.load_factor:g}"
    return (
        f"{event.section} served from {event.from_year} to {event.to_year} without failure under "
        f"its yearly maxima{lighter} ({event.source})."
    )
