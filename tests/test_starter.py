import csv
import json
from pathlib import Path

import jsonschema
import pytest
import yaml

from assess.case.spec import IndexTarget
from assess.errors import CaseError
from assess.pipeline import check_case
from assess.starter import SCHEMA, TABLES, write_starter

FILES = {
    "configs/pier-3_east.yaml",
    f"configs/{SCHEMA}",
    *(f"case_data/pier-3_east/{table}" for table in TABLES.values()),
}


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    write_starter("pier-3_east", tmp_path)
    return tmp_path


def rows(folder: Path, kind: str) -> list[dict[str, str]]:
    text = (folder / "case_data" / "pier-3_east" / TABLES[kind]).read_text(encoding="utf-8")
    return list(csv.DictReader(line for line in text.splitlines() if not line.startswith("#")))


def test_writes_what_it_says(tmp_path: Path) -> None:
    written = write_starter("pier-3_east", tmp_path)
    assert {path.relative_to(tmp_path).as_posix() for path in written} == FILES
    assert all(path.is_file() for path in written)


def test_case_is_sound_and_undoubted(folder: Path) -> None:
    reading = check_case(folder / "configs" / "pier-3_east.yaml")
    assert (reading.faults, reading.doubts) == ((), ())
    case = reading.case
    assert case is not None
    assert case.spec.structure.invented
    assert len(case.spec.sections()) == 2
    assert not isinstance(case.spec.decision.target, IndexTarget)
    assert {item.kind for item in case.evidence} == set(TABLES)


def test_a_survey_row_speaks_of_a_section(folder: Path) -> None:
    case = check_case(folder / "configs" / "pier-3_east.yaml").case
    assert case is not None
    for item in case.evidence:
        assert set(item.section) & set(case.spec.sections()), item.kind


def test_tables_show_what_tables_may_say(folder: Path) -> None:
    cover, loss = rows(folder, "cover"), rows(folder, "section_loss")
    assert len(rows(folder, "cores")) >= 8
    assert 30 <= len(cover) <= 60
    assert [row["cover [mm]"] for row in cover].count(">80") == 1
    assert 6 <= len(loss) <= 8
    assert "none" in [row["residual diameter [mm]"] for row in loss]


def test_everything_says_that_it_is_invented(folder: Path) -> None:
    for path in folder.rglob("*"):
        if path.is_file() and path.name != SCHEMA:
            assert "invented" in path.read_text(encoding="utf-8").lower(), path


def test_every_key_that_has_a_unit_or_a_choice_is_explained(folder: Path) -> None:
    text = (folder / "configs" / "pier-3_east.yaml").read_text(encoding="utf-8")
    # Either a comment on the key's line or on the line above it.
    lines = text.splitlines()
    for key in (
        *("built", "assessed", "horizon", "grade", "production", "cover", "onset"),
        *("onset_scatter", "current", "current_scatter", "attack", "mean", "sd", "local_sd"),
        *("correction", "within_location", "bias", "scatter", "detection_limit", "error"),
        *("depth", "width", "link_diameter", "count", "diameter", "steel", "permanent"),
        *("variable", "period", "efficiency", "factor", "failure", "discount_rate", "draws"),
    ):
        places = [n for n, line in enumerate(lines) if line.lstrip("- ").startswith((f"{key}:",))]
        assert places, key
        assert any("#" in lines[n] or lines[n - 1].lstrip().startswith("#") for n in places), key


def test_editors_find_the_schema_and_the_case_fits_it(folder: Path) -> None:
    path = folder / "configs" / "pier-3_east.yaml"
    text = path.read_text(encoding="utf-8")
    assert text.splitlines()[0] == f"# yaml-language-server: $schema={SCHEMA}"
    schema = json.loads((path.parent / SCHEMA).read_text(encoding="utf-8"))
    jsonschema.Draft202012Validator.check_schema(schema)
    # A plain YAML reader takes dates for dates; an editor sees the text.
    data = yaml.load(text, Loader=yaml.BaseLoader)
    assert "@" not in text
    assert data["surveys"][0]["date"] == "2025-09-16"


def test_nothing_is_overwritten(folder: Path) -> None:
    case = folder / "configs" / "pier-3_east.yaml"
    case.write_text("mine", encoding="utf-8")
    with pytest.raises(CaseError, match=r"pier-3_east\.yaml: the file exists already"):
        write_starter("pier-3_east", folder)
    assert case.read_text(encoding="utf-8") == "mine"


def test_a_table_in_the_way_leaves_all_unwritten(tmp_path: Path) -> None:
    table = tmp_path / "case_data" / "b" / TABLES["cores"]
    table.parent.mkdir(parents=True)
    table.write_text("mine", encoding="utf-8")
    with pytest.raises(CaseError, match="cores_2025.csv: the file exists already"):
        write_starter("b", tmp_path)
    assert [path for path in tmp_path.rglob("*") if path.is_file()] == [table]


def test_a_second_case_stands_beside_the_first(folder: Path) -> None:
    before = (folder / "configs" / "pier-3_east.yaml").read_bytes()
    write_starter("other", folder)
    assert (folder / "configs" / "pier-3_east.yaml").read_bytes() == before
    assert check_case(folder / "configs" / "other.yaml").case is not None


@pytest.mark.parametrize(
    "name", ["", " ", "a b", "../up", "a/b", "a.yaml", "-x", "_x", "brücke", "a\n", "x" * 61]
)
def test_odd_names_are_refused(name: str, tmp_path: Path) -> None:
    with pytest.raises(CaseError, match="a case cannot have this name, given .*, allowed letters"):
        write_starter(name, tmp_path)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("name", ["a", "A1", "3rd-bridge", "x" * 60])
def test_plain_names_are_taken(name: str, tmp_path: Path) -> None:
    assert (tmp_path / "configs" / f"{name}.yaml") in write_starter(name, tmp_path)
