"""Densities and thicknesses that permanent loads are proportional to, for measurements to tell."""

from collections.abc import Iterator, Mapping
from functools import cached_property
from types import MappingProxyType
from typing import Annotated, Literal

from pydantic import AfterValidator, Discriminator, Field, Tag

from assess.case.distributions import Distribution, LengthDistribution
from assess.case.forms import Closed
from assess.case.processes import only_positive
from assess.units import QuantityError


def _undotted(name: str) -> str:
    if not name or "." in name:
        what = "a name must not be empty or have a dot"
        raise QuantityError(what, repr(name), mend="the dot parts a quantity from its scatter")
    return name


Undotted = Annotated[str, AfterValidator(_undotted)]


class WeightDensityDistribution(Distribution):
    """A distribution of a weight per volume [kN/m³]."""

    unit = "kN/m^3"
    positive = True


class DensityDistribution(Distribution):
    """A distribution of a mass per volume [kg/m³]."""

    unit = "kg/m^3"
    positive = True


class AreaWeightDistribution(Distribution):
    """A distribution of a weight per area [kN/m²]."""

    unit = "kN/m^2"
    positive = True


_LEVEL = "mean over the structure, as uncertain; loads are stated for its own mean"
_SCATTER = "standard deviation from place to place, as uncertain; needed where it is measured"


class Quantity(Closed):
    """A quantity of the structure: its mean, and how it scatters from place to place."""

    of: str = Field(description="what it is")
    level: Distribution = Field(description=_LEVEL)
    scatter: Distribution | None = Field(None, description=_SCATTER)

    def priors(self) -> Iterator[tuple[str, str, str, Distribution]]:
        """Go through end of the name, label, symbol and prior of the variables that are stated."""
        yield "", f"mean {self.of}", "$\\bar q$", self.level
        if self.scatter is not None:
            yield ".scatter", f"scatter of {self.of}", "$\\sigma_q$", self.scatter

    @property
    def unit(self) -> str:
        """Unit as people read it."""
        return self.level.unit.replace("^2", "²").replace("^3", "³")

    @cached_property
    def stated_mean(self) -> float:
        """Mean that loads are stated for [`unit`]."""
        return float(self.level.marginal().mean)


class WeightDensity(Quantity):
    """Weight per volume."""

    of: Literal["weight density"] = Field(description="what it is")
    level: WeightDensityDistribution = Field(description=_LEVEL)
    scatter: Annotated[WeightDensityDistribution, AfterValidator(only_positive)] | None = Field(
        None, description=_SCATTER
    )


class Density(Quantity):
    """Mass per volume."""

    of: Literal["density"] = Field(description="what it is")
    level: DensityDistribution = Field(description=_LEVEL)
    scatter: Annotated[DensityDistribution, AfterValidator(only_positive)] | None = Field(
        None, description=_SCATTER
    )


class Thickness(Quantity):
    """Thickness of a layer, such as surfacing."""

    of: Literal["thickness"] = Field(description="what it is")
    level: LengthDistribution = Field(description=_LEVEL)
    scatter: Annotated[LengthDistribution, AfterValidator(only_positive)] | None = Field(
        None, description=_SCATTER
    )


class AreaWeight(Quantity):
    """Weight per area, such as that of a floor's finish."""

    of: Literal["weight per area"] = Field(description="what it is")
    level: AreaWeightDistribution = Field(description=_LEVEL)
    scatter: Annotated[AreaWeightDistribution, AfterValidator(only_positive)] | None = Field(
        None, description=_SCATTER
    )


# What may be measured, with the unit inside the tool.
MEASURED: Mapping[str, str] = MappingProxyType(
    {
        "weight density": WeightDensityDistribution.unit,
        "density": DensityDistribution.unit,
        "thickness": LengthDistribution.unit,
        "weight per area": AreaWeightDistribution.unit,
    }
)


def _of(value: object) -> str | None:
    said = value.get("of") if isinstance(value, dict) else getattr(value, "of", None)
    return said if isinstance(said, str) and said in MEASURED else None


AnyQuantity = Annotated[
    Annotated[WeightDensity, Tag("weight density")]
    | Annotated[Density, Tag("density")]
    | Annotated[Thickness, Tag("thickness")]
    | Annotated[AreaWeight, Tag("weight per area")],
    Discriminator(
        _of,
        custom_error_type="one_form",
        custom_error_message="exactly one form must be said",
        custom_error_context={"keys": " or ".join(f"of: {name}" for name in MEASURED)},
    ),
]
