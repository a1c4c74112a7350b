"""Table files as rows of text: CSV in its dialects and XLSX, with the line of each row."""

import csv
import io
import re
import warnings
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import Path
from typing import Any

from assess.errors import Fault

_ZIP = b"PK\x03\x04"
_OLD_EXCEL = b"\xd0\xcf\x11\xe0"
_LEAVE_OUT = "leave the entry out of the survey"
_UTF_16 = (b"\xff\xfe", b"\xfe\xff")
_SEPARATOR_LINE = re.compile(r"sep=(.)\s*", re.IGNORECASE)  # first line that Excel may write

Row = tuple[int, list[str]]  # line (CSV) or row (XLSX), 1-based, and its cells


@dataclass(frozen=True, slots=True)
class RawTable:
    """Header and rows as text, blank rows and trailing blank columns left out."""

    header_line: int
    header: list[str]
    lines: list[int]
    rows: list[list[str]]  # each as long as the header
    sheets: tuple[str, ...] = ()  # of a workbook, whose first is read


class _Unreadable(Exception):
    """The file cannot be read as a table."""

    def __init__(self, what: str, *, line: int = 0, given: str = "", mend: str = "") -> None:
        self.what, self.line, self.given, self.mend = what, line, given, mend
        super().__init__(what)


def read_rows(path: Path) -> tuple[RawTable | None, list[Fault]]:
    """Read a table file without knowing what its columns mean.

    Parameters
    ----------
    path : Path
        CSV (comma, semicolon or tab; UTF-8, UTF-16 with its mark, Latin-1) or XLSX, whose first
        sheet is taken. Lines starting with ``#`` before the header are comments.

    Returns
    -------
    table : RawTable or None
        None if the file cannot be used at all.
    faults : list of Fault
        What is wrong with the file as a table.
    """
    file = str(path)
    try:
        raw = _bytes(path)
        if raw.startswith(_ZIP):
            book = _Book(raw)
            table, faults = _shaped(file, [row for row in book.rows() if any(row[1])])
            if table is not None:
                faults += [
                    Fault(file, line, f"cells {place} are merged", mend="fill each cell instead")
                    for line, place in book.merged(table.header_line)
                ]
                table = replace(table, sheets=book.names)
            return table, faults
        return _shaped(file, [row for row in _csv_rows(_text(raw)) if any(row[1])])
    except _Unreadable as error:
        return None, [Fault(file, error.line, error.what, error.given, mend=error.mend)]


def _bytes(path: Path) -> bytes:
    try:
        if path.is_dir():
            raise _Unreadable("this is a folder, not a table")
        raw = path.read_bytes()
    except FileNotFoundError:
        raise _Unreadable("there is no such table", mend="check the path after table:") from None
    except (OSError, ValueError) as error:
        raise _Unreadable(f"the table cannot be opened: {error}") from None
    if not raw:
        raise _Unreadable("the table is empty", given="0 bytes", mend=_LEAVE_OUT)
    if raw.startswith(_OLD_EXCEL):
        mend = "save it as .xlsx or .csv"
        raise _Unreadable("this is a workbook of the old binary format", mend=mend)
    return raw


def _eight_bit(raw: bytes) -> str:
    """Decode as UTF-8, else as spreadsheets export under Windows, else as Latin-1."""
    for encoding in ("utf-8-sig", "cp1252"):
        try:
            return raw.decode(encoding)
        except UnicodeDecodeError:
            continue
    return raw.decode("latin-1")


def _text(raw: bytes) -> str:
    """Decode, telling text from other files by the control characters that text has not."""
    try:
        text = raw.decode("utf-16") if raw.startswith(_UTF_16) else _eight_bit(raw)
    except UnicodeDecodeError:
        raise _Unreadable("the file is not text", mend="save it as CSV in UTF-8") from None
    odd = re.search(r"[\x00-\x08\x0e-\x1f\x7f-\x9f]", text)
    if odd:
        line = text.count("\n", 0, odd.start()) + 1
        raise _Unreadable("the file is not text", line=line, mend="save it as CSV in UTF-8")
    if not text.strip():
        raise _Unreadable("the table is empty", given="blanks only", mend=_LEAVE_OUT)
    return text


