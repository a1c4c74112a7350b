import pytest
from pydantic import Field, TypeAdapter, ValidationError

from assess.case.forms import Closed
from assess.case.wording import faults_of, short
from assess.case.yamlfile import Document


class Inner(Closed):
    count: int = Field(ge=1, le=9, description="how many")


class Outer(Closed):
    either: int | float | str = 0
    parts: tuple[Inner, ...] = Field((), max_length=2)
    by_number: dict[float, int] = {}
    text: str = Field("x", min_length=1, pattern="^x")


def complaints(data: dict[str, object], lines: dict[tuple[object, ...], int]) -> list[str]:
    models: dict[int, type[Closed]] = {}
    with pytest.raises(ValidationError) as caught:
        TypeAdapter(Outer).validate_python(data, context=models)
    return [str(one) for one in faults_of(caught.value, Document("f", data, lines), models)]


def test_a_value_that_fits_no_branch_of_a_union_is_one_fault() -> None:
    (said,) = complaints({"either": [1]}, {("either",): 4})
    assert said.startswith("f:4: either: fits none of what it may be, given a list of 1, allowed")
    assert "a whole number or" in said
    assert "text" in said


def test_place_in_lists_and_bounds() -> None:
    said = complaints({"parts": [{"count": 3}, {"count": 30}]}, {("parts", 1, "count"): 7})
    assert said == ["f:7: parts.#2.count: is out of range, given 30, allowed at most 9"]


def test_a_long_list_is_refused_but_a_list_with_faulty_items_only_for_these() -> None:
    (said,) = complaints({"parts": [{"count": 1}] * 3}, {})
    assert "parts: needs at most 2, given 3" in said


def test_numeric_keys_are_found_again() -> None:
    (said,) = complaints({"by_number": {0.5: "many"}}, {("by_number", 0.5): 9})
    assert said == "f:9: by_number.0.5: must be a whole number, given many"


def test_missing_key_says_what_it_is() -> None:
    (said,) = complaints({"parts": [{}]}, {("parts", 0): 3})
    assert said == "f:3: parts.#1.count: this key is missing, add count: (how many)"


def test_other_complaints_keep_their_words() -> None:
    (said,) = complaints({"text": "y"}, {})
    assert "text: cannot be used (String should match pattern" in said
    (said,) = complaints({"text": ""}, {})
    assert "text: must not be empty" in said


@pytest.mark.parametrize(
    ("value", "shown"),
    [
        (None, "nothing"),
        (True, "true"),
        ([1, 2], "a list of 2"),
        ({"a": 1}, "a mapping with a"),
        ("y" * 100, "y" * 57 + "..."),
    ],
)
def test_short(value: object, shown: str) -> None:
    assert short(value) == shown
