"""Index of every section before and after the surveys, over the years, and what governs it."""

import math
from collections.abc import Iterable, Sequence
from functools import partial

from assess.decisions.results import IndexCurve, RunRecord, SectionResult
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
from assess.report.index_figures import Bar, BarGroup, Series, YearsView
from assess.report.parts.answer import crossing_text
from assess.report.parts.evidence import key
from assess.report.style import stage_looks

TOP_INFLUENCES = 4


def before_after(record: RunRecord) -> Section:
    """Return every section's index in each state against the target, and what governs it."""
    blocks: list[Block] = []
    change = findings.change_sentence(record)
    if change:
        blocks.append(Paragraph([change]))
    groups = bar_groups(record)
    if groups:
        blocks.append(_bars_figure(record, groups))
    blocks.append(_index_table(record))
    influences = _influence_table(record)
    if influences is not None:
        blocks.append(influences)
    return Section("Index before and after the surveys", blocks)


def bar_groups(record: RunRecord) -> list[BarGroup]:
    """Gather the present indices that may be shown, section by section."""
    looks = stage_looks([item.name for item in record.stages])
    groups = []
    for section in derived.sections(record):
        bars = []
        for stage in derived.shown_stages(record):
            result = derived.find(record, section, stage)
            if result is None:
                continue
            value, error, low, high = derived.now(result.reference)
            if math.isfinite(value):
                bars.append(Bar(value, error, low, high, looks[stage]))
        if bars:
            groups.append(BarGroup(section, bars))
    return groups


def _bars_figure(record: RunRecord, groups: list[BarGroup]) -> FigureNode:
    short = words.target_short(record.target)
    alt = f"Index of each section, {short}. " + " ".join(
        f"{group.section}: {', then '.join(numbers.index(bar.index) for bar in group.bars)}."
        for group in groups
    )
    title = "Index before and after"
    panel = Panel(
        partial(index_figures.before_after, groups, record.target.index, short), title, alt
    )
    caption = (
        f"Index of each section at {record.assessed}, from top to bottom in the order of the key. "
        "Marker: index with all uncertainty. Pale bar: 5\u201395 % band of the index conditional "
        "on the common variables. Whisker: two standard errors of the calculation, hidden by "
        "the marker where they are smaller. Number: index "
        "after the last survey."
    )
    return FigureNode([panel], caption, index_figures.LONE, key(record, marks=True))


def _index_table(record: RunRecord) -> Table:
    columns = [
        Column("Section"),
        Column("State"),
        Column("Index", right=True),
        Column("5\u201395 % band", right=True),
        Column("Integration error", right=True),
        Column("Markov chain error", right=True),
        Column("Failure probability", right=True),
        Column(f"Draws below in {derived.last_year(record)}", right=True),
        Column("Verdict", wide=True),
    ]
    rows = []
    for section in derived.sections(record):
        for stage in record.stages:
            result = derived.find(record, section, stage.name)
            if result is not None:
                rows.append(_index_row(record, result))
    note = (
        f"Draws below in {derived.last_year(record)}: share of the draws of the common variables "
        "whose conditional index is then below the target. Both errors are standard errors."
    )
    return Table(f"Index at {record.assessed} in every state", columns, rows, [note])


def _index_row(record: RunRecord, result: SectionResult) -> list[Cell]:
    names = [text_cell(result.section), text_cell(words.stage_key(record, result.stage))]
    if derived.withheld(record, result.stage):
        return [*names, *[text_cell(words.WITHHELD)] * 7]
    curve = result.reference
    return [
        *names,
        Cell(float(curve.index[0]), Form.INDEX),
        Cell((float(curve.low[0]), float(curve.high[0])), Form.INDEX),
        Cell(float(curve.integration_error[0]), Form.ERROR),
        Cell(float(curve.mcmc_error[0]), Form.ERROR),
        Cell(float(curve.failure_probability[0]), Form.PROBABILITY),
        Cell(result.verdict.probability_below, Form.PERCENT),
        text_cell(words.result_verdict(record, result)),
    ]


def _influence_table(record: RunRecord) -> Table | None:
    if derived.withheld(record, derived.final_stage(record).name):
        return None
    rows = []
    for result in derived.final_results(record):
        ordered = sorted(result.sensitivities.items(), key=lambda pair: (-(pair[1] ** 2), pair[0]))
        if ordered:
            named = [f"{name} ({numbers.percent(a * a)})" for name, a in ordered[:TOP_INFLUENCES]]
            rest = sum(a * a for _, a in ordered[TOP_INFLUENCES:])
            tail = numbers.percent(rest) if len(ordered) > TOP_INFLUENCES else ""
            rows.append([text_cell(result.section), text_cell(", ".join(named)), text_cell(tail)])
    if not rows:
        return None
    columns = [Column("Section"), Column("Influence on failure", wide=True), Column("All others")]
    notes = ["Squared sensitivity factors after the last survey; they add up to 100 %."]
    return Table("What governs failure", columns, rows, notes)


