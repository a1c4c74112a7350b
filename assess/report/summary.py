"""The summary table: one row per section, stage, option, year and period, as CSV."""

import csv
import io
import math
from collections.abc import Iterator
from pathlib import Path

from assess.decisions.results import IndexCurve, RunRecord, SectionResult
from assess.report import derived, words

COLUMNS = (
    "section",
    "stage",
    "option",
    "year",
    "period",
    "reliability_index",
    "index_low",
    "index_high",
    "error",
    "failure_probability",
    "target",
    "verdict",
)


def summary_rows(record: RunRecord) -> list[dict[str, str]]:
    """List the summary's rows, every value as it is written.

    Parameters
    ----------
    record : RunRecord
        Everything the run found.

    Returns
    -------
    list of dict
        Keys are `COLUMNS`. Annual rows (period 1), cumulative rows (period 1, 2, ... years from
        the year of assessment), and rows of the target's reference period where neither holds
        them. `target` and `verdict` stand only where a row's period is the target's: an index is
        compared with a target of the same period. Indices of a stage that has not converged are
        empty, with the verdict ``withheld``, unless that was accepted.
    """
    rows: list[dict[str, str]] = []
    for result in record.results:
        held: set[tuple[int, int]] = set()
        for curve in (result.annual, result.cumulative, result.reference):
            rows.extend(_curve_rows(record, result, curve, held))
    return rows


def write_summary(record: RunRecord, path: Path) -> None:
    """Write the summary as CSV: UTF-8, one header line, line feeds only."""
    stream = io.StringIO()
    writer = csv.DictWriter(stream, COLUMNS, lineterminator="\n")
    writer.writeheader()
    writer.writerows(summary_rows(record))
    path.write_text(stream.getvalue(), encoding="utf-8", newline="\n")


def _curve_rows(
    record: RunRecord, result: SectionResult, curve: IndexCurve, held: set[tuple[int, int]]
) -> Iterator[dict[str, str]]:
    hidden = derived.withheld(record, result.stage)
    for k in range(len(curve.year)):
        year, period = int(curve.year[k]), int(curve.period[k])
        # The first cumulative year is the first annual one; one row says it.
        if (year, period) in held:
            continue
        held.add((year, period))
        compared = period == record.target.period
        values = {
            "reliability_index": _fixed(curve.index[k], 4),
            "index_low": _fixed(curve.low[k], 4),
            "index_high": _fixed(curve.high[k], 4),
            "error": _fixed(curve.error[k], 5),
            "failure_probability": _scientific(curve.failure_probability[k]),
        }
        yield {
            "section": result.section,
            "stage": result.stage,
            "option": result.option,
            "year": str(year),
            "period": str(period),
            **(dict.fromkeys(values, "") if hidden else values),
            "target": _fixed(record.target.index, 2) if compared else "",
            "verdict": words.result_verdict(record, result) if compared else "",
        }


def _fixed(value: float, decimals: int) -> str:
    number = float(value)
    if not math.isfinite(number):
        return "" if math.isnan(number) else ("inf" if number > 0 else "-inf")
    text = f"{number:.{decimals}f}"
    return text[1:] if text.startswith("-") and float(text) == 0.0 else text


def _scientific(value: float) -> str:
    return "" if math.isnan(float(value)) else f"{float(value):.4e}"
