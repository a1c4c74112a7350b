"""What was measured and what it taught: ledger, variables, densities, data against prediction."""

from functools import partial

import numpy as np

from assess.decisions.results import DataRecord, FloatArray, RunRecord, Taught, VariableRecord
from assess.report import derived, figures, findings, numbers, words
from assess.report.document import (
    Block,
    Cell,
    Column,
    FigureNode,
    Form,
    Panel,
    Paragraph,
    Section,
    Table,
    text_cell,
)
from assess.report.parts.answer import draws_warning
from assess.report.style import Look, stage_looks

EMPTY = np.empty(0)


def evidence(record: RunRecord) -> Section:
    """Return the ledger of data sets."""
    if not record.data:
        words_none = "No survey data were given; every result rests on the prior."
        return Section("Evidence", [Paragraph([words_none])])
    blocks: list[Block] = [_ledger(record)]
    if record.code_strengths:
        blocks.append(_codes_table(record))
    return Section("Evidence", blocks)


def _codes_table(record: RunRecord) -> Table:
    columns = [
        Column("Zone"),
        Column("Value by the code"),
        Column("Places", right=True),
        Column("By the code", "MPa", right=True),
        Column("Fractile", right=True),
        Column(f"This assessment, {record.stages[-1].name}", "MPa", right=True),
    ]
    rows = [
        [
            text_cell(item.zone),
            text_cell(f"{item.quantity}, {item.code}"),
            Cell(item.count, Form.INTEGER),
            text_cell(item.note) if item.value is None else Cell(item.value, Form.SIGNIFICANT),
            Cell(item.fractile, Form.PERCENT),
            Cell(item.posterior, Form.SIGNIFICANT),
        ]
        for item in record.code_strengths
    ]
    notes = [
        "What the codes make of the corrected cores of a zone alone, cores of one place counted "
        "once, beside the same fractile of the strength from place to place as this assessment "
        "has it (all uncertainty integrated; the prior and both kinds of error count too). Code "
        "values are for comparison; nothing here is computed from them."
    ]
    return Table("Characteristic strengths by the codes", columns, rows, notes)


def _ledger(record: RunRecord) -> Table:
    columns = [
        Column("Data set"),
        Column("Survey"),
        Column("Zone"),
        Column("Rows", right=True),
        Column("Beyond range", right=True),
        Column("None found", right=True),
        Column("Mean", right=True),
        Column("Smallest to largest", right=True),
        Column("Sections measured", wide=True),
        Column("File", wide=True),
    ]
    notes = [
        "Values are as the likelihood saw them, after correction. \u201cBeyond range\u201d: "
        "censored readings, known only to lie beyond the range of the instrument. "
        "\u201cNone found\u201d: looked at without finding any."
    ]
    return Table("Data sets", columns, [_ledger_row(item) for item in record.data], notes)


def _ledger_row(item: DataRecord) -> list[Cell]:
    values = np.asarray(item.values, dtype=float)
    some = len(values) > 0
    return [
        text_cell(item.title if item.unit == "-" else f"{item.title} [{item.unit}]"),
        text_cell(item.date or item.survey),
        text_cell(item.zone),
        Cell(item.count, Form.INTEGER),
        Cell(item.censored, Form.INTEGER),
        Cell(item.absent, Form.INTEGER),
        Cell(float(values.mean()) if some else None, Form.SIGNIFICANT),
        Cell((float(values.min()), float(values.max())) if some else None, Form.SIGNIFICANT),
        text_cell(", ".join(item.sections) or "none"),
        text_cell(item.path),
    ]


def learning(record: RunRecord) -> Section:
    """Return prior and posterior of every variable, as table and pictures."""
    blocks: list[Block] = draws_warning(record)
    sentence = findings.learned_sentence(record)
    if sentence:
        blocks.append(Paragraph([sentence]))
    if record.teaching:
        blocks.append(_teaching_table(record))
    blocks.append(_variables_table(record))
    blocks.append(_density_figure(record))
    predictive = [item for item in record.data if item.predictive and len(item.values)]
    if predictive:
        blocks.append(_predictive_figure(record, predictive))
    return Section("What the surveys taught", [item for item in blocks if item is not None])


def _teaching_table(record: RunRecord) -> Table:
    first = record.teaching[0]
    columns = [
        Column("Section"),
        *(Column(f"Survey: {item.by}", right=True) for item in first.surveys),
        *(Column(f"All {item.by.lower()}", right=True) for item in first.kinds),
    ]
    rows = [
        [text_cell(item.section), *(_taught_cell(one) for one in (*item.surveys, *item.kinds))]
        for item in record.teaching
    ]
    notes = [
        "Of this year\u2019s load capacity of the section, local values included: share of its "
        "variance that was explained, and information gained in nats (the Kullback-Leibler "
        "divergence of the state after from that before). A survey is held against the state "
        "before it; a kind of evidence against the last state without it, by reweighting its "
        "draws. Negative: what was found made the capacity less certain than had been thought. "
        "\u201cMuch\u201d: so much that reweighting cannot tell."
    ]
    return Table("What was learned about each section", columns, rows, notes)


