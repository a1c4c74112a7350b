"""Quantities of a case file: numbers that were read with their unit and checked.

Each is a plain ``float`` after reading; in the file it is text (``40 mm``) or a number in the
unit of its key.
"""

import math
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema, core_schema

from assess import units
from assess.units import NONE, QuantityError

_LARGEST = 1e20  # in any unit of the tool: nothing built comes near, and squares stay finite


@dataclass(frozen=True, slots=True)
class InUnit:
    """How a quantity is read: its unit inside the tool and the range it may have.

    Use as ``Annotated[float, InUnit("mm", "a length", above=0.0)]``.
    """

    unit: str
    name: str  # with its article, for messages: "a length"
    above: float = -math.inf  # allowed: value > above
    at_least: float = -math.inf  # allowed: value >= at_least
    below: float = math.inf  # allowed: value < below
    at_most: float = math.inf  # allowed: value <= at_most
    usual: tuple[float, float] | None = None  # outside: a doubt

    def read(self, value: object) -> float:
        """Read a value, raising `QuantityError` where it cannot be used."""
        number = units.convert(value, self.unit)
        if abs(number) > _LARGEST:
            unit = "" if self.unit == NONE else f" {self.unit}"
            what, allowed = f"{self.name} is out of all proportion", f"up to {_LARGEST:g}{unit}"
            raise QuantityError(what, str(value)[:40], allowed, "check the number and its unit")
        if self._holds(number):
            return number
        mend = ""
        if self.unit == NONE and not isinstance(value, str) and self._holds(number / 100.0):
            mend = f"(in percent? write {number / 100.0:g})"
        raise QuantityError(f"{self.name} is out of range", str(value), self.range(), mend)

    def range(self) -> str:
        """Say the allowed range in words, with the unit."""
        low = "more than {:g}" if self.above > self.at_least else "at least {:g}"
        high = "less than {:g}" if self.below < self.at_most else "at most {:g}"
        bounds = [
            text.format(value)
            for text, value in (
                (low, max(self.above, self.at_least)),
                (high, min(self.below, self.at_most)),
            )
            if math.isfinite(value)
        ]
        unit = "" if self.unit == NONE else f" {self.unit}"
        return (" and ".join(bounds) + unit) if bounds else f"any number{unit}"

    def _holds(self, number: float) -> bool:
        return (
            self.above < number < self.below and self.at_least <= number <= self.at_most
        ) and math.isfinite(number)

    def __get_pydantic_core_schema__(
        self, _source: Any, _handler: GetCoreSchemaHandler
    ) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, _schema: CoreSchema, _handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        number: JsonSchemaValue = {"type": "number"}
        for key, bound in (
            ("exclusiveMinimum", self.above),
            ("minimum", self.at_least),
            ("exclusiveMaximum", self.below),
            ("maximum", self.at_most),
        ):
            if math.isfinite(bound):
                number[key] = bound
        return {
            "anyOf": [number, {"type": "string"}],
            "description": f"{self.name} [{self.unit}]",
            "x-unit": self.unit,
        }


Length = Annotated[float, InUnit("mm", "a length", above=0.0)]
Stress = Annotated[float, InUnit("MPa", "a stress or strength", above=0.0)]
# Usual ranges of what reinforced concrete is made of: generous, to catch another unit.
ConcreteStrength = Annotated[
    float, InUnit("MPa", "a stress or strength", above=0.0, usual=(5.0, 150.0))
]
YieldStrength = Annotated[
    float, InUnit("MPa", "a stress or strength", above=0.0, usual=(150.0, 1200.0))
]
CoverDepth = Annotated[float, InUnit("mm", "a length", above=0.0, usual=(5.0, 150.0))]
Moment = Annotated[float, InUnit("N*mm", "a moment", at_least=0.0)]
Force = Annotated[float, InUnit("N", "a force", at_least=0.0)]
CurrentDensity = Annotated[float, InUnit("µA/cm^2", "a current density", above=0.0)]
Years = Annotated[float, InUnit("yr", "a duration", at_least=0.0)]
Number = Annotated[float, InUnit(NONE, "a number")]
PositiveNumber = Annotated[float, InUnit(NONE, "the number", above=0.0)]
Fraction = Annotated[float, InUnit(NONE, "a fraction", at_least=0.0, at_most=1.0)]
CoefficientOfVariation = Annotated[
    float,
    InUnit(NONE, "a coefficient of variation", above=0.0, at_most=2.0, usual=(0.0, 1.0)),
]
