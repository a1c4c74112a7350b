"""The demonstration case: its tables come from its script, its README says what is in them."""

import importlib.util
import re
import sys
from dataclasses import astuple
from pathlib import Path
from types import ModuleType

import numpy as np
import openpyxl  # type: ignore[import-untyped]
import pytest

from assess.case.reader import CaseReading
from assess.pipeline import check_case

ROOT = Path(__file__).parents[1]
FOLDER = ROOT / "case_data" / "aldermoor"
README = (FOLDER / "README.md").read_text(encoding="utf-8")
CSV = [
    "cores_2018.csv",
    "cover_2018.csv",
    "cover_2025.csv",
    "section_loss_2018.csv",
    "section_loss_2025.csv",
]
WORKBOOK = "cores_2025.xlsx"


@pytest.fixture(scope="module")
def script() -> ModuleType:
    place = importlib.util.spec_from_file_location("make_tables", FOLDER / "make_tables.py")
    assert place is not None
    assert place.loader is not None
    module = importlib.util.module_from_spec(place)
    with pytest.MonkeyPatch.context() as patch:
        # Dataclasses look their module up by name while it is executed.
        patch.setitem(sys.modules, "make_tables", module)
        place.loader.exec_module(module)
    return module


@pytest.fixture(scope="module")
def remade(script: ModuleType, tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("aldermoor")
    script.main(folder)
    return folder


@pytest.fixture(scope="module")
def reading() -> CaseReading:
    return check_case(ROOT / "configs" / "aldermoor.yaml")


def _cells(path: Path) -> list[tuple[object, ...]]:
    book = openpyxl.load_workbook(path, read_only=True)
    try:
        return list(book.worksheets[0].iter_rows(values_only=True))
    finally:
        book.close()


def _readme_rows(first_cell: str) -> list[list[str]]:
    """Rows of the README's tables whose first cell fits."""
    rows = [
        [cell.strip() for cell in line.strip("|").split("|")]
        for line in README.splitlines()
        if line.startswith("|")
    ]
    return [row for row in rows if re.fullmatch(first_cell, row[0])]


@pytest.mark.parametrize("name", CSV)
def test_script_writes_committed_csv_byte_for_byte(remade: Path, name: str) -> None:
    assert (remade / name).read_bytes() == (FOLDER / name).read_bytes()


def test_script_writes_committed_workbook(remade: Path) -> None:
    assert _cells(remade / WORKBOOK) == _cells(FOLDER / WORKBOOK)


def test_workbook_does_not_depend_on_the_time(remade: Path, script: ModuleType) -> None:
    first = (remade / WORKBOOK).read_bytes()
    script.main(remade)
    assert (remade / WORKBOOK).read_bytes() == first


def test_script_writes_nothing_else(remade: Path) -> None:
    assert {path.name for path in remade.iterdir()} == {*CSV, WORKBOOK}


def test_case_has_no_faults(reading: CaseReading) -> None:
    assert reading.faults == ()
    assert reading.case is not None
    assert reading.case.spec.structure.invented


def test_tables_have_the_rows_that_the_readme_counts(reading: CaseReading) -> None:
    assert reading.case is not None
    read = {item.table.path.name: len(item.table) for item in reading.case.evidence}
    said = {row[0].strip("`"): int(row[1]) for row in _readme_rows(r"`\w+\.(csv|xlsx)`")}
    assert read == said


def test_readme_tells_the_true_values(script: ModuleType) -> None:
    zones = _readme_rows("inner girders|edge girders|cross beams")
    told = {row[0]: tuple(map(float, row[1:])) for row in zones}
    assert told == {name: astuple(truth) for name, truth in script.TRUTH.items()}
    sections = _readme_rows("|".join(script.SECTIONS))
    told = {row[0]: tuple(map(float, row[1:])) for row in sections}
    assert told == {name: astuple(here) for name, (_, here) in script.SECTIONS.items()}


def test_readme_tells_the_bias_of_the_meters(script: ModuleType) -> None:
    words = re.sub(r"\s+", " ", README)
    assert f"Meter A reads {script.METERS[2018].bias:g} mm too much" in words
    assert f"meter B {-script.METERS[2025].bias:g} mm too little" in words


@pytest.mark.parametrize(
    ("table", "line", "what"),
    [
        ("cover_2018.csv", 703, "out of the usual range, given 2.9 mm, .*written in cm"),
        ("cover_2018.csv", 904, "the row repeats line 903"),
        ("cover_2018.csv", 1504, "far from the others: .*given 78 mm"),
        ("section_loss_2025.csv", 16, "the row repeats line 14"),
    ],
)
def test_planted_blemishes_are_doubted(
    reading: CaseReading, table: str, line: int, what: str
) -> None:
    there = [str(doubt) for doubt in reading.doubts if f"{table}:{line}:" in str(doubt)]
    assert any(re.search(what, doubt) for doubt in there), there


def test_nothing_but_outliers_of_the_scan_is_doubted_beside(reading: CaseReading) -> None:
    planted = ("cover_2018.csv:703:", "cover_2018.csv:904:", "section_loss_2025.csv:16:")
    others = [str(d) for d in reading.doubts if not any(mark in str(d) for mark in planted)]
    singly = [doubt for doubt in others if "cover lies far from the others" in doubt]
    more = [re.search(r"cover_2018.csv:\d+: .* (\d+) more values far", doubt) for doubt in others]
    further = [int(match[1]) for match in more if match]
    assert len(singly) + len(further) == len(others)
    # The README counts those that nobody planted: all but the reading over the spacer block.
    assert len(singly) - 1 + sum(further) == 2


def test_beyond_range_and_none_found_are_read_as_such(reading: CaseReading) -> None:
    assert reading.case is not None
    tables = {item.table.path.name: item.table for item in reading.case.evidence}
    scan = tables["cover_2018.csv"]
    far = np.isfinite(scan.beyond["cover"])
    assert scan.lines[far].tolist() == [1984, 1985]
    assert scan.beyond["cover"][far].tolist() == [80.0, 80.0]
    for name in ("section_loss_2018.csv", "section_loss_2025.csv"):
        table = tables[name]
        none = table.absent["residual diameter"]
        assert 0 < none.sum() < len(table)
        assert np.array_equal(none, np.isnan(table.numbers["residual diameter"]))


def test_decimal_commas_and_latin_1_are_read(reading: CaseReading) -> None:
    assert reading.case is not None
    tables = {item.table.path.name: item.table for item in reading.case.evidence}
    cores = FOLDER.joinpath("cores_2018.csv").read_bytes().decode("utf-8-sig").splitlines()
    first = float(cores[1].split(";")[3].replace(",", "."))
    assert tables["cores_2018.csv"].numbers["strength"][0] == first
    assert "soffit damp, 4 °C" in tables["cover_2025.csv"].texts["note"]


def test_two_sections_are_measured_nowhere_and_three_in_2025(reading: CaseReading) -> None:
    assert reading.case is not None
    measured = {str(name) for item in reading.case.evidence for name in item.section if name}
    sections = set(reading.case.spec.sections())
    assert measured == {"G1 midspan", "G2 midspan", "B1 column face"}
    assert {"G5 midspan", "B2 column face"} <= sections - measured