def _taught_cell(found: Taught) -> Cell:
    if found.variance_explained is None or found.nats is None:
        return text_cell("much")
    return text_cell(
        f"{numbers.percent(found.variance_explained)}; {numbers.fixed(found.nats, 2)} nats"
    )


def _stages_of(record: RunRecord, variable: VariableRecord) -> list[str]:
    return [item.name for item in record.stages if item.name in variable.draws]


def _variables_table(record: RunRecord) -> Table:
    columns = [
        Column("Variable"),
        Column("State"),
        Column("Mean", right=True),
        Column("Standard deviation", right=True),
        Column("V", "%", right=True),
        Column("5\u201395 %", right=True),
        Column("Taught", right=True),
    ]
    rows = []
    for variable in sorted(record.variables, key=lambda item: not item.used):
        rows.extend(_variable_rows(record, variable))
    notes = [
        "V: coefficient of variation, where all draws are positive. Taught: share of the prior "
        "standard deviation that the data removed up to that state; negative where the data "
        "widened it. Variables marked \u2020 enter no limit state.",
    ]
    return Table("Variables before and after the surveys", columns, rows, notes)


def _variable_rows(record: RunRecord, variable: VariableRecord) -> list[list[Cell]]:
    rows = []
    first: derived.Moments | None = None
    for stage in _stages_of(record, variable):
        draws = variable.draws[stage]
        found = derived.moments(draws)
        positive = bool(draws.min() > 0)
        taught = None if first is None else derived.learned(first, found)
        label = variable.label if variable.unit == "-" else f"{variable.label} [{variable.unit}]"
        label = label if variable.used else f"{label} \u2020"
        rows.append(
            [
                text_cell(label),
                text_cell(words.stage_key(record, stage)),
                Cell(found.mean, Form.SIGNIFICANT),
                Cell(found.sd, Form.SIGNIFICANT),
                text_cell(numbers.fixed(100.0 * found.variation, 0) if positive else ""),
                Cell((found.low, found.high), Form.SIGNIFICANT),
                Cell(taught, Form.PERCENT),
            ]
        )
        first = first or found
    return rows


def density_view(
    record: RunRecord, variable: VariableRecord, looks: dict[str, Look]
) -> figures.DensityView:
    """Gather one variable's draws with the data of the same unit that bear on it."""
    stages = _stages_of(record, variable)
    data = [
        np.asarray(item.values, dtype=float)
        for item in record.data
        if item.variable == variable.name and item.unit == variable.unit
    ]
    return figures.DensityView(
        title=variable.label,
        unit=variable.unit,
        draws={stage: np.ravel(variable.draws[stage]) for stage in stages},
        looks={stage: looks[stage] for stage in stages},
        data=np.concatenate(data) if data else EMPTY,
    )


def key(record: RunRecord, *, data: bool = False, marks: bool = False) -> Panel:
    """Return the key of the stages' line styles."""
    names = [item.name for item in record.stages]
    looks = stage_looks(names)
    entries: list[tuple[str, Look | None]] = [
        (words.stage_key(record, name), looks[name]) for name in names
    ]
    if data:
        entries.append(("data", None))
    alt = "Key: " + ", ".join(entry[0] for entry in entries)
    return Panel(partial(figures.key_panel, entries, marks=marks), "Key", alt)


def _density_figure(record: RunRecord) -> FigureNode:
    looks = stage_looks([item.name for item in record.stages])
    panels = []
    for variable in derived.used_variables(record):
        view = density_view(record, variable, looks)
        alt = words.density_alt(record, variable, dict(view.draws))
        panels.append(Panel(partial(figures.density_panel, view), variable.label, alt))
    caption = (
        "Densities of the variables that enter a limit state, before and after each survey. "
        "Upright marks: measured values, where a data set bears on the variable in its unit; a "
        "mean is known better than single values scatter. Axes with unequal steps are logarithmic."
    )
    return FigureNode(panels, caption, figures.SMALL, key(record, data=True))


def _predictive_figure(record: RunRecord, sets: list[DataRecord]) -> FigureNode:
    names = [item.name for item in record.stages]
    looks = stage_looks(names)
    panels = []
    for item in sets:
        draws: dict[str, FloatArray] = {
            stage: np.ravel(item.predictive[stage]) for stage in names if stage in item.predictive
        }
        view = figures.DensityView(
            title=", ".join(filter(None, (item.title, item.zone, item.date or item.survey))),
            unit=item.unit,
            draws=draws,
            looks=looks,
            data=np.asarray(item.values, dtype=float),
        )
        alt = (
            f"{item.title} of {item.date or item.survey}: "
            f"{numbers.count(len(item.values), 'measured value')} over the values predicted "
            f"{', '.join(words.stage_words(record, stage) for stage in draws)}."
        )
        panels.append(Panel(partial(figures.density_panel, view), item.title, alt))
    caption = (
        "Each data set (upright marks) with the distribution of a single new value that each "
        "state of knowledge predicts. Censored readings and places where none was found are not "
        "drawn."
    )
    return FigureNode(panels, caption, figures.SMALL, key(record, data=True))
