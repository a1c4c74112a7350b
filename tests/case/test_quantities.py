from typing import Any

import pytest
from pydantic import TypeAdapter, ValidationError

from assess.case.quantities import (
    CoefficientOfVariation,
    CurrentDensity,
    Force,
    Fraction,
    InUnit,
    Length,
    Moment,
    Stress,
    Years,
)


def read(kind: Any, value: object) -> float:
    number = TypeAdapter(kind).validate_python(value)
    assert isinstance(number, float)
    return number


@pytest.mark.parametrize(
    ("kind", "value", "expected"),
    [
        (Length, "4 cm", 40.0),
        (Length, 40, 40.0),
        (Stress, "35 MPa", 35.0),
        (Moment, "1 kN*m", 1e6),
        (Force, "2 kN", 2000.0),
        (Force, 0, 0.0),
        (CurrentDensity, "1 mA/m^2", 0.1),
        (Years, "5 yr", 5.0),
        (Fraction, "15 %", 0.15),
        (Fraction, 0.15, 0.15),
        (Fraction, 0, 0.0),
        (Fraction, 1, 1.0),
        (CoefficientOfVariation, 2, 2.0),
    ],
)
def test_read(kind: Any, value: object, expected: float) -> None:
    assert read(kind, value) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(
    ("kind", "value", "message"),
    [
        (Length, "-4 cm", "a length is out of range, given -4 cm, allowed more than 0 mm"),
        (Length, 0, "given 0, allowed more than 0 mm"),
        (Stress, "35 mm", "does not convert to MPa, given '35 mm'"),
        (Fraction, 15, r"given 15, allowed at least 0 and at most 1, \(in percent\? write 0.15\)"),
        (Fraction, "150 %", "given 150 %, allowed at least 0 and at most 1$"),
        (CoefficientOfVariation, 20, r"more than 0 and at most 2, \(in percent\? write 0.2\)"),
        (CoefficientOfVariation, 0, "given 0, allowed more than 0 and at most 2$"),
        (Years, True, "not a quantity, given True"),
    ],
)
def test_refuse(kind: Any, value: object, message: str) -> None:
    with pytest.raises(ValidationError) as caught:
        TypeAdapter(kind).validate_python(value)
    (error,) = caught.value.errors()
    assert isinstance(error["ctx"]["error"], ValueError)
    with pytest.raises(ValueError, match=message):
        raise error["ctx"]["error"]


def test_schema_takes_text_or_number_and_shows_the_unit() -> None:
    schema = TypeAdapter(Length).json_schema()
    assert schema["anyOf"] == [{"type": "number", "exclusiveMinimum": 0.0}, {"type": "string"}]
    assert "[mm]" in schema["description"]


def test_range_in_words() -> None:
    assert InUnit("mm", "x").range() == "any number mm"
    assert InUnit("-", "x", at_least=1.0, below=3.0).range() == "at least 1 and less than 3"
