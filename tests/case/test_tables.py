import math
from dataclasses import replace
from datetime import datetime
from pathlib import Path

import numpy as np
import openpyxl
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from assess.case.forms import Column, EvidenceEntry, EvidenceForm, Table, Vocabulary
from assess.case.tables import read_table


def outcome(
    folder: Path, form: EvidenceForm, content: str | bytes
) -> tuple[Table | None, list[str], list[str]]:
    path = folder / "t.csv"
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    table, faults, doubts = read_table(path, form)
    return (
        table,
        [str(fault).removeprefix(f"{folder}/") for fault in faults],
        [str(doubt).removeprefix(f"{folder}/") for doubt in doubts],
    )


def sound(folder: Path, form: EvidenceForm, content: str | bytes) -> Table:
    table, faults, doubts = outcome(folder, form, content)
    assert (faults, doubts) == ([], [])
    assert table is not None
    return table


@pytest.fixture
def cores(vocabulary: Vocabulary) -> EvidenceForm:
    return vocabulary.evidence["cores"]


@pytest.fixture
def cover(vocabulary: Vocabulary) -> EvidenceForm:
    return vocabulary.evidence["cover"]


@pytest.fixture
def loss(vocabulary: Vocabulary) -> EvidenceForm:
    return vocabulary.evidence["section_loss"]


def test_units_are_converted_and_missing_columns_stay_empty(
    tmp_path: Path, cores: EvidenceForm
) -> None:
    text = (
        "Location,STRENGTH [psi],Diameter (in),Moisture,remark\nA1,5000,4,Wet,chipped\nA2,6e3,,,\n"
    )
    table = sound(tmp_path, cores, text)
    psi = 0.45359237 * 9.80665 / 25.4**2  # [MPa], exact by definition
    np.testing.assert_allclose(table.numbers["strength"], [5000 * psi, 6000 * psi], rtol=1e-12)
    np.testing.assert_allclose(table.numbers["diameter"], [101.6, math.nan], rtol=1e-12)
    assert np.isnan(table.numbers["length"]).all()
    assert table.texts["moisture"].tolist() == ["wet", ""]
    assert table.texts["note"].tolist() == ["chipped", ""]
    assert table.texts["location"].tolist() == ["A1", "A2"]
    assert table.texts["zone"].tolist() == table.texts["section"].tolist() == ["", ""]
    assert table.lines.tolist() == [2, 3]
    assert len(table) == 2


@pytest.mark.parametrize(
    "text",
    [
        "location;cover [mm]\nA;38,5\nB;40\n",
        "location\tcover [mm]\nA\t38,5\nB\t40\n",
        'location,cover [mm]\nA,"38,5"\nB,40\n',
        "location,cover [cm]\nA,3.85\nB,4.0\n",
        "location;cover [cm]\nA;3,85\nB;4\n",
    ],
)
def test_decimal_commas(tmp_path: Path, cover: EvidenceForm, text: str) -> None:
    numbers = sound(tmp_path, cover, text).numbers["cover"]
    np.testing.assert_allclose(numbers, [38.5, 40.0], rtol=1e-12)


def test_readings_beyond_range_are_kept_as_bounds(tmp_path: Path, cover: EvidenceForm) -> None:
    table = sound(tmp_path, cover, "cover [cm]\n4\n>8\n≥ 8,5\n>= 9\n")
    np.testing.assert_array_equal(np.isnan(table.numbers["cover"]), [False, True, True, True])
    np.testing.assert_allclose(table.beyond["cover"], [math.nan, 80.0, 85.0, 90.0])


CHLORIDE = EvidenceForm(
    key="chloride_profile",
    title="chloride contents",
    entry=EvidenceEntry,
    columns=(
        Column("from", "upper face", "mm"),
        Column("chloride", "content", "-", above=0.0, below=0.2, below_detection=True),
        Column("depth", "of the front", "mm", required=False, censored=True, below_detection=True),
    ),
    value="chloride",
    apart=("from",),
)


