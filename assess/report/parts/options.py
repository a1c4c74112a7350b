"""What may be done: index, years gained and money of each option."""

from functools import partial

from assess.decisions.results import OptionResult, RunRecord, SectionResult, Standing
from assess.report import derived, findings, index_figures, numbers, words
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
from assess.report.index_figures import Series
from assess.report.parts.answer import crossing_text
from assess.report.parts.reliability import limits, options_view, years_alt
from assess.report.style import OPTION_LOOKS

HEADING = "Options"


def options(record: RunRecord) -> Section:
    """Return costs and effects of the options, and curves where they matter."""
    if derived.withheld(record, derived.final_stage(record).name):
        return Section(HEADING, [Paragraph([words.withheld_words(record)])])
    names = derived.option_names(record)
    if len(names) < 2:
        return Section(HEADING, [Paragraph(["No option besides leaving as is was examined."])])
    blocks: list[Block] = []
    sentence = findings.options_sentence(record)
    if sentence:
        blocks.append(Paragraph([sentence]))
    if record.options:
        blocks.append(_money_table(record))
    blocks.append(_effect_table(record, names))
    figure = _figure(record, names)
    if figure is not None:
        blocks.append(figure)
    return Section(HEADING, blocks)


def _gained(option: OptionResult) -> str:
    if option.option == derived.LEAVE:
        return ""
    parts = []
    for section, gain in option.years_gained.items():
        if gain is None:
            parts.append(f"{section}: beyond the horizon")
        elif gain != 0:
            sign = "+" if gain > 0 else numbers.MINUS
            parts.append(f"{section}: {sign}{abs(gain)}")
    return "; ".join(parts) or "none"


def _money_table(record: RunRecord) -> Table:
    unit = record.currency
    columns = [
        Column("Option"),
        Column("What is done", wide=True),
        Column("Cost", unit, right=True),
        Column("Expected failure cost", unit, right=True),
        Column("Sum", unit, right=True),
        Column("Sections below target at the end", right=True),
        Column("Years gained", wide=True),
    ]
    rows = []
    for item in record.options:
        both = item.cost is not None and item.expected_failure_cost is not None
        rows.append(
            [
                text_cell(words.option_words(item.option)),
                text_cell(item.description),
                Cell(item.cost, Form.MONEY),
                Cell(item.expected_failure_cost, Form.ESTIMATE),
                Cell(
                    (item.cost or 0.0) + (item.expected_failure_cost or 0.0) if both else None,
                    Form.ESTIMATE,
                ),
                Cell(item.sections_below, Form.INTEGER),
                text_cell(_gained(item)),
            ]
        )
    notes = [
        "Present values. Expected failure cost: cost of a failure times its probability over the "
        "horizon, discounted and summed over the sections. Years gained: how much later the index "
        f"falls below the target than with \u201c{words.LEAVE_WORDS}\u201d. The cheapest sum is no "
        "verdict: the target has to be met as well."
    ]
    return Table("Cost and effect of the options", columns, rows, notes)


def _of_option(record: RunRecord, name: str) -> list[SectionResult]:
    return derived.final_results(record, name)


def _effect_table(record: RunRecord, names: list[str]) -> Table:
    columns = [
        Column("Section"),
        Column("Option"),
        Column("Index now", right=True),
        Column("Index in the last period", right=True),
        Column("Falls below in (5\u201395 %)"),
        Column("Verdict", wide=True),
    ]
    stage = derived.final_stage(record).name
    rows = []
    for section in derived.sections(record):
        for name in names:
            item = derived.find(record, section, stage, name)
            if item is None:
                continue
            rows.append(
                [
                    text_cell(section),
                    text_cell(words.option_words(name)),
                    Cell(float(item.reference.index[0]), Form.INDEX),
                    Cell(float(item.reference.index[-1]), Form.INDEX),
                    text_cell(crossing_text(record, item)),
                    text_cell(
                        words.result_verdict(record, item),
                        bold=derived.is_below(item.verdict.standing),
                    ),
                ]
            )
    return Table("Index of each section under each option", columns, rows)


def mattering_sections(record: RunRecord) -> list[str]:
    """Sections that do not meet the target through the horizon if left as they are."""
    return [
        item.section
        for item in _of_option(record, derived.LEAVE)
        if item.verdict.standing is not Standing.MEETS
    ]


def _figure(record: RunRecord, names: list[str]) -> FigureNode | None:
    stage = derived.final_stage(record).name
    found: list[tuple[str, list[SectionResult]]] = []
    for section in mattering_sections(record):
        candidates = (derived.find(record, section, stage, name) for name in names)
        kept = [item for item in candidates if item is not None]
        if len(kept) > 1:
            found.append((section, kept))
    if not found:
        return None
    curves = [item.reference for _, results in found for item in results]
    top = limits(curves, record.target.index, bands=False)
    panels = []
    for section, results in found:
        series = [
            Series(
                words.option_words(item.option),
                item.reference,
                OPTION_LOOKS[names.index(item.option) % len(OPTION_LOOKS)],
            )
            for item in results
        ]
        view = options_view(record, section, series, top)
        panels.append(
            Panel(partial(index_figures.over_years, view), section, years_alt(record, view))
        )
    caption = (
        "Index under each option, for the sections that do not meet the target through the "
        "horizon if left as they are. The same draws underlie all options."
    )
    return FigureNode(panels, caption, index_figures.MEDIUM)
