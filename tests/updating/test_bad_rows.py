"""Every kind's table with something wrong in it: a fault that names the file, and the line."""

import copy
from collections.abc import Callable
from importlib import import_module
from pathlib import Path
from pkgutil import iter_modules
from typing import Any

import pytest

from assess.errors import Fault
from assess.pipeline import check_case
from assess.updating.kinds import KINDS
from tests.verification import designs
from tests.verification.cases import base, write_case
from tests.verification.design import Design

NAMES = sorted(module.name for module in iter_modules(designs.__path__))
Rows = list[list[str]]  # cells of the header and of the rows


def _faults(
    name: str,
    folder: Path,
    spoil: Callable[[Rows, Design], Rows] = lambda rows, _: rows,
    entry: dict[str, Any] | None = None,
) -> tuple[list[Fault], str]:
    """Read the case of a design whose first table was spoiled; give its faults and the file."""
    design: Design = import_module(f"{designs.__name__}.{name}").DESIGN
    surveys = copy.deepcopy(list(design.surveys))
    stated = next(s[design.kind] for s in surveys if design.kind in s)
    stated |= entry or {}
    file = stated["table"]
    lines = design.tables[file].strip().splitlines()
    head = next(i for i, line in enumerate(lines) if not line.startswith("#"))
    mark = ";" if ";" in lines[head] else ","
    rows = spoil([line.split(mark) for line in lines[head:]], design)
    tables = {**design.tables, file: "\n".join(mark.join(row) for row in rows) + "\n"}
    case = base(corrosion=design.corrosion, surveys=surveys)
    case["zones"]["deck"] |= copy.deepcopy(dict(design.zone))
    path = write_case(folder, case | copy.deepcopy(dict(design.case)), tables)
    return list(check_case(path).faults), file


def _value_column(rows: Rows, design: Design) -> int:
    wanted = KINDS[design.kind].form.value
    return next(k for k, cell in enumerate(rows[0]) if cell.split("[")[0].strip() == wanted)


def test_the_tables_are_sound_before_they_are_spoiled(tmp_path: Path) -> None:
    for name in NAMES:
        assert _faults(name, tmp_path / name)[0] == []


@pytest.mark.parametrize("name", NAMES)
def test_a_missing_column_is_named(name: str, tmp_path: Path) -> None:
    form = KINDS[import_module(f"{designs.__name__}.{name}").DESIGN.kind].form
    required = [column.name for column in form.columns if column.required]
    if not required:
        pytest.skip("each row needs one of several columns; see the tests of the kind")

    def without(rows: Rows, design: Design) -> Rows:
        lost = next(
            k for k, cell in enumerate(rows[0]) if cell.split("[")[0].strip() == required[0]
        )
        return [row[:lost] + row[lost + 1 :] for row in rows]

    faults, file = _faults(name, tmp_path, without)
    assert any(f.file.endswith(file) and required[0] in str(f) for f in faults)


@pytest.mark.parametrize("name", NAMES)
def test_a_wrong_unit_is_named_in_its_line(name: str, tmp_path: Path) -> None:
    def heavy(rows: Rows, design: Design) -> Rows:
        k = _value_column(rows, design)
        head = [*rows[0]]
        head[k] = head[k].split("[")[0].strip() + " [kg]"
        return [head, *rows[1:]]

    faults, file = _faults(name, tmp_path, heavy)
    assert any(f.file.endswith(file) and f.line == 1 and "kg" in str(f) for f in faults)


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("value", ["-5", "1e9", "nan", "many"])
def test_an_impossible_value_is_named_in_its_line(name: str, value: str, tmp_path: Path) -> None:
    if (name, value) in {("annual_maxima", "1e9"), ("half_cell", "-5")}:
        pytest.skip("a load effect has no bound above; a potential may be any below zero")

    def wrong(rows: Rows, design: Design) -> Rows:
        k = _value_column(rows, design)
        rows[1][k] = value
        return rows

    faults, file = _faults(name, tmp_path, wrong)
    assert any(f.file.endswith(file) and f.line == 2 for f in faults)


@pytest.mark.parametrize("name", NAMES)
def test_a_table_without_rows_is_a_fault(name: str, tmp_path: Path) -> None:
    faults, file = _faults(name, tmp_path, lambda rows, _: rows[:1])
    assert any(f.file.endswith(file) and "no rows" in str(f) for f in faults)


@pytest.mark.parametrize(
    "name",
    [n for n in NAMES if KINDS[import_module(f"{designs.__name__}.{n}").DESIGN.kind].form.zoned],
)
def test_an_unknown_zone_or_section_is_a_fault(name: str, tmp_path: Path) -> None:
    faults, _ = _faults(name, tmp_path / "zone", entry={"zone": "dock"})
    assert any("dock" in str(f) and "'deck'" in str(f) for f in faults)

    def elsewhere(rows: Rows, design: Design) -> Rows:
        names = [cell.split("[")[0].strip() for cell in rows[0]]
        if "section" in names:
            return [
                rows[0],
                *(
                    [*row[: names.index("section")], "S9", *row[names.index("section") + 1 :]]
                    for row in rows[1:2]
                ),
                *rows[2:],
            ]
        return [[*rows[0], "section"], [*rows[1], "S9"], *([*row, ""] for row in rows[2:])]

    faults, file = _faults(name, tmp_path / "section", elsewhere)
    assert any(f.file.endswith(file) and f.line == 2 and "S9" in str(f) for f in faults)
