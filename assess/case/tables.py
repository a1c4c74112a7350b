"""Survey tables: from rows of text to numbers in the tool's units, with every fault named."""

import math
import re
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from assess import units
from assess.case import doubts as doubting
from assess.case.forms import BoolArray, Column, EvidenceForm, FloatArray, Table, TextArray
from assess.case.rawtable import RawTable, read_rows
from assess.case.yamlfile import closest, listed, nearest
from assess.errors import Fault

COMMON = (
    Column("location", "where it was measured, as the survey calls it", required=False),
    Column("zone", "zone of the row", required=False),
    Column("section", "section at which it was measured", required=False),
    Column("note", "anything", required=False),
)
_UNCHECKED = Column("", "a column whose unit is unknown")
_NOTES = {"note", "notes", "remark", "remarks"}
_MOST_FAULTS = 20  # of one column
_Complaint = tuple[str, str, str, str]  # what, given, allowed, mend
_COMMA_NUMBER = re.compile(r"[+-]?\d*,\d+(?:[eE][+-]?\d+)?|[+-]?\d+,")
_BEYOND = re.compile(r"(?:>=|>|≥)\s*(.+)")
_BELOW = re.compile(r"(?:<=|<|≤)\s*(.+)")


def read_table(
    path: Path, form: EvidenceForm
) -> tuple[Table | None, tuple[Fault, ...], tuple[Fault, ...]]:
    """Read and check a survey table.

    Parameters
    ----------
    path : Path
        CSV or XLSX file; see `assess.case.rawtable.read_rows` for the dialects.
    form : EvidenceForm
        The kind of evidence, which says what columns it has.

    Returns
    -------
    table : Table or None
        In the columns' units; None if there is any fault.
    faults : tuple of Fault
        What makes the table unusable, each with its line.
    doubts : tuple of Fault
        What can be read but should be looked at. Outliers and what the form itself doubts are
        not in here, as they need the entry of the case file.
    """
    table, faults, doubts = examine_table(path, form)
    return (None if faults else table), faults, doubts


def examine_table(
    path: Path, form: EvidenceForm
) -> tuple[Table | None, tuple[Fault, ...], tuple[Fault, ...]]:
    """Read a survey table, keeping what could be read beside the faults.

    Parameters
    ----------
    path : Path
        As for `read_table`.
    form : EvidenceForm
        The kind of evidence.

    Returns
    -------
    table : Table or None
        What could be read, NaN elsewhere: for further checks only, if there is any fault.
    faults, doubts : tuple of Fault
        As for `read_table`; repetition is looked for in sound tables only.
    """
    raw, faults = read_rows(path)
    if raw is None:
        return None, tuple(faults), ()
    reading = _Reading(str(path), form, raw, faults)
    reading.headers()
    reading.cells()
    lines = np.array(raw.lines, dtype=np.int64)
    head = {written.column.name: written.unit for written in reading.written}
    read = (reading.numbers, reading.texts, reading.beyond, reading.below, reading.absent)
    table = Table(path, lines, *read, head)
    doubts = list(reading.doubts)
    for written in reading.written:
        if written.column.name not in reading.mistaken:
            doubts += doubting.unusual(table, written)
    if not reading.faults:
        doubts += doubting.repeated(form, table)
    return table, tuple(sorted(set(reading.faults))), tuple(sorted(set(doubts)))


@dataclass(slots=True)
class _Place:
    """Where a column stands in the file and the unit of its header."""

    index: int
    unit: str = units.NONE
    factor: float = 1.0
    sound: bool = True  # the header's unit could be read