def test_contents_below_detection_are_kept_as_bounds(tmp_path: Path) -> None:
    text = "from [mm];chloride [%]\n0;1,2\n10;<0,02\n20;≤ 0,01\n30;<=1e-2\n"
    table = sound(tmp_path, CHLORIDE, text)
    np.testing.assert_allclose(table.numbers["chloride"], [0.012, math.nan, math.nan, math.nan])
    np.testing.assert_allclose(table.below["chloride"], [math.nan, 2e-4, 1e-4, 1e-4])
    assert "chloride" not in table.beyond
    assert "from" not in table.below


def test_a_column_may_be_bounded_on_both_sides(tmp_path: Path) -> None:
    table = sound(tmp_path, CHLORIDE, "from [mm];chloride [%];depth [cm]\n0;1;<1\n0;2;>4\n0;3;2\n")
    np.testing.assert_allclose(table.below["depth"], [10.0, math.nan, math.nan])
    np.testing.assert_allclose(table.beyond["depth"], [math.nan, 40.0, math.nan])
    np.testing.assert_allclose(table.numbers["depth"], [math.nan, math.nan, 20.0])


@pytest.mark.parametrize(
    ("row", "message"),
    [
        ("0;<x", "t.csv:2: .* cannot be a bound, given '<x', allowed a number, or such as <0.01"),
        ("0;>1", "t.csv:2: .* cannot be a bound, given '>1', allowed .* such as <0.01 for less"),
        ("<0;1", "t.csv:2: column 'from': cannot be a bound, given '<0', allowed a number$"),
        ("0;<0", "t.csv:2: .* out of range, given <0, allowed more than 0"),
        ("0;<-1", "t.csv:2: .* out of range, given <-1"),
        ("0;<80", "t.csv:2: .* out of range, given <80"),
    ],
)
def test_bounds_that_are_none(tmp_path: Path, row: str, message: str) -> None:
    _, (fault,), _ = outcome(tmp_path, CHLORIDE, f"from [mm];chloride [%]\n{row}\n")
    with pytest.raises(ValueError, match=message):
        raise ValueError(fault)


def test_bounds_count_where_rows_are_compared(tmp_path: Path) -> None:
    head = "location;from [mm];chloride [%]\n"
    _, _, doubts = outcome(tmp_path, CHLORIDE, head + "A;10;<0.02\nA;10;<0.01\nA;10;<0.01\n")
    assert doubts == ["t.csv:4: the row repeats line 3, counted twice? delete one"]


def test_equal_contents_at_two_depths_are_no_repetition(tmp_path: Path) -> None:
    head = "location;from [mm];chloride [%]\n"
    sound(tmp_path, CHLORIDE, head + "A;10;0.1\nA;20;0.1\n")
    _, _, (doubt,) = outcome(tmp_path, CHLORIDE, head + "A;10;0.1\nA;20;0.1\nA;20;0.1\n")
    assert "the row repeats line 3" in doubt


def test_absent_is_not_missing(tmp_path: Path, loss: EvidenceForm) -> None:
    text = (
        "original diameter [mm],residual_diameter [mm],share [%]\n"
        "25,None,15\n25,no loss,\n25,22.5,5\n"
    )
    table = sound(tmp_path, loss, text)
    assert table.absent["residual diameter"].tolist() == [True, True, False]
    assert np.isnan(table.numbers["residual diameter"]).tolist() == [True, True, False]
    np.testing.assert_allclose(table.numbers["share"], [0.15, math.nan, 0.05], rtol=1e-12)