def over_years(record: RunRecord) -> Section:
    """Return every section's index year by year."""
    views = years_views(record)
    heading = "Index over the years"
    if not views:
        return Section(heading, [Paragraph([words.withheld_words(record)])])
    panels = [
        Panel(partial(index_figures.over_years, view), view.title, years_alt(record, view))
        for view in views
    ]
    caption = (
        "Above: index year by year with the 5\u201395 % band after the last survey; triangle and "
        "heavy bar on the target line: year in which the index falls below it, and its 5\u201395 % "
        f"interval. Below: index cumulated from {record.assessed} to the year, to which the target "
        "does not apply. All sections share the scales."
    )
    sentence = findings.crossing_sentence(record)
    blocks: list[Block] = [Paragraph([sentence])] if sentence else []
    figure = FigureNode(panels, caption, index_figures.MEDIUM)
    return Section(heading, [*blocks, figure, _horizon_table(record)])


def limits(
    curves: Iterable[IndexCurve], target: float, *, bands: bool = True
) -> tuple[float, float]:
    """Range of an index axis that shows curves, bands and target."""
    values = [target]
    for curve in curves:
        values.extend(float(value) for value in curve.index)
        if bands:
            values.extend(float(value) for value in (*curve.low, *curve.high))
    low, high = derived.spread(values)
    margin = 0.05 * (high - low) or 0.5
    return low - margin, high + margin


def years_views(record: RunRecord) -> list[YearsView]:
    """Gather the curves of every section that may be shown."""
    looks = stage_looks([item.name for item in record.stages])
    stages = derived.shown_stages(record)
    last = derived.final_stage(record).name
    found: list[tuple[str, list[SectionResult]]] = []
    for section in derived.sections(record):
        candidates = (derived.find(record, section, stage) for stage in stages)
        shown = [item for item in candidates if item is not None]
        if shown and shown[-1].stage == last:
            found.append((section, shown))
    if not found:
        return []
    top = _top_limits(found, record.target.index)
    ends = [_ends(results) for _, results in found]
    low = limits(
        (result.cumulative for results in ends for result in results),
        float(found[0][1][-1].cumulative.index[0]),
        bands=False,
    )
    views = []
    for section, kept in found:
        series = [
            Series(
                words.stage_key(record, item.stage),
                item.reference,
                looks[item.stage],
                band=item.stage == last,
            )
            for item in kept
        ]
        lower = [
            Series(words.stage_key(record, item.stage), item.cumulative, looks[item.stage])
            for item in _ends(kept)
        ]
        views.append(_view(record, section, series, kept[-1], top, lower=lower, lower_limits=low))
    return views


def _ends(results: Sequence[SectionResult]) -> list[SectionResult]:
    return [results[0], results[-1]] if len(results) > 1 else list(results)


def _top_limits(
    found: Sequence[tuple[str, Sequence[SectionResult]]], target: float
) -> tuple[float, float]:
    """Bands of the last stage and the lines of the others set the scale."""
    last = limits((results[-1].reference for _, results in found), target)
    lines = limits(
        (item.reference for _, results in found for item in results), target, bands=False
    )
    return min(last[0], lines[0]), max(last[1], lines[1])


def _view(
    record: RunRecord,
    title: str,
    series: Sequence[Series],
    result: SectionResult | None,
    top: tuple[float, float],
    *,
    lower: Sequence[Series] = (),
    lower_limits: tuple[float, float] = (0.0, 1.0),
) -> YearsView:
    year = series[0].curve.year
    crossing = None
    if result is not None and not derived.is_below(result.verdict.standing):
        verdict = result.verdict
        crossing = (verdict.crossing_year, verdict.crossing_low, verdict.crossing_high)
    return YearsView(
        title=title,
        series=series,
        target=record.target.index,
        target_words=words.target_short(record.target),
        limits=top,
        span=(int(year[0]), int(year[-1])),
        abscissa="year" if record.target.period == 1 else "year in which the period ends",
        crossing=crossing,
        ordinate=words.ordinate(record.target.period),
        lower=lower,
        lower_limits=lower_limits,
        lower_label="cumulative β",
    )


def options_view(
    record: RunRecord, title: str, series: Sequence[Series], top: tuple[float, float]
) -> YearsView:
    """Gather the curves of several options at one section."""
    return _view(record, title, series, None, top)


def years_alt(record: RunRecord, view: YearsView) -> str:
    """Describe a picture of curves over years."""
    parts = [
        f"{item.words}: {numbers.index(float(item.curve.index[0]))} in {item.curve.year[0]}, "
        f"{numbers.index(float(item.curve.index[-1]))} in {item.curve.year[-1]}"
        for item in view.series
    ]
    return f"Index of {view.title} over the years, {view.target_words}. " + "; ".join(parts) + "."


def _horizon_table(record: RunRecord) -> Table:
    columns = [
        Column("Section"),
        Column("Index in the first period", right=True),
        Column("Index in the last period", right=True),
        Column("Cumulative index", right=True),
        Column("Cumulative failure probability", right=True),
        Column("Falls below in (5\u201395 %)"),
    ]
    rows = []
    for item in derived.final_results(record):
        if derived.withheld(record, item.stage):
            continue
        rows.append(
            [
                text_cell(item.section),
                Cell(float(item.reference.index[0]), Form.INDEX),
                Cell(float(item.reference.index[-1]), Form.INDEX),
                Cell(float(item.cumulative.index[-1]), Form.INDEX),
                Cell(float(item.cumulative.failure_probability[-1]), Form.PROBABILITY),
                text_cell(crossing_text(record, item)),
            ]
        )
    note = f"Cumulative: from {record.assessed} to the end of the horizon, with one structure."
    return Table("Index at the end of the horizon, after the last survey", columns, rows, [note])