@dataclass(slots=True)
class _Reading:
    """A table while it is read."""

    file: str
    form: EvidenceForm
    raw: RawTable
    faults: list[Fault]
    doubts: list[Fault] = field(default_factory=list)
    places: dict[str, _Place] = field(default_factory=dict)
    notes: list[int] = field(default_factory=list)
    numbers: dict[str, FloatArray] = field(default_factory=dict)
    texts: dict[str, TextArray] = field(default_factory=dict)
    beyond: dict[str, FloatArray] = field(default_factory=dict)
    below: dict[str, FloatArray] = field(default_factory=dict)
    absent: dict[str, BoolArray] = field(default_factory=dict)
    written: list[doubting.Written] = field(default_factory=list)
    mistaken: set[str] = field(default_factory=set)  # columns in another unit than the header's

    def fault(
        self, line: int, what: str, given: str = "", allowed: str = "", mend: str = ""
    ) -> None:
        self.faults.append(Fault(self.file, line, what, given, allowed, mend))

    # Headers ---------------------------------------------------------------------------------

    def headers(self) -> None:
        """Find each column and its unit."""
        columns = {units.header(c.name)[0]: c for c in (*self.form.columns, *COMMON)}
        line = self.raw.header_line
        misspelt: set[str] = set()
        for index, text in enumerate(self.raw.header):
            name, unit = units.header(text)
            if name in _NOTES:
                self.notes.append(index)
            elif name and name not in columns:
                known = [column.name for column in columns.values()]
                what = f"unknown column in a table of {self.form.title}"
                self.fault(line, what, repr(text), listed(known), nearest(name, known))
                misspelt.add(closest(name, known))
            elif name and columns[name].name in self.places:
                self.fault(line, f"column {name!r} stands twice", mend="keep one of the two")
            elif name:
                self._place(columns[name], index, unit)
        if not self.places and not misspelt - {""}:
            self._no_header()
            return
        for column in self.form.columns:
            if column.required and column.name not in {*self.places, *misspelt}:
                what = f"column {column.name!r} is missing"
                self.fault(line, what, mend=f"add {_head(column)}: {column.what}")

    def _no_header(self) -> None:
        """Say once that the first line is no header: a title, another sheet, another file."""
        what = f"this line is no header of a table of {self.form.title}"
        given = repr("; ".join(filter(None, self.raw.header))[:60])
        allowed = listed(_head(column) for column in self.form.columns)
        mend = "is it a title? begin it with #, or delete it"
        if others := listed(self.raw.sheets[1:]) if len(self.raw.sheets) > 1 else "":
            mend = f"only the first sheet is read ({self.raw.sheets[0]}): the table in {others}?"
        self.faults[:] = [Fault(self.file, self.raw.header_line, what, given, allowed, mend)]

    def _place(self, column: Column, index: int, unit: str | None) -> None:
        place = self.places[column.name] = _Place(index)
        if column.unit is None:
            return
        line, allowed = self.raw.header_line, units.customary(column.unit)
        if unit is None:
            if units.plain(column.unit) != units.NONE:
                mend = f"write {column.name} [{column.unit}]"
                self.fault(line, f"column {column.name!r} has no unit", "", allowed, mend)
                place.sound = False
            return
        try:
            place.unit, place.factor = unit, units.factor(unit, column.unit)
        except units.QuantityError as error:
            what = f"column {column.name!r} has {_with_article(error.what)}"
            place.unit, place.sound = units.NONE, False
            self.fault(line, what, error.given, error.allowed)

    # Cells -----------------------------------------------------------------------------------

    def cells(self) -> None:
        """Read all columns; those the file has not are empty."""
        for column in (*self.form.columns, *COMMON):
            place = self.places.get(column.name)
            if column.name == "note":
                cells = [
                    "; ".join(filter(None, (row[i] for i in self.notes))) for row in self.raw.rows
                ]
            elif place is None:
                cells = [""] * len(self.raw.rows)
            else:
                cells = [row[place.index] for row in self.raw.rows]
            wanted = column.required and place is not None
            if column.unit is None:
                self._text_column(column, cells, wanted)
            else:
                self._number_column(column, cells, wanted, place)

    def _complain(self, column: Column, complaints: list[tuple[int, str, str, str, str]]) -> None:
        for row, what, given, allowed, mend in complaints[:_MOST_FAULTS]:
            what = f"column {column.name!r}: {what}"
            self.fault(self.raw.lines[row], what, given, allowed, mend)
        if len(complaints) > _MOST_FAULTS:
            row, rest = complaints[_MOST_FAULTS][0], len(complaints) - _MOST_FAULTS
            self.fault(self.raw.lines[row], f"column {column.name!r}: {rest} more faults from here")

    def _text_column(self, column: Column, cells: list[str], wanted: bool) -> None:
        complaints: list[tuple[int, str, str, str, str]] = []
        choices = {choice.lower(): choice for choice in column.choices}
        for row, cell in enumerate(cells):
            if not cell:
                if wanted:
                    complaints.append(
                        (
                            row,
                            "the cell is empty",
                            "",
                            listed(choices.values()) if choices else "",
                            column.what,
                        )
                    )
            elif choices:
                if cell.lower() in choices:
                    cells[row] = choices[cell.lower()]
                else:
                    allowed, mend = listed(choices.values()), nearest(cell, choices.values())
                    complaints.append((row, "no such choice", repr(cell), allowed, mend))
        self._complain(column, complaints)
        self.texts[column.name] = np.array(cells, dtype=np.str_)

    def _number_column(
        self, column: Column, cells: list[str], wanted: bool, place: _Place | None
    ) -> None:
        values, refused, beyond, below = (np.full(len(cells), np.nan) for _ in range(4))
        absent = np.zeros(len(cells), dtype=bool)
        complaints: list[tuple[int, str, str, str, str]] = []
        outside: dict[int, _Complaint] = {}
        words = {word.lower() for word in column.absent}
        factor, unit = (place.factor, place.unit) if place else (1.0, units.NONE)
        sound = place is not None and place.sound
        check = _range_check(column if sound else _UNCHECKED, factor, unit)
        for row, cell in enumerate(cells):
            if not cell:
                if wanted:
                    mend = f"write {column.absent[0]!r} if none was found" if words else column.what
                    complaints.append((row, "the cell is empty", "", "a number", mend))
                continue
            if cell.lower() in words:
                absent[row] = True
                continue
            over = _BEYOND.fullmatch(cell) if column.censored else None
            under = _BELOW.fullmatch(cell) if column.below_detection else None
            bound = over or under
            number = _number(bound[1] if bound else cell)
            if isinstance(number, float):
                number *= factor
                complaint = check(number, cell)
                if complaint is None:
                    (beyond if over else below if under else values)[row] = number
                else:
                    outside[row], refused[row] = complaint, number
            else:
                complaints.append((row, *_no_number(cell, number, column)))
        if sound:
            written = doubting.Written(column, unit, values, refused)
            self.written.append(written)
            outside = self._in_other_units(written, outside)
        self._complain(column, sorted([*complaints, *((row, *c) for row, c in outside.items())]))
        self._mixed(column, cells)
        self.numbers[column.name] = values
        if column.censored:
            self.beyond[column.name] = beyond
        if column.below_detection:
            self.below[column.name] = below
        if column.absent:
            self.absent[column.name] = absent

    def _in_other_units(
        self, written: doubting.Written, outside: dict[int, _Complaint]
    ) -> dict[int, _Complaint]:
        """Say which unit explains numbers that are out of range; once, if it is the header's."""
        if fault := doubting.mistaken_unit(self.file, self.raw.header_line, written):
            self.faults.append(fault)
            self.mistaken.add(written.column.name)
            return {}
        said = {}
        for row, (what, given, allowed, mend) in outside.items():
            number = float(written.refused[row]) if written.refused is not None else math.nan
            looks = doubting.other_units(written, number)
            said[row] = (what, given, allowed, f"written in {looks}?" if looks else mend)
        return said

    def _mixed(self, column: Column, cells: list[str]) -> None:
        """Doubt a column that has both decimal commas and decimal points."""
        commas = [
            row for row, cell in enumerate(cells) if "," in cell and _COMMA_NUMBER.fullmatch(cell)
        ]
        if commas and any("." in cell for cell in cells):
            what = f"column {column.name!r} has both decimal commas and decimal points"
            line, given = self.raw.lines[commas[0]], repr(cells[commas[0]])
            self.doubts.append(
                Fault(self.file, line, what, given, mend="is the comma a decimal one?")
            )


