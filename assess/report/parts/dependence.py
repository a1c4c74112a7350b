"""Dependence between variables after the surveys, and what ignoring it would do."""

from functools import partial

import numpy as np

from assess.decisions.results import RunRecord, SectionResult
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
from assess.report.parts.evidence import key


def dependence(record: RunRecord) -> Section:
    """Return the most dependent pairs of the last stage with the prior beside."""
    pairs = derived.dependent_pairs(record)
    heading = "Dependence between the variables"
    if not pairs:
        text = (
            "No two variables that enter a limit state have a rank correlation beyond "
            f"{numbers.fixed(derived.MIN_DEPENDENCE, 2)}."
        )
        return Section(heading, [*draws_warning(record), Paragraph([text])])
    top = pairs[0]
    text = (
        f"After the last survey, {top.first.label} and {top.second.label} "
        f"{words.direction(top.after)} (rank correlation {numbers.index(top.after)}). Every index "
        "in this report is calculated from the joint draws of all variables, so the dependence is "
        "in it."
    )
    blocks: list[Block] = [
        *draws_warning(record),
        Paragraph([text]),
        _pairs_table(pairs),
        _pairs_figure(record, pairs),
    ]
    return Section(heading, blocks)


def _pairs_table(pairs: list[derived.Pair]) -> Table:
    columns = [
        Column("First variable"),
        Column("Second variable"),
        Column("Prior", right=True),
        Column("After the last survey", right=True),
    ]
    rows = [
        [
            text_cell(pair.first.label),
            text_cell(pair.second.label),
            Cell(pair.before if np.isfinite(pair.before) else None, Form.INDEX),
            Cell(pair.after, Form.INDEX),
        ]
        for pair in pairs
    ]
    notes = ["Spearman\u2019s rank correlation over the draws; values near zero vary by chance."]
    return Table("Strongest rank correlations", columns, rows, notes)


def _pairs_figure(record: RunRecord, pairs: list[derived.Pair]) -> FigureNode:
    first, last = record.stages[0].name, derived.final_stage(record).name
    panels = []
    for pair in pairs:
        a, b = pair.first, pair.second
        before = None
        if first != last and first in a.draws and first in b.draws:
            before = (np.ravel(a.draws[first]), np.ravel(b.draws[first]))
        old = f" (prior {numbers.index(pair.before)})" if np.isfinite(pair.before) else ""
        view = figures.JointView(
            title=f"rank correlation {numbers.index(pair.after)}{old}",
            x_label=figures.axis_label(a.label, a.unit, 44),
            y_label=figures.axis_label(b.label, b.unit, 34),
            before=before,
            after=(np.ravel(a.draws[last]), np.ravel(b.draws[last])),
        )
        alt = (
            f"{a.label} against {b.label}: they {words.direction(pair.after)}, rank correlation "
            f"{numbers.index(pair.after)}{old}."
        )
        panels.append(Panel(partial(figures.joint_panel, view), f"{a.label} / {b.label}", alt))
    caption = (
        "The most dependent pairs. Dots: draws after the last survey, thinned. Contours: smallest "
        "regions that hold 50 % (heavy) and 90 % (light) of the draws, dashed for the prior."
    )
    return FigureNode(panels, caption, figures.SMALL, _ends_key(record))


def _ends_key(record: RunRecord) -> Panel:
    from dataclasses import replace

    ends = replace(record, stages=[record.stages[0], record.stages[-1]])
    return key(ends if len(record.stages) > 1 else record)


def ignoring(record: RunRecord) -> Section:
    """Return the index with and without dependence, changes of verdict in words."""
    heading = "What ignoring the dependence would do"
    results = [item for item in derived.final_results(record) if item.independent is not None]
    if derived.withheld(record, derived.final_stage(record).name):
        return Section(heading, [Paragraph([words.withheld_words(record)])])
    if not results:
        return Section(heading, [Paragraph(["This comparison was not part of the run."])])
    columns = [
        Column("Section"),
        Column("Index with dependence", right=True),
        Column("Index without", right=True),
        Column("Difference", right=True),
        Column("Verdict with dependence", wide=True),
        Column("Verdict without", wide=True),
        Column("Change"),
    ]
    notes = [
        "Without: the draws of each variable are shuffled on their own, so that every variable "
        "keeps its distribution and loses its relation to the others. Shown for comparison only."
    ]
    table = Table(
        "Index and verdict with and without dependence",
        columns,
        [_row(record, item) for item in results],
        notes,
    )
    return Section(heading, [Paragraph([findings.ignoring_sentence(record)]), table])


def _row(record: RunRecord, result: SectionResult) -> list[Cell]:
    last = derived.last_year(record)
    with_it = float(result.reference.index[0])
    without = with_it if result.independent is None else float(result.independent.index[0])
    other = result.verdict_independent
    changed = findings.verdict_changes(result)
    return [
        text_cell(result.section),
        Cell(with_it, Form.INDEX),
        Cell(without, Form.INDEX),
        Cell(without - with_it, Form.INDEX),
        text_cell(words.verdict_words(result.verdict, last)),
        text_cell("" if other is None else words.verdict_words(other, last), bold=changed),
        text_cell("verdict changes" if changed else "none", bold=changed),
    ]
