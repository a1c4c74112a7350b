import subprocess
import sys
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import jsonschema
import pytest

from assess.case.forms import Vocabulary
from assess.case.schema import case_model, json_schema, section_keys, spread_defaults
from assess.case.yamlfile import read_yaml


@pytest.fixture
def schema(vocabulary: Vocabulary) -> dict[str, Any]:
    return json_schema(vocabulary)


@pytest.fixture
def checker(schema: dict[str, Any]) -> jsonschema.Draft202012Validator:
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def test_sound_case_fits_the_schema(
    write_case: Callable[..., Path], checker: jsonschema.Draft202012Validator
) -> None:
    document, _ = read_yaml(write_case())
    assert document is not None
    assert [error.message for error in checker.iter_errors(document.data)] == []


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("grade: C35", "grade: C36"),
        ("width: 400 mm", "widht: 400 mm"),
        ("depth: 900 mm", "dpeth: 900 mm"),
        ("attack: pitting", "attack: rust"),
        ("horizon: 30", "horizon: 300"),
        ("kind: limit load", "kind: limitload"),
        ("sd: 30 MPa", "sd: [30]"),
        ("distribution: normal", "distribution: norml"),
    ],
)
def test_schema_refuses_what_the_reader_refuses(
    write_case: Callable[..., Path],
    checker: jsonschema.Draft202012Validator,
    old: str,
    new: str,
) -> None:
    document, _ = read_yaml(write_case((old, new)))
    assert document is not None
    assert list(checker.iter_errors(document.data))


def properties(node: Any) -> Iterator[tuple[str, dict[str, Any]]]:
    if isinstance(node, dict):
        for name, value in node.get("properties", {}).items():
            yield name, value
        for value in node.values():
            yield from properties(value)
    elif isinstance(node, list):
        for item in node:
            yield from properties(item)


def test_quantities_show_their_unit_and_take_text(schema: dict[str, Any]) -> None:
    definitions = schema["$defs"]
    nominal = definitions["NominalCover"]["properties"]["nominal"]
    assert nominal["description"] == "nominal cover on the drawings [mm]"
    assert {"type": "string"} in nominal["anyOf"]
    median = definitions["CurrentDistribution"]["properties"]["mean"]
    assert median["description"].endswith("[µA/cm^2]")
    assert "x-unit" not in str(schema)


def test_every_property_is_described(schema: dict[str, Any]) -> None:
    bare = {
        name
        for name, value in properties(schema)
        if "description" not in value and "$ref" not in value and "anyOf" not in value
    }
    assert bare <= {"name", "zone", "table"}  # of the base forms, which the kinds may describe


def test_model_describes_every_field_of_its_own(vocabulary: Vocabulary) -> None:
    import assess.case.spec as spec

    for name in ("Structure", "Zone", "Corrosion", "Steel", "Survey", "Member", "Dependence"):
        for field, info in getattr(spec, name).model_fields.items():
            assert info.description, f"{name}.{field}"
    for field, info in case_model(vocabulary).model_fields.items():
        assert info.description, field


def test_defaults_go_to_the_sections_that_know_them(
    write_case: Callable[..., Path], vocabulary: Vocabulary
) -> None:
    document, _ = read_yaml(write_case())
    assert document is not None
    spread = spread_defaults(document, vocabulary)
    (member,) = spread.data["members"]
    assert set(member) == {"name", "sections"}
    bending, shear = member["sections"]
    assert (bending["depth"], shear["depth"]) == ("900 mm", 850)
    assert (bending["zone"], shear["zone"]) == ("soffit", "soffit")
    assert "steel" not in shear  # shear does not know it
    assert "zone" not in document.data["members"][0]["sections"][0]  # the file stays as read
    place = ("members", 0, "sections", 0, "depth")
    assert spread.line(place) == 30
    assert spread.label(place) == "members.girder 2.depth"


def test_keys_of_sections(vocabulary: Vocabulary) -> None:
    assert "web" in section_keys(vocabulary, "shear")
    assert "web" not in section_keys(vocabulary, "bending")
    assert {"web", "bars"} <= section_keys(vocabulary, "unknown")


def test_a_vocabulary_of_one_or_no_kind(vocabulary: Vocabulary) -> None:
    bending = {"bending": vocabulary.limit_states["bending"]}
    small = Vocabulary({}, bending, {}, vocabulary.targets, vocabulary.concrete_grades)
    assert "surveys" in case_model(small).model_fields
    jsonschema.Draft202012Validator.check_schema(json_schema(small))


def test_reading_loads_nothing_heavy() -> None:
    heavy = ("pymc", "pytensor", "matplotlib", "arviz", "xarray", "openpyxl", "pandas", "pint")
    code = (
        "import sys, assess.case.reader, assess.case.schema;"
        f"sys.exit(', '.join(m for m in {heavy!r} if m in sys.modules) or None)"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert (run.returncode, run.stderr) == (0, "")