def _head(column: Column) -> str:
    return column.name + (f" [{column.unit}]" if column.unit else "")


def _with_article(what: str) -> str:
    return f"an {what}" if what.startswith("unknown") else what


def _number(cell: str) -> float | str:
    """Read a number with decimal point or comma; otherwise say what it is instead."""
    if _COMMA_NUMBER.fullmatch(cell):
        cell = cell.replace(",", ".")
    try:
        number = float(cell) if "_" not in cell else None
    except ValueError:
        number = None
    if number is None:
        return "text"
    return number if math.isfinite(number) else "not finite"


def _no_number(cell: str, kind: str, column: Column) -> _Complaint:
    """Say why a cell is no number, and what was probably meant."""
    shown = repr(cell if len(cell) <= 40 else cell[:37] + "...")
    if kind == "not finite":
        return "not a finite number", shown, "a number", "leave the row out, or find the value"
    allowed = "a number"
    if column.absent:
        allowed += f", or {listed(column.absent)}"
    if column.censored:
        allowed += ", or such as >80 for at least that much"
    if column.below_detection:
        allowed += ", or such as <0.01 for less than that"
    mend = ""
    if cell.startswith("="):
        what = "a formula that was never computed"
        return what, shown, allowed, "open and save the workbook in a spreadsheet program"
    if re.fullmatch(r"\d{4}-\d\d-\d\d[ T]?[\d:.]*", cell):
        mend = "a date? give the cells the format of numbers, and type the number anew"
        return "a date where a number is wanted", shown, allowed, mend
    if _BEYOND.fullmatch(cell) or _BELOW.fullmatch(cell):
        return "cannot be a bound", shown, allowed, mend
    if re.fullmatch(r"[+-]?\d{1,3}([.,' ]\d{3})+([.,]\d+)?", cell):
        mend = "write it without marks for the thousands"
    elif re.fullmatch(r"[+-]?[\d.,]+\s*[A-Za-zµ°%\"]\S*", cell):
        mend = "put the unit in the header, not in the cell"
    return "text where a number is wanted", shown, allowed, mend


def _range_check(
    column: Column, factor: float, unit: str
) -> Callable[[float, str], _Complaint | None]:
    """Prepare the check of a number against what the column allows, in the header's unit."""
    above = -math.inf if column.above is None else column.above
    below = math.inf if column.below is None else column.below
    shown = "" if units.plain(unit) == units.NONE else f" {unit}"
    bounds = []
    if math.isfinite(above):
        bounds.append(f"more than {above / factor:g}")
    if math.isfinite(below):
        bounds.append(f"less than {below / factor:g}")
    allowed = " and ".join(bounds) + shown

    def check(number: float, cell: str) -> _Complaint | None:
        if above < number < below:
            return None
        return "is out of range" if bounds else "not a finite number", cell, allowed, ""

    return check