def test_workbook(tmp_path: Path, cores: EvidenceForm) -> None:
    book = openpyxl.Workbook()
    for row in (["location", "strength [MPa]"], ["A1", 41.25], ["A2", 38]):
        book.worksheets[0].append(row)
    book.save(tmp_path / "t.xlsx")
    table, faults, doubts = read_table(tmp_path / "t.xlsx", cores)
    assert (faults, doubts) == ((), ())
    assert table is not None
    assert table.numbers["strength"].tolist() == [41.25, 38.0]
    assert table.lines.tolist() == [2, 3]


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("location\nA1\n", r"t.csv:1: column 'strength' is missing, add strength \[MPa\]: crush"),
        ("strenght [MPa]\n40\n", "t.csv:1: unknown column .* did you mean 'strength'"),
        ("strength [MPa],strength [psi]\n40,1\n", "t.csv:1: column 'strength' stands twice"),
        ("strength\n40\n", r"t.csv:1: column 'strength' has no unit, allowed MPa, psi.*\[MPa\]"),
        ("strength [mm]\n40\n", "t.csv:1: .* does not convert to MPa, given 'mm', allowed MPa"),
        ("strength [MPq]\n40\n", "t.csv:1: column 'strength' has an unknown unit, given 'MPq'"),
        ("strength [MPa]\n40\nlow\n", "t.csv:3: .* text where a number is wanted, given 'low'"),
        ("strength [MPa]\n40 MPa\n", "t.csv:2: .*given '40 MPa'.* unit in the header, not in"),
        ("strength [MPa]\n4.000.000\n", "t.csv:2: .*without marks for the thousands"),
        ("strength [MPa]\n1_000\n", "t.csv:2: .* text where a number is wanted"),
        ("strength [MPa]\n40\nNaN\n", "t.csv:3: .* not a finite number, given 'NaN'"),
        ("strength [MPa]\ninf\n", "t.csv:2: .* not a finite number, given 'inf'"),
        ("strength [MPa]\n1e999\n", "t.csv:2: .* not a finite number"),
        ("location,strength [MPa]\nA1,40\nA2,\n", "t.csv:3: column 'strength': the cell is empty"),
        ("strength [MPa]\n-40\n", "t.csv:2: .* out of range, given -40, allowed more than 0 MPa"),
        ("strength [MPa]\n>40\n", "t.csv:2: .* cannot be a bound, given '>40'"),
        (
            "strength [MPa],moisture\n40,moist\n",
            "t.csv:2: column 'moisture': no such choice, given 'moist', allowed wet, dry",
        ),
        ("strength [MPa]\n", "t.csv:1: the table has a header but no rows"),
        ("", "t.csv: the table is empty, given 0 bytes"),
    ],
)
def test_refuse(tmp_path: Path, cores: EvidenceForm, text: str, message: str) -> None:
    table, faults, _ = outcome(tmp_path, cores, text)
    assert table is None
    (fault,) = faults
    with pytest.raises(ValueError, match=message):
        raise ValueError(fault)


def test_all_faults_at_once_each_with_its_line(tmp_path: Path, cores: EvidenceForm) -> None:
    text = (
        "location,strength [MPa],moisture,age\n"
        "A1,40,dryy,1\nA2,x,dry,1\nA3,nan,dry,1\nA4,-4,dry,1\n"
    )
    _, faults, _ = outcome(tmp_path, cores, text)
    assert [fault.split(": ")[0] for fault in faults] == [
        f"t.csv:{line}" for line in (1, 2, 3, 4, 5)
    ]


def test_many_faults_of_a_column_are_counted(tmp_path: Path, cores: EvidenceForm) -> None:
    _, faults, _ = outcome(tmp_path, cores, "strength [MPa]\n" + "x\n" * 100)
    assert len(faults) == 21
    assert "80 more faults from here" in faults[-1]


def test_psi_under_a_megapascal_header(tmp_path: Path, cores: EvidenceForm) -> None:
    _, (fault,), _ = outcome(tmp_path, cores, "strength [MPa]\n4300\n5100\n4800\n")
    assert fault == (
        "t.csv:1: column 'strength' looks like psi under a MPa header, given a median of 4800 MPa, "
        "allowed usually 8 to 120 MPa, correct the header's unit"
    )