def _csv_rows(text: str) -> Iterator[Row]:
    """Split text into rows at the separator that the header uses."""
    lines = re.split(r"(?<=\n)|(?<=\r)(?!\n)", text)
    start, separator = 0, ""
    for start, line in enumerate(lines):  # noqa: B007 - the header's place is used below
        said = _SEPARATOR_LINE.fullmatch(line)
        if said:
            separator = said[1]
        elif line.strip(' \t\r\n,;"') and not line.lstrip('" \t').startswith("#"):
            break
    else:
        raise _Unreadable("the table is empty", given="comments only", mend=_LEAVE_OUT)
    header = re.sub(r'"[^"]*"|\[[^\]]*\]|\([^)]*\)', "", lines[start])
    # A tab cannot stand in a cell by accident, so it also serves a table of one column.
    separator = separator or next((mark for mark in "\t;," if mark in header), "\t")
    reader = csv.reader(
        io.StringIO("".join(lines[start:]), newline=""), delimiter=separator, strict=True
    )
    before = 0
    try:
        for cells in reader:
            yield start + before + 1, [cell.replace("\xa0", " ").strip() for cell in cells]
            before = reader.line_num
    except csv.Error as error:
        what = f"the table cannot be split into cells: {error}"
        mend = "check the quotes of this line and those after it"
        raise _Unreadable(what, line=start + before + 1, mend=mend) from None


class _Book:
    """The first sheet of a workbook, formulas by the values last computed."""

    def __init__(self, raw: bytes) -> None:
        import openpyxl  # type: ignore[import-untyped]

        def first_sheet(*, computed: bool, streamed: bool) -> Any:
            stream = io.BytesIO(raw)
            book = openpyxl.load_workbook(stream, read_only=streamed, data_only=computed)
            self.names = tuple(sheet.title for sheet in book.worksheets)
            return book.worksheets[0]

        try:
            with warnings.catch_warnings():
                warnings.simplefilter("ignore")  # of features that have no bearing on values
                values, formulas = (
                    _streamed_rows(first_sheet(computed=computed, streamed=True))
                    for computed in (True, False)
                )
                whole = first_sheet(computed=True, streamed=False)  # streams hide what is merged
        except Exception as error:  # a damaged workbook fails in the parser's own ways
            what = f"the file cannot be read as XLSX ({type(error).__name__})"
            mend = "open and save it again, or save it as CSV"
            raise _Unreadable(what, mend=mend) from None
        # Without a computed value a formula is better shown than called empty.
        self._rows = [
            [value or formula for value, formula in zip(*pair, strict=True)]
            for pair in zip(values, formulas, strict=True)
        ]
        self._merged = list(whole.merged_cells.ranges)

    def rows(self) -> Iterator[Row]:
        """Go through the rows from the first that is no comment."""
        begun = False
        for number, cells in enumerate(self._rows, start=1):
            begun = begun or (any(cells) and not next(filter(None, cells)).startswith("#"))
            if begun:
                yield number, cells

    def merged(self, header_line: int) -> list[tuple[int, str]]:
        """List merged cells from the header on: all but the first of each look empty."""
        found = [area for area in self._merged if area.max_row >= header_line]
        return sorted((area.min_row, str(area.coord)) for area in found)


def _streamed_rows(sheet: Any) -> list[list[str]]:
    sheet.reset_dimensions()
    rows = [[_cell(value) for value in row] for row in sheet.iter_rows(values_only=True)]
    sheet.parent.close()
    return rows


def _cell(value: object) -> str:
    if value is None:
        return ""
    if isinstance(value, datetime):
        return value.isoformat(sep=" ")
    return str(value).replace("\xa0", " ").strip()


def _shaped(file: str, rows: list[Row]) -> tuple[RawTable | None, list[Fault]]:
    """Cut blank trailing columns and see that no cell lies beyond the header."""
    if not rows:
        raise _Unreadable("the table is empty", given="no cells")
    (header_line, header), body = rows[0], rows[1:]
    while header and not header[-1]:
        header = header[:-1]
    width = len(header)
    faults = [
        Fault(file, header_line, f"column {place} has no header", mend="name it, or delete it")
        for place in _unnamed(header, body)
    ]
    for line, cells in body:
        beyond = [cell for cell in cells[width:] if cell]
        if beyond:
            what = f"the row has more cells than the header ({width})"
            mend = "a decimal comma in a comma-separated table? put the number in quotes"
            faults.append(Fault(file, line, what, repr(beyond[0]), mend=mend))
    if not body:
        what = "the table has a header but no rows"
        faults.append(Fault(file, header_line, what, mend=_LEAVE_OUT))
    padded = [(cells + [""] * width)[:width] for _, cells in body]
    return RawTable(header_line, header, [line for line, _ in body], padded), faults


def _unnamed(header: list[str], body: Iterable[Row]) -> list[int]:
    """List the columns, from 1, that have cells but no header."""
    places = [place for place, name in enumerate(header) if not name]
    return [
        place + 1
        for place in places
        if any(place < len(cells) and cells[place] for _, cells in body)
    ]
