"""What must not matter to any kind of evidence: order of rows, units, how a survey is filed."""

import copy
from collections.abc import Mapping
from importlib import import_module
from pathlib import Path
from pkgutil import iter_modules
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from assess.case.reader import Case
from assess.updating.kinds import KINDS
from assess.updating.model import Spec, specify
from tests.verification import designs
from tests.verification.cases import base, read
from tests.verification.design import Design

NAMES = sorted(module.name for module in iter_modules(designs.__path__))
FEW = settings(
    max_examples=4,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
    derandomize=True,
)
# Written with another unit: header as it stands, as it becomes, factor on the numbers.
UNITS = {
    "[MPa]": ("[psi]", 145.03773773),
    "[mm]": ("[in]", 1.0 / 25.4),
    "[km/s]": ("[ft/s]", 3280.839895),
    "[kN*m]": ("[kip*ft]", 0.7375621493),
}


def _design(name: str) -> Design:
    design: Design = import_module(f"{designs.__name__}.{name}").DESIGN
    return design


def _case(
    design: Design,
    folder: Path,
    tables: Mapping[str, str],
    surveys: Any = None,
) -> Case:
    case = base(corrosion=design.corrosion, surveys=surveys or design.surveys)
    case["zones"]["deck"] |= copy.deepcopy(dict(design.zone))
    return read(folder, case | copy.deepcopy(dict(design.case)), tables)


def _densities(design: Design, spec: Spec) -> np.ndarray:
    """Log-likelihood of the design's kind at some draws of the prior."""
    kind, rows = KINDS[design.kind], spec.rows[design.kind]
    scores = np.random.default_rng(6).normal(size=(5, len(spec.prior.names)))
    # Names in one order, whatever the order in which places appear.
    order = np.argsort(spec.prior.names)
    shuffled = np.empty_like(scores)
    shuffled[:, order] = scores
    physical = spec.prior.physical(shuffled)
    values = dict(zip(spec.prior.names, physical.T, strict=True))
    return np.asarray(kind.log_likelihood(rows, values, kind.data(rows, len(design.surveys))))


def _parts(table: str) -> tuple[list[str], list[str]]:
    """Comments and header, and the rows."""
    lines = table.strip().splitlines()
    head = next(i for i, line in enumerate(lines) if not line.startswith("#"))
    return lines[: head + 1], lines[head + 1 :]


@pytest.mark.parametrize("name", NAMES)
@FEW
@given(seed=st.integers(0, 10_000))
def test_order_of_rows_does_not_matter(name: str, tmp_path: Path, seed: int) -> None:
    design, rng = _design(name), np.random.default_rng(seed)
    mixed = {}
    for file, table in design.tables.items():
        head, rows = _parts(table)
        mixed[file] = "\n".join([*head, *(rows[i] for i in rng.permutation(len(rows)))]) + "\n"
    before = _densities(design, specify(_case(design, tmp_path / "a", design.tables)))
    after = _densities(design, specify(_case(design, tmp_path / "b", mixed)))
    np.testing.assert_allclose(after, before, rtol=1e-9, atol=1e-9)


@pytest.mark.parametrize("name", NAMES)
def test_unit_of_entry_does_not_matter(name: str, tmp_path: Path) -> None:
    design = _design(name)
    changed, anything = {}, False
    for file, table in design.tables.items():
        head, rows = _parts(table)
        mark = ";" if ";" in head[-1] else ","
        columns = head[-1].split(mark)
        for k, column in enumerate(columns):
            for unit, (other, factor) in UNITS.items():
                if unit not in column:
                    continue
                anything = True
                columns[k] = column.replace(unit, other)
                for i, row in enumerate(rows):
                    cells = row.split(mark)
                    cells[k] = _scaled(cells[k], factor)
                    rows[i] = mark.join(cells)
        changed[file] = "\n".join([*head[:-1], mark.join(columns), *rows]) + "\n"
    if not anything:
        pytest.skip("no column of this design has a unit of length, stress, speed or moment")
    before = _densities(design, specify(_case(design, tmp_path / "a", design.tables)))
    after = _densities(design, specify(_case(design, tmp_path / "b", changed)))
    # Densities of readings change with the unit that errors are stated in only by rounding.
    np.testing.assert_allclose(after, before, rtol=1e-6, atol=1e-6)


def _scaled(cell: str, factor: float) -> str:
    sign = cell[:1] if cell[:1] in "<>" else ""
    try:
        return f"{sign}{float(cell[len(sign) :]) * factor:.12g}"
    except ValueError:
        return cell  # words, or empty


# A table of half-cell potentials is worth a stated number of points, shared out over its rows. The
# local values of chloride profiles are measured from where each profile puts them: cut in two it
# puts them elsewhere, and densities agree only when integrated.
WHOLE = {"half_cell", "chloride_profile"}


@pytest.mark.parametrize("name", [name for name in NAMES if name not in WHOLE])
@FEW
@given(share=st.floats(0.1, 0.9))
def test_a_survey_filed_as_two_of_one_date_says_the_same(
    name: str, tmp_path: Path, share: float
) -> None:
    design = _design(name)
    surveys, tables = [], dict(design.tables)
    for number, survey in enumerate(design.surveys):
        if design.kind not in survey or number:
            surveys.append(survey)
            continue
        entry = survey[design.kind]
        head, rows = _parts(tables.pop(entry["table"]))
        if len(rows) < 2:
            pytest.skip("the design's first table has one row")
        cut = min(max(1, round(share * len(rows))), len(rows) - 1)
        for part, some in (("x.csv", rows[:cut]), ("y.csv", rows[cut:])):
            tables[part] = "\n".join([*head, *some]) + "\n"
        others = {key: value for key, value in survey.items() if key != design.kind}
        surveys.append({**others, design.kind: {**entry, "table": "x.csv"}})
        surveys.append({"date": survey["date"], design.kind: {**entry, "table": "y.csv"}})
    before = specify(_case(design, tmp_path / "a", design.tables))
    after = specify(_case(design, tmp_path / "b", tables, surveys))
    np.testing.assert_allclose(
        _densities(design, after), _densities(design, before), rtol=1e-9, atol=1e-9
    )
