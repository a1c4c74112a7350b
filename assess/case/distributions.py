"""A distribution as a case file says it."""

import re
from collections.abc import Mapping
from functools import cache
from typing import TYPE_CHECKING, Any, ClassVar

from pydantic import Field, GetJsonSchemaHandler, ValidationInfo, field_validator, model_validator
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema

from assess import units
from assess.case.catalogue import fitting, from_catalogue
from assess.case.forms import Closed
from assess.case.quantities import CoefficientOfVariation, InUnit
from assess.case.yamlfile import listed
from assess.units import NONE, QuantityError

if TYPE_CHECKING:
    from assess.probability.marginals import Marginal

_IN_UNIT = ("mean", "sd", "lower", "upper")
_COMPLAINT = re.compile(r"(.*): given (.*?), allowed (.*?)(?: (\(.*\??\)))?", re.DOTALL)


class Distribution(Closed):
    """What is known of an uncertain quantity: its kind, one way to fix it, and who says so.

    The ways: `mean` with `V` or `sd` (alone for a constant); or two `quantiles`; or
    `parameters`. Quantities are in `unit`, which a subclass states. Or `catalogue` alone, naming
    a published prior.
    """

    unit: ClassVar[str] = NONE
    positive: ClassVar[bool] = False  # whether a negative mean makes no sense

    distribution: str = Field(description="kind of distribution, such as lognormal or normal")
    mean: float | None = Field(None, description="mean, together with V or sd")
    V: CoefficientOfVariation | None = Field(
        None, description="coefficient of variation, sd over mean"
    )
    sd: float | None = Field(None, description="standard deviation")
    quantiles: dict[float, float] | None = Field(
        None, description="values by the probability of being below, such as {0.05: 20, 0.95: 60}"
    )
    parameters: dict[str, float] | None = Field(
        None, description="the kind's own parameters, numbers in the key's unit"
    )
    lower: float | None = Field(None, description="lower bound, cutting the distribution off")
    upper: float | None = Field(None, description="upper bound, cutting the distribution off")
    source: str = Field(min_length=1, description="document or reasoning it comes from")

    @model_validator(mode="before")
    @classmethod
    def _by_name(cls, data: Any) -> Any:
        """Put what the catalogue says in place of the name of its entry."""
        if not isinstance(data, Mapping) or "catalogue" not in data:
            return data
        if len(data) > 1:
            what = "a distribution from the catalogue says nothing else"
            raise QuantityError(what, listed(data), "catalogue alone, or no catalogue")
        return from_catalogue(data["catalogue"], cls.unit)

    @field_validator(*_IN_UNIT, mode="before")
    @classmethod
    def _in_unit(cls, value: object, info: ValidationInfo) -> float | None:
        if value is None:
            return None
        if cls.positive and info.field_name == "mean":
            return InUnit(cls.unit, "the mean", above=0.0).read(value)
        return units.convert(value, cls.unit)

    @field_validator("quantiles", mode="before")
    @classmethod
    def _quantiles(cls, value: object) -> dict[float, float] | None:
        if value is None:
            return None
        if not isinstance(value, Mapping):
            allowed = "such as {0.05: 20, 0.95: 60}"
            raise QuantityError("quantiles are values by probability", str(value), allowed)
        probability = InUnit(NONE, "the probability of a quantile", above=0.0, below=1.0)
        return {probability.read(p): units.convert(x, cls.unit) for p, x in value.items()}

    @field_validator("parameters", mode="before")
    @classmethod
    def _parameters(cls, value: object) -> dict[str, float] | None:
        if value is None:
            return None
        if not isinstance(value, Mapping):
            raise QuantityError("parameters are numbers by name", str(value))
        return {str(name): units.convert(x, cls.unit) for name, x in value.items()}

    @model_validator(mode="after")
    def _exists(self) -> "Distribution":
        """Build it once: a complaint belongs beside the line that causes it."""
        try:
            self.marginal()
        except ValueError as error:
            parts = _COMPLAINT.fullmatch(str(error))
            if parts is None:
                raise
            what, *rest = parts.groups(default="")
            if what == self.distribution:
                what = f"a {what} distribution is fixed in exactly one way"
            raise QuantityError(what, *rest) from None
        return self

    def marginal(self) -> "Marginal":
        """Build the distribution.

        Returns
        -------
        Marginal
            In `unit`.

        Raises
        ------
        ValueError
            If no such distribution exists.
        """
        from assess.probability.marginals import make_marginal

        return make_marginal(
            self.distribution,
            mean=self.mean,
            V=self.V,
            sd=self.sd,
            quantiles=self.quantiles,
            parameters=self.parameters,
            lower=self.lower,
            upper=self.upper,
        )

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        from assess.probability.marginals import DISTRIBUTIONS

        reference = handler(schema)
        properties = handler.resolve_ref_schema(reference)["properties"]
        properties["distribution"]["enum"] = list(DISTRIBUTIONS)
        either: list[dict[str, Any]] = [{"type": "number"}, {"type": "string"}]
        for name in _IN_UNIT:
            properties[name] |= {"anyOf": either, "x-unit": cls.unit}
        for name in ("quantiles", "parameters"):
            values = {"type": "object", "additionalProperties": {"anyOf": either}}
            properties[name] |= {"anyOf": [values], "x-unit": cls.unit}
        for name in (*_IN_UNIT, "quantiles", "parameters", "V"):
            properties[name].pop("default", None)
        resolved = handler.resolve_ref_schema(reference)
        properties["catalogue"] = {
            "enum": fitting(cls.unit),
            "description": "name of a published prior, in place of everything else",
        }
        required = resolved.pop("required")
        resolved["anyOf"] = [{"required": required}, {"required": ["catalogue"]}]
        return reference


