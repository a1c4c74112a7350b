import csv
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from assess.decisions.results import RunRecord
from assess.report.summary import COLUMNS, summary_rows, write_summary


def test_columns_and_number_of_rows(record: RunRecord) -> None:
    rows = summary_rows(record)
    assert all(tuple(row) == COLUMNS for row in rows)
    # 30 annual and 30 cumulative rows for each result; the first year is the same row.
    assert len(rows) == len(record.results) * 59


def test_rows_are_unique(record: RunRecord) -> None:
    keys = [tuple(row[name] for name in COLUMNS[:5]) for row in summary_rows(record)]
    assert len(set(keys)) == len(keys)


def test_target_stands_only_beside_its_own_period(record: RunRecord) -> None:
    for row in summary_rows(record):
        compared = row["period"] == "1"
        assert (row["target"] == "3.30") == compared
        assert bool(row["verdict"]) == compared


def test_a_longer_reference_period_has_rows_of_its_own(record: RunRecord) -> None:
    result = record.results[0]
    fifty = replace(
        result.annual, year=np.array([2075]), period=np.array([50]), index=np.array([3.1]),
        low=np.array([2.9]), high=np.array([3.4]), integration_error=np.array([0.01]),
        mcmc_error=np.array([0.0]), failure_probability=np.array([9.7e-4]),
    )  # fmt: skip
    changed = replace(
        record,
        target=replace(record.target, period=50, index=3.8),
        results=[replace(result, reference=fifty)],
    )
    compared = [row for row in summary_rows(changed) if row["target"]]
    assert len(compared) == 1
    assert compared[0]["year"] == "2075"
    assert compared[0]["reliability_index"] == "3.1000"
    assert compared[0]["failure_probability"] == "9.7000e-04"


def test_values_read_back(record: RunRecord, tmp_path: Path) -> None:
    path = tmp_path / "summary.csv"
    write_summary(record, path)
    with path.open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    last = record.stages[-1].name
    for result in record.results:
        if result.stage == last and result.option == "leave":
            first = next(
                row
                for row in rows
                if (row["section"], row["stage"], row["option"]) == (result.section, last, "leave")
            )
            assert float(first["reliability_index"]) == pytest.approx(
                result.annual.index[0], abs=5e-5
            )
            assert float(first["index_low"]) <= float(first["index_high"])


def test_bytes_are_reproducible_with_line_feeds_only(record: RunRecord, tmp_path: Path) -> None:
    paths = [tmp_path / name for name in ("a.csv", "b.csv")]
    for path in paths:
        write_summary(record, path)
    first, second = (path.read_bytes() for path in paths)
    assert first == second
    assert b"\r" not in first
    assert first.startswith(b"section,stage,option,year,period,reliability_index,")


def test_unconverged_indices_are_empty_unless_accepted(unconverged: RunRecord) -> None:
    last = unconverged.stages[-1].name
    for row in summary_rows(unconverged):
        assert (row["reliability_index"] == "") == (row["stage"] == last)
        assert (row["failure_probability"] == "") == (row["stage"] == last)
        if row["stage"] == last and row["target"]:
            assert row["verdict"] == "withheld"
    accepted = summary_rows(replace(unconverged, accepted_unconverged=True))
    assert all(row["reliability_index"] for row in accepted)