@pytest.mark.parametrize(
    ("text", "looks"),
    [
        ("strength [MPa]\n4.3\n5.1\n", "ksi"),
        ("strength [psi]\n41\n38\n", "MPa"),
        ("strength [ksi]\n4300\n5100\n", "psi"),
        ("strength [MPa]\n41000\n38000\n", "kPa"),
    ],
)
def test_other_units_of_strength(
    tmp_path: Path, cores: EvidenceForm, text: str, looks: str
) -> None:
    _, (fault,), _ = outcome(tmp_path, cores, text)
    assert f"looks like {looks}" in fault


@pytest.mark.parametrize(
    ("text", "looks"),
    [
        ("cover [mm]\n1.5\n1.75\n", "cm or in"),
        ("cover [mm]\n0.04\n0.05\n", "m or ft under"),
        ("cover [in]\n38\n40\n", "mm under an in header"),
        ("cover [m]\n38\n40\n", "mm under a m header"),
    ],
)
def test_other_units_of_cover(tmp_path: Path, cover: EvidenceForm, text: str, looks: str) -> None:
    _, (fault,), _ = outcome(tmp_path, cover, text)
    assert f"looks like {looks}" in fault


def test_single_unusual_cells_are_doubts(tmp_path: Path, cores: EvidenceForm) -> None:
    table, faults, doubts = outcome(tmp_path, cores, "strength [MPa]\n40\n42\n4300\n")
    assert table is not None
    assert faults == []
    assert doubts == [
        "t.csv:4: column 'strength' is out of the usual range, given 4300 MPa, allowed usually "
        "8 to 120 MPa, written in psi?"
    ]


def test_a_median_that_no_unit_explains_is_doubted_cell_by_cell(
    tmp_path: Path, cover: EvidenceForm
) -> None:
    rows = "".join(f"{value}\n" for value in range(200, 210))
    _, faults, doubts = outcome(tmp_path, cover, f"cover [mm]\n{rows}")
    assert faults == []
    assert len(doubts) == 6
    assert "from here on 5 more values" in doubts[-1]


def test_repetition_is_doubted(tmp_path: Path, cores: EvidenceForm) -> None:
    text = (
        "location,strength [MPa],diameter [mm],note\nA1,40,100,\nA2,40,100,\n"
        "A1,40,100,again\nA2,40,99,\nA3,40,100,\n"
    )
    _, faults, doubts = outcome(tmp_path, cores, text)
    assert faults == []
    assert [doubt.split(",")[0] for doubt in doubts] == [
        "t.csv:4: the row repeats line 2",
        "t.csv:5: location 'A2' has the same strength as in line 3",
    ]


def test_equal_readings_without_a_location_are_no_repetition(
    tmp_path: Path, cover: EvidenceForm
) -> None:
    sound(tmp_path, cover, "cover [mm]\n40\n40\n40\n")


MOST = Column("strength", "crushing strength", "MPa", above=0.0, below=300.0, usual=(8.0, 120.0))


@pytest.fixture
def bounded(cores: EvidenceForm) -> EvidenceForm:
    """Cores whose strength has an upper bound, as a unit mistaken for another one meets it."""
    return replace(cores, columns=(MOST,))


# 1 MPa is 145.04 psi, 0.14504 ksi, 1000 kPa and 10.197 kgf/cm².
@pytest.mark.parametrize(
    ("values", "looks"),
    [
        ((4350, 5100, 4800), "psi"),
        ((45000, 38000), "kPa"),
        ((410, 350), "kgf/cm^2"),
        ((6.1, 5.2), "ksi"),
    ],
)
def test_a_column_in_another_unit_is_one_fault_even_beyond_what_is_allowed(
    tmp_path: Path, bounded: EvidenceForm, values: tuple[float, ...], looks: str
) -> None:
    text = "strength [MPa]\n" + "".join(f"{value}\n" for value in values)
    _, (fault,), doubts = outcome(tmp_path, bounded, text)
    assert f"t.csv:1: column 'strength' looks like {looks} under a MPa header" in fault
    assert doubts == []