class NumberDistribution(Distribution):
    """A distribution of a pure number [-]."""


class LengthDistribution(Distribution):
    """A distribution of a length [mm]."""

    unit = "mm"
    positive = True


class StressDistribution(Distribution):
    """A distribution of a stress or strength [MPa]."""

    unit = "MPa"
    positive = True


class ForceDistribution(Distribution):
    """A distribution of a force [N]."""

    unit = "N"


class MomentDistribution(Distribution):
    """A distribution of a moment [N·mm]."""

    unit = "N*mm"


class CurrentDistribution(Distribution):
    """A distribution of a corrosion current density [µA/cm²]."""

    unit = "µA/cm^2"
    positive = True


class YearsDistribution(Distribution):
    """A distribution of a duration [yr]."""

    unit = "yr"
    positive = True


class DiffusionDistribution(Distribution):
    """A distribution of a diffusion coefficient [mm²/yr]."""

    unit = "mm^2/yr"
    positive = True


class RootTimeDistribution(Distribution):
    """A distribution of a depth over the root of time [mm/yr^0.5]."""

    unit = "mm/yr^0.5"
    positive = True


_KNOWN: tuple[type[Distribution], ...] = (
    NumberDistribution,
    LengthDistribution,
    StressDistribution,
    ForceDistribution,
    MomentDistribution,
    CurrentDistribution,
    YearsDistribution,
    DiffusionDistribution,
    RootTimeDistribution,
)


@cache
def distribution_of(unit: str) -> type[Distribution]:
    """Give the model of a distribution whose quantities are in a unit.

    Parameters
    ----------
    unit : str
        Unit inside the tool; ``-`` for a pure number.

    Returns
    -------
    type of Distribution
        One of this module's classes where the unit has one, else a new one.

    Examples
    --------
    >>> distribution_of("mm").__name__
    'LengthDistribution'
    """
    for known in _KNOWN:
        if units.plain(known.unit) == units.plain(unit):
            return known
    name = "DistributionIn" + "".join(c if c.isalnum() else "_" for c in unit)
    doc = f"A distribution of a quantity [{unit}]."
    return type(name, (Distribution,), {"unit": unit, "__module__": __name__, "__doc__": doc})
