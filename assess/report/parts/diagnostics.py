"""How far the calculation can be relied on: chains, fit, conflicts."""

from assess.decisions.results import DataRecord, RunRecord
from assess.report import derived, words
from assess.report.document import (
    Block,
    BulletList,
    Cell,
    Column,
    Form,
    Paragraph,
    Section,
    Table,
    strong,
    text_cell,
)


def diagnostics(record: RunRecord) -> Section:
    """Return chains, predictive checks, conflicts and effort."""
    blocks: list[Block] = [
        BulletList([[words.stage_diagnosis(record, stage)] for stage in record.stages])
    ]
    checks = _checks(record)
    if checks is not None:
        blocks.append(checks)
    if record.power_scaling:
        blocks.append(_power_scaling(record))
    if record.conflicts:
        blocks.append(Paragraph(["What must be read about fit and prior:"]))
        blocks.append(
            BulletList([[strong(f"{item.subject}: "), item.words] for item in record.conflicts])
        )
    else:
        blocks.append(Paragraph(["No conflict between prior and data was flagged."]))
    effort = sum(item.evaluations for item in record.results)
    if effort:
        blocks.append(_effort(record))
    return Section("Diagnostics", blocks)


def _power_scaling(record: RunRecord) -> Table:
    labels = {variable.name: variable.label for variable in record.variables}
    rows = [
        [
            text_cell(labels.get(item.variable, item.variable)),
            Cell(item.prior, Form.SHARE),
            Cell(item.data, Form.SHARE),
            text_cell(words.power_scaling_words(item), bold=item.conflict),
        ]
        for item in record.power_scaling
    ]
    columns = [
        Column("Variable"),
        Column("Prior", right=True),
        Column("Data", right=True),
        Column("Reading", wide=True),
    ]
    notes = [
        "Change of what is known after the last survey when the variable's own prior, or all data, "
        "count for a little more or less (power scaling, Kallioinen et al. 2024, "
        "doi:10.1007/s11222-023-10366-5); 0.05 and more is felt. Where both are felt, prior and "
        "data may disagree: check the prior's source. Data so many that a little more or less of "
        "them changes nothing show as not felt."
    ]
    return Table("What prior and data contribute", columns, rows, notes)


def _checks(record: RunRecord) -> Table | None:
    statistics = list(
        dict.fromkeys(
            name for item in record.data for found in item.p_values.values() for name in found
        )
    )
    if not statistics:
        return None
    rows = [
        _check_row(record, item, stage.name, statistics)
        for item in record.data
        for stage in record.stages
        if item.p_values.get(stage.name)
    ]
    columns = [
        Column("Data set"),
        Column("State"),
        *(Column(f"p-value, {name}", right=True) for name in statistics),
        Column("Reading", wide=True),
    ]
    notes = [
        "p-value: share of simulated data sets whose statistic is at least as large as the "
        "measured one. Near 0 or 1 the model does not expect such data: below 0.05 or above 0.95 "
        "doubtful, below 0.01 or above 0.99 a conflict."
    ]
    return Table("Predictive checks", columns, rows, notes)


def _check_row(
    record: RunRecord, item: DataRecord, stage: str, statistics: list[str]
) -> list[Cell]:
    found = item.p_values[stage]
    readings = {name: words.p_value_words(value) for name, value in found.items()}
    remarks = [f"{name}: {words_}" for name, words_ in readings.items() if words_ != words.FINE]
    return [
        text_cell(", ".join(filter(None, (item.title, item.zone, item.date or item.survey)))),
        text_cell(words.stage_key(record, stage)),
        *(Cell(found.get(name), Form.SHARE) for name in statistics),
        text_cell("; ".join(remarks) or words.FINE, bold=words.CONFLICT in readings.values()),
    ]


def _effort(record: RunRecord) -> Table:
    rows = [
        [text_cell(item.section), Cell(item.evaluations, Form.INTEGER)]
        for item in derived.final_results(record)
    ]
    columns = [Column("Section"), Column("Capacity evaluations", right=True)]
    return Table("Effort of the reliability calculation, after the last survey", columns, rows)
