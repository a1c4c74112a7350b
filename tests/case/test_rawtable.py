from pathlib import Path

import openpyxl
import pytest

from assess.case.rawtable import RawTable, read_rows

ROWS = [["A1", "41.2"], ["A2", "38"]]


def rows_of(folder: Path, content: bytes | str, name: str = "t.csv") -> RawTable:
    path = folder / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    table, faults = read_rows(path)
    assert faults == []
    assert table is not None
    return table


@pytest.mark.parametrize(
    "content",
    [
        "location,strength [MPa]\nA1,41.2\nA2,38\n",
        "location;strength [MPa]\nA1;41.2\nA2;38\n",
        "location\tstrength [MPa]\nA1\t41.2\nA2\t38\n",
        "location,strength [MPa]\r\nA1,41.2\r\nA2,38",
        "location,strength [MPa]\rA1,41.2\rA2,38\r",
        "\ufefflocation,strength [MPa]\nA1,41.2\nA2,38\n",
        "location,strength [MPa],,\nA1,41.2,,\n,,\nA2,38,,\n,,,\n\n",
        'location , "strength [MPa]"\nA1,"41.2"\n A2, 38\n'.replace(', "', ',"'),
        "# made up\n# by hand, in a hurry\n\nlocation,strength [MPa]\nA1,41.2\nA2,38\n",
        "sep=;\nlocation;strength [MPa]\nA1;41.2\nA2;38\n",
        "location,strength [MPa]\nA1,41.2\nA2,38\n".encode("utf-16"),
    ],
)
def test_dialects(tmp_path: Path, content: str | bytes) -> None:
    table = rows_of(tmp_path, content)
    assert table.header == ["location", "strength [MPa]"]
    assert table.rows == ROWS


def test_windows_1252(tmp_path: Path) -> None:
    note = "\u201cwet\u201d \u2013 3 \u20ac"
    raw = f"location;note;current [µA/cm²]\nA1;{note};0,5\n".encode("cp1252")
    assert rows_of(tmp_path, raw).rows == [["A1", note, "0,5"]]


def test_latin_1(tmp_path: Path) -> None:
    raw = "location;note;current [µA/cm²]\nA1;Brücke;0,5\n".encode("latin-1")
    table = rows_of(tmp_path, raw)
    assert table.header[2] == "current [µA/cm²]"
    assert table.rows == [["A1", "Brücke", "0,5"]]


def test_a_column_alone_keeps_its_decimal_commas(tmp_path: Path) -> None:
    assert rows_of(tmp_path, "cover [mm]\n38,5\n40\n").rows == [["38,5"], ["40"]]


def test_separator_is_not_looked_for_in_units_or_quotes(tmp_path: Path) -> None:
    table = rows_of(tmp_path, '"a, b";c [x,y]\n1;2\n')
    assert table.header == ["a, b", "c [x,y]"]


def test_lines_count_comments_blanks_and_breaks_in_cells(tmp_path: Path) -> None:
    table = rows_of(tmp_path, '# made up\n\na,b\n\n1,"two\nlines"\n3,4\n')
    assert table.header_line == 3
    assert table.lines == [5, 7]


def write_book(path: Path, rows: list[list[object]]) -> Path:
    book = openpyxl.Workbook()
    for row in rows:
        book.worksheets[0].append(row)
    book.create_sheet("other").append(["not", "read"])
    book.save(path)
    return path


def test_xlsx_first_sheet(tmp_path: Path) -> None:
    rows: list[list[object]] = [
        ["# made up"],
        ["location", "strength [MPa]", None],
        ["A1", 41.2, None],
        [None, None, None],
        ["A2", 38, None],
    ]
    table, faults = read_rows(write_book(tmp_path / "t.xlsx", rows))
    assert faults == []
    assert table is not None
    assert table.header == ["location", "strength [MPa]"]
    assert table.rows == ROWS
    assert (table.header_line, table.lines) == (2, [3, 5])


def test_merged_cells_are_refused_from_the_header_on(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    for row in (["# a title"], ["zone", "cover [mm]"], ["deck", 40], [None, 41]):
        sheet.append(row)
    sheet.merge_cells("A1:B1")  # above the header it does no harm
    sheet.merge_cells("A3:A4")
    book.save(tmp_path / "t.xlsx")
    _, faults = read_rows(tmp_path / "t.xlsx")
    (fault,) = [str(one).removeprefix(f"{tmp_path}/") for one in faults]
    assert fault == "t.xlsx:3: cells A3:A4 are merged, fill each cell instead"


def test_a_row_of_formulas_alone_is_not_lost(tmp_path: Path) -> None:
    path = write_book(tmp_path / "t.xlsx", [["a", "b"], [1, 2], ["=A2", "=B2"]])
    table, _ = read_rows(path)
    assert table is not None
    assert table.rows == [["1", "2"], ["=A2", "=B2"]]
    assert table.sheets == ("Sheet", "other")


def test_workbook_is_known_by_its_content(tmp_path: Path) -> None:
    path = write_book(tmp_path / "t.xlsx", [["a"], [1]])
    assert rows_of(tmp_path, path.read_bytes(), "renamed.csv").rows == [["1"]]


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "t.csv: the table is empty, given 0 bytes"),
        (b" \n\n", "t.csv: the table is empty, given blanks only"),
        (b"# only\n# comments\n", "t.csv: the table is empty, given comments only"),
        (b"a,b\n", "t.csv:1: the table has a header but no rows"),
        (b"\x89PNG\r\n\x1a\n\x00", "t.csv:.*the file is not text, save it as CSV"),
        (b"a,b\n1,\x00\n", "t.csv:2: the file is not text"),
        (b"\xff\xfea", "t.csv: the file is not text"),
        (b"PK\x03\x04 damaged", "cannot be read as XLSX .*open and save it again"),
        (b"\xd0\xcf\x11\xe0\xa1", "workbook of the old binary format, save it as .xlsx or .csv"),
        (b'a,b\n1,"2\n3,4\n', "t.csv:2: the table cannot be split into cells.*check the quotes"),
        (b"a,b\n1,2,3\n", r"t.csv:2: the row has more cells than the header \(2\), given '3'"),
        (b"a,,b\n1,2,3\n", "t.csv:1: column 2 has no header, name it, or delete it"),
    ],
)
def test_refuse(tmp_path: Path, content: bytes, message: str) -> None:
    path = tmp_path / "t.csv"
    path.write_bytes(content)
    _, (fault,) = read_rows(path)
    with pytest.raises(ValueError, match=message):
        raise ValueError(str(fault))


def test_refuse_folder_and_missing_file(tmp_path: Path) -> None:
    assert "this is a folder, not a table" in str(read_rows(tmp_path)[1][0])
    assert "no.csv: there is no such table" in str(read_rows(tmp_path / "no.csv")[1][0])
