import re
from dataclasses import replace

import numpy as np

from assess.decisions.results import RunRecord, Standing
from assess.report import derived, findings, numbers, words
from assess.report.document import Table
from assess.report.parts import answer, dependence


def table_text(table: Table) -> list[list[str]]:
    return [[numbers.cell_text(cell) for cell in row] for row in table.rows]


def test_counts_in_the_first_sentence_are_those_of_the_verdict_table(record: RunRecord) -> None:
    sentence = findings.standing_counts(record)
    heads = [column.heading for column in answer.verdict_table(record).columns]
    verdicts = [row[heads.index("Verdict")] for row in table_text(answer.verdict_table(record))]
    counted = {
        "through": sum("through" in text for text in verdicts),
        "fall": sum("until" in text for text in verdicts),
        "load limit;": sum("limited to" in text for text in verdicts),
        "no load limit": sum(text == "below the target now" for text in verdicts),
    }
    assert sum(counted.values()) == len(verdicts) == 6
    for clue, number in counted.items():
        part = next(item for item in re.split(r"(?<=;) |: ", sentence) if clue in item)
        assert part.startswith(str(number))


def test_lowest_index_is_the_lowest_of_the_table(record: RunRecord) -> None:
    rows = table_text(answer.verdict_table(record))
    column = len(record.stages)  # index after the last survey
    lowest = min(rows, key=lambda row: float(row[column]))
    sentence = findings.lowest_sentence(record)
    assert f"at {lowest[0]} " in sentence
    assert f"is {lowest[column]}" in sentence
    assert "below the required 3.30" in sentence


def test_crossing_in_the_sentence_is_the_earliest_of_the_table(record: RunRecord) -> None:
    heads = [column.heading for column in answer.verdict_table(record).columns]
    place = next(k for k, head in enumerate(heads) if head.startswith("Falls"))
    rows = [row for row in table_text(answer.verdict_table(record)) if row[place][:2] == "20"]
    first = min(rows, key=lambda row: int(row[place][:4]))
    assert f"{first[0]} is the first to fall below it: in {first[place][:4]}" in (
        findings.crossing_sentence(record)
    )


def test_until_is_the_last_year_at_or_above_the_target(record: RunRecord) -> None:
    for result in derived.final_results(record):
        if result.verdict.standing is Standing.MEETS_UNTIL:
            year = int(words.result_verdict(record, result).split()[-1])
            at = result.reference.year.tolist().index(year)
            assert (
                result.reference.index[at] >= record.target.index > result.reference.index[at + 1]
            )


def test_taught_agrees_with_a_separate_calculation(record: RunRecord) -> None:
    best = max(
        (item for item in record.variables if item.used),
        key=lambda item: (
            1 - np.std(item.draws[record.stages[-1].name]) / np.std(item.draws["prior"])
        ),
    )
    last = record.stages[-1].name
    share = 1 - np.std(best.draws[last], ddof=1) / np.std(best.draws["prior"], ddof=1)
    assert f"about {best.label} ({100 * share:.0f}\u00a0%)" in findings.learned_sentence(record)


def test_unmeasured_sections_are_named(record: RunRecord) -> None:
    sentence = findings.unmeasured_sentence(record)
    assert "G2 support, shear; and P2 base" in sentence
    assert "G1" not in sentence


def test_ignoring_sentence_names_exactly_the_flagged_rows(record: RunRecord) -> None:
    section = dependence.ignoring(record)
    table = next(block for block in section.blocks if isinstance(block, Table))
    flagged = [row[0] for row in table_text(table) if row[-1] == "verdict changes"]
    sentence = findings.ignoring_sentence(record)
    assert flagged
    for row in table_text(table):
        assert (row[0] in sentence) == (row[0] in flagged)


def test_close_call_is_said(record: RunRecord) -> None:
    result = derived.final_results(record)[0]
    near = float(result.reference.index[0]) - 0.01  # less than two errors of 0.014
    moved = replace(record, target=replace(record.target, index=near))
    assert result.section in findings.close_calls(moved)
    assert findings.close_calls(record) == ""