def test_one_cell_beyond_what_is_allowed_is_told_its_likely_unit(
    tmp_path: Path, bounded: EvidenceForm
) -> None:
    _, (fault,), _ = outcome(tmp_path, bounded, "strength [MPa]\n40\n4350\n38\n")
    assert fault == (
        "t.csv:3: column 'strength': is out of range, given 4350, allowed more than 0 and less "
        "than 300 MPa, written in psi?"
    )


def test_percent_under_a_header_without_unit(tmp_path: Path, loss: EvidenceForm) -> None:
    text = "original diameter [mm],residual diameter [mm],share [-]\n25,22,15\n"
    _, (fault,), _ = outcome(tmp_path, loss, text)
    assert fault.endswith("given 15, allowed less than 1.001, written in %?")


def test_a_title_in_place_of_the_header_is_one_fault(tmp_path: Path, cores: EvidenceForm) -> None:
    text = "Cores of the bridge\nlocation,strength [MPa]\nA1,40\n"
    _, (fault,), _ = outcome(tmp_path, cores, text)
    assert fault == (
        "t.csv:1: this line is no header of a table of crushed cores, given 'Cores of the bridge', "
        "allowed strength [MPa], diameter [mm], length [mm], moisture, is it a title? begin it "
        "with #, or delete it"
    )


def write_book(path: Path, *sheets: list[list[object]]) -> Path:
    book = openpyxl.Workbook()
    book.remove(book.worksheets[0])
    for number, rows in enumerate(sheets, start=1):
        sheet = book.create_sheet(f"sheet {number}")
        for row in rows:
            sheet.append(row)
    book.save(path)
    return path


def test_a_table_that_is_not_the_first_sheet(tmp_path: Path, cores: EvidenceForm) -> None:
    path = write_book(tmp_path / "t.xlsx", [["read me"]], [["strength [MPa]"], [40]])
    _, (fault,), _ = read_table(path, cores)
    assert "t.xlsx:1: this line is no header" in str(fault)
    assert str(fault).endswith("only the first sheet is read (sheet 1): the table in sheet 2?")


@pytest.mark.parametrize(
    ("cell", "message"),
    [
        (
            "=20*2",
            "t.xlsx:2: .* a formula that was never computed, given '=20\\*2'.* open and save",
        ),
        (datetime(2025, 3, 4), "t.xlsx:2: .* a date where a number is wanted, given '2025-03-04"),
        (True, "t.xlsx:2: .* text where a number is wanted, given 'True'"),
        ("#DIV/0!", "t.xlsx:2: .* text where a number is wanted, given '#DIV/0!'"),
    ],
)
def test_cells_of_workbooks_that_are_no_numbers(
    tmp_path: Path, cores: EvidenceForm, cell: object, message: str
) -> None:
    path = write_book(tmp_path / "t.xlsx", [["strength [MPa]"], [cell]])
    _, (fault,), _ = read_table(path, cores)
    with pytest.raises(ValueError, match=message):
        raise ValueError(str(fault))


@given(st.binary(max_size=300) | st.text(max_size=300).map(lambda text: text.encode("utf-8")))
@settings(
    max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
def test_any_bytes_are_read_or_refused(tmp_path: Path, cores: EvidenceForm, content: bytes) -> None:
    table, faults, _ = outcome(tmp_path, cores, content)
    assert (table is None) == bool(faults)


@given(st.lists(st.lists(st.text(alphabet="0123456789.,;>e-+ xn\"\t%/'", max_size=8), max_size=4)))
@settings(
    max_examples=200, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
def test_any_cells_are_read_or_refused(
    tmp_path: Path, cover: EvidenceForm, rows: list[list[str]]
) -> None:
    body = "\n".join(";".join(row) for row in rows)
    table, faults, _ = outcome(tmp_path, cover, f"cover [mm];location\n{body}\n")
    assert (table is None) == bool(faults)
    if table is not None:
        known = table.numbers["cover"][~np.isnan(table.numbers["cover"])]
        assert (known > 0.0).all()
