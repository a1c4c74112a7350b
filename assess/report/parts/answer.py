"""First screen: the question, the answer, and what to read first."""

from assess.decisions.results import RunRecord, SectionResult
from assess.report import derived, findings, numbers, words
from assess.report.document import (
    Block,
    BulletList,
    Callout,
    CalloutKind,
    Cell,
    Column,
    Form,
    Paragraph,
    Section,
    Table,
    strong,
    text_cell,
)


def warnings(record: RunRecord) -> list[Block]:
    """Return what must be read before any number."""
    blocks: list[Block] = []
    if record.invented:
        blocks.append(Callout(CalloutKind.CAUTION, words.INVENTED_TITLE, words.INVENTED))
    if record.accepted_unconverged:
        blocks.append(unconverged_callout(record))
    elif derived.unconverged(record):
        text = words.withheld_words(record)
        blocks.append(Callout(CalloutKind.CAUTION, "Indices withheld", text))
    text = words.disagreement(record)
    if text:
        blocks.append(Callout(CalloutKind.CAUTION, "Verdict and index disagree", text))
    return blocks


def draws_warning(record: RunRecord) -> list[Block]:
    """Return the warning of parts that show draws of a stage whose indices are withheld."""
    text = words.doubtful_draws(record)
    return [Callout(CalloutKind.CAUTION, "Not converged", text)] if text else []


def unconverged_callout(record: RunRecord) -> Callout:
    """Return the warning that every section of an accepted, unconverged run carries."""
    return Callout(CalloutKind.CAUTION, words.UNCONVERGED_TITLE, words.unconverged_words(record))


def lead(record: RunRecord) -> list[Block]:
    """Return warnings, the question in two sentences and the table of verdicts."""
    last = derived.last_year(record)
    question = Paragraph(
        [
            strong("Question. "),
            f"Do the {numbers.count(len(derived.sections(record)), 'section')} examined reach the "
            f"required reliability from {record.assessed} to {last}, given the surveys? ",
            words.target_sentence(record.target),
        ]
    )
    return [*warnings(record), question, verdict_table(record)]


def verdict_table(record: RunRecord) -> Table:
    """Return the answer: one row per section."""
    stages = [item.name for item in record.stages]
    columns = [
        Column("Section"),
        *(Column(words.stage_heading(record, stage), right=True) for stage in stages),
        Column("5\u201395 % band", right=True),
        Column("Error", right=True),
        Column("Target", right=True),
        Column("Verdict", wide=True),
        Column("Falls below in (5\u201395 %)", wide=True),
        Column("Governing variable", wide=True),
    ]
    rows = [_verdict_row(record, section, stages) for section in derived.sections(record)]
    period = words.years(record.target.period)
    first = record.assessed + record.target.period - 1
    ending = "" if record.target.period == 1 else f", the period ending in {first}"
    notes = [
        f"Index for a reference period of {period}, at {record.assessed}{ending}. Band, error and "
        f"verdict: {words.stage_words(record, stages[-1])}, option "
        f"\u201c{words.LEAVE_WORDS}\u201d. The band holds the index conditional on the "
        "common variables; the error is one standard error of the calculation "
        "(integration and Markov chains together).",
        *_result_notes(record),
    ]
    return Table("Verdict of each section", columns, rows, notes)


def _result_notes(record: RunRecord) -> list[str]:
    if derived.withheld(record, derived.final_stage(record).name):
        return []
    return [f"{item.section}: {item.note}" for item in derived.final_results(record) if item.note]


def index_cell(record: RunRecord, result: SectionResult | None, *, bold: bool = False) -> Cell:
    """Return the present index, nothing, or that it is withheld."""
    if result is None:
        return Cell(None)
    if derived.withheld(record, result.stage):
        return text_cell(words.WITHHELD)
    return Cell(float(result.reference.index[0]), Form.INDEX, bold)


def crossing_text(record: RunRecord, result: SectionResult) -> str:
    """Write crossing year and its interval."""
    verdict = result.verdict
    last = derived.last_year(record)
    band = numbers.year_interval(verdict.crossing_low, verdict.crossing_high, last)
    if derived.is_below(verdict.standing):
        return "below already"
    if verdict.crossing_year is None:
        return f"after {last}" if verdict.crossing_low is None else f"after {last} ({band})"
    return f"{verdict.crossing_year} ({band})"


def _verdict_row(record: RunRecord, section: str, stages: list[str]) -> list[Cell]:
    found = [derived.find(record, section, stage) for stage in stages]
    last = found[-1]
    name = text_cell(section)
    indices = [
        index_cell(record, item, bold=position == len(found) - 1)
        for position, item in enumerate(found)
    ]
    target = Cell(record.target.index, Form.INDEX)
    if last is None:
        return [name, *indices, Cell(None), Cell(None), target, *[Cell(None)] * 3]
    if derived.withheld(record, last.stage):
        hidden = text_cell(words.WITHHELD)
        return [name, *indices, hidden, hidden, target, *[hidden] * 3]
    _, error, low, high = derived.now(last.reference)
    return [
        name,
        *indices,
        Cell((low, high), Form.INDEX),
        Cell(error, Form.ERROR),
        target,
        text_cell(words.result_verdict(record, last), bold=derived.is_below(last.verdict.standing)),
        text_cell(crossing_text(record, last)),
        text_cell(last.verdict.governing),
    ]


def read_first(record: RunRecord) -> Section:
    """Return the findings in sentences made by rules."""
    return Section(
        "What to read first", [BulletList([[item] for item in findings.findings(record)])]
    )
