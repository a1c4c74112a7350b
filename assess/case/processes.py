"""Processes that a zone may undergo, each with the common variables that describe it.

The key of a variable in the case file is its name in the zone: ``deck.onset`` is what the zone
``deck`` says under ``corrosion: {onset: ...}``.
"""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Annotated, ClassVar, Literal

from pydantic import AfterValidator, Field, model_validator

from assess.case.distributions import (
    CurrentDistribution,
    DiffusionDistribution,
    Distribution,
    LengthDistribution,
    NumberDistribution,
    RootTimeDistribution,
    YearsDistribution,
)
from assess.case.forms import Closed
from assess.case.quantities import Fraction, InUnit
from assess.units import QuantityError


def only_positive[D: Distribution](value: D) -> D:
    """Refuse a distribution that reaches below zero for what has a logarithm or is a scatter."""
    low, high = value.marginal().support
    if low < 0.0 or high <= 0.0:
        what = "must be a distribution of positive values only"
        given = f"{value.distribution} from {low:.4g} to {high:.4g}"
        mend = "or cut it off with lower: 0"
        raise QuantityError(what, given, "such as lognormal or gamma", mend)
    return value


def within_one[D: Distribution](value: D) -> D:
    """Refuse a distribution that reaches beyond 0 to 1."""
    low, high = value.marginal().support
    if low < 0.0 or high > 1.0:
        what = "must be a distribution between 0 and 1"
        given = f"{value.distribution} from {low:.4g} to {high:.4g}"
        raise QuantityError(what, given, "such as beta with lower: 0 and upper: 1")
    return value


MOST_SCATTER = 3.0  # standard deviation of a logarithm: places differ by a factor of 20 and more


def log_scatter[D: Distribution](value: D) -> D:
    """Refuse what cannot be the standard deviation of a logarithm, such as one in percent."""
    mean = only_positive(value).marginal().mean
    if mean > MOST_SCATTER:
        what = "a standard deviation of a logarithm is out of all proportion"
        mend = f"in percent? {mean:.3g} % is {mean / 100.0:.3g}"
        raise QuantityError(what, f"mean {mean:.3g}", f"mean up to {MOST_SCATTER:g}", mend)
    return value


_Years = Annotated[YearsDistribution, AfterValidator(only_positive)]
_Number = Annotated[NumberDistribution, AfterValidator(only_positive)]
_LogScatter = Annotated[NumberDistribution, AfterValidator(log_scatter)]
_Current = Annotated[CurrentDistribution, AfterValidator(only_positive)]


@dataclass(frozen=True, slots=True)
class Meaning:
    """One common variable of a process in words."""

    label: str
    symbol: str
    distribution: type[Distribution]

    @property
    def unit(self) -> str:
        """Unit as people read it."""
        return self.distribution.unit.replace("^2", "²")


class Process(Closed):
    """A process with its common variables; the fields named in `meanings` are their priors."""

    meanings: ClassVar[Mapping[str, Meaning]]

    def priors(self) -> Iterator[tuple[str, Meaning, Distribution]]:
        """Go through name, meaning and prior of the variables that are stated."""
        for name, meaning in self.meanings.items():
            prior = getattr(self, name)
            if prior is not None:
                yield name, meaning, prior


class Corrosion(Process):
    """When reinforcement corrosion starts in a zone and how fast it goes."""

    meanings = MappingProxyType(
        {
            "onset": Meaning("median onset of corrosion", "$t_i$", YearsDistribution),
            "onset_scatter": Meaning(
                "scatter of ln onset", "$\\sigma_{\\ln t}$", NumberDistribution
            ),
            "current": Meaning("median corrosion current", "$i_{corr}$", CurrentDistribution),
            "current_scatter": Meaning(
                "scatter of ln current", "$\\sigma_{\\ln i}$", NumberDistribution
            ),
        }
    )

    onset: _Years = Field(description="zone median of the local onset, years after construction")
    onset_scatter: _LogScatter = Field(
        description="standard deviation of ln(local onset) from place to place"
    )
    current: _Current = Field(description="zone median of the local current density")
    current_scatter: _LogScatter = Field(
        description="standard deviation of ln(local current density) from place to place"
    )
    attack: Literal["pitting", "uniform"] = Field(description="how the bars lose section")


class Chloride(Process):
    """How chlorides enter the concrete of a zone."""

    meanings = MappingProxyType(
        {
            "surface_chloride": Meaning(
                "median surface chloride, of binder", "$C_s$", NumberDistribution
            ),
            "surface_chloride_scatter": Meaning(
                "scatter of ln surface chloride", "$\\sigma_{\\ln C_s}$", NumberDistribution
            ),
            "diffusion": Meaning(
                "median diffusion coefficient at the reference age", "$D_0$", DiffusionDistribution
            ),
            "diffusion_scatter": Meaning(
                "scatter of ln diffusion coefficient", "$\\sigma_{\\ln D}$", NumberDistribution
            ),
            "age_exponent": Meaning("age exponent of diffusion", "$a$", NumberDistribution),
        }
    )

    surface_chloride: _Number = Field(
        description="zone median of the local surface content, mass fraction of binder (such as "
        "2.5 %)"
    )
    surface_chloride_scatter: _LogScatter = Field(
        description="standard deviation of ln(local surface content) from place to place"
    )
    diffusion: Annotated[DiffusionDistribution, AfterValidator(only_positive)] = Field(
        description="zone median of the local apparent diffusion coefficient at the reference age"
    )
    diffusion_scatter: _LogScatter = Field(
        description="standard deviation of ln(local diffusion coefficient) from place to place"
    )
    age_exponent: Annotated[NumberDistribution, AfterValidator(within_one)] = Field(
        description="exponent a of the fall of the coefficient with age, (t0 / t)^a"
    )
    reference_age: Annotated[float, InUnit("yr", "a reference age", above=0.0)] = Field(
        28.0 / 365.25, description="age t0 that the diffusion coefficient belongs to"
    )
    convection_depth: Annotated[float, InUnit("mm", "a depth", at_least=0.0)] = Field(
        0.0, description="depth below which diffusion rules; nearer to the surface nothing is said"
    )
    initial_chloride: Fraction = Field(
        0.0, description="content of the fresh concrete, mass fraction of binder"
    )


class Carbonation(Process):
    """How carbonation goes into the concrete of a zone, with the root of time."""

    meanings = MappingProxyType(
        {
            "carbonation_rate": Meaning("median carbonation rate", "$k$", RootTimeDistribution),
            "carbonation_rate_scatter": Meaning(
                "scatter of ln carbonation rate", "$\\sigma_{\\ln k}$", NumberDistribution
            ),
        }
    )

    carbonation_rate: Annotated[RootTimeDistribution, AfterValidator(only_positive)] = Field(
        description="zone median of the local rate, depth over the root of age"
    )
    carbonation_rate_scatter: _LogScatter = Field(
        description="standard deviation of ln(local rate) from place to place"
    )


class DeviationDistribution(Distribution):
    """A distribution of a built dimension less its nominal value [mm]; it may be below zero."""

    unit = "mm"


MEASURED_DIMENSIONS = ("depth", "width", "flange thickness")


def dimension_key(dimension: str) -> str:
    """Give the name of a dimension within those of variables: ``flange_thickness``."""
    return dimension.replace(" ", "_")


def _dimension_meanings() -> Mapping[str, Meaning]:
    found = {}
    for name in MEASURED_DIMENSIONS:
        key, what = dimension_key(name), "flange thicknesses" if "flange" in name else f"{name}s"
        found[f"{key}_deviation"] = Meaning(
            f"mean of built less nominal {what}", "$\\Delta$", DeviationDistribution
        )
        found[f"{key}_scatter"] = Meaning(
            f"scatter of built less nominal {what}", "$\\sigma_\\Delta$", LengthDistribution
        )
    return MappingProxyType(found)


_Scatter = Annotated[LengthDistribution, AfterValidator(only_positive)]


class Dimensions(Process):
    """How the built dimensions of a zone stray from the drawings, where readings may tell."""

    meanings = _dimension_meanings()

    depth_deviation: DeviationDistribution | None = Field(
        None, description="mean of built less nominal depths in the zone, as uncertain"
    )
    depth_scatter: _Scatter | None = Field(
        None, description="standard deviation of built less nominal depths from place to place"
    )
    width_deviation: DeviationDistribution | None = Field(
        None, description="mean of built less nominal widths in the zone, as uncertain"
    )
    width_scatter: _Scatter | None = Field(
        None, description="standard deviation of built less nominal widths from place to place"
    )
    flange_thickness_deviation: DeviationDistribution | None = Field(
        None, description="mean of built less nominal flange thicknesses in the zone, as uncertain"
    )
    flange_thickness_scatter: _Scatter | None = Field(
        None,
        description="standard deviation of built less nominal flange thicknesses from place to "
        "place",
    )

    @model_validator(mode="after")
    def _pairs(self) -> "Dimensions":
        stated = {name for name, _, _ in self.priors()}
        for name in MEASURED_DIMENSIONS:
            pair = {f"{dimension_key(name)}_{part}" for part in ("deviation", "scatter")}
            if len(pair & stated) == 1:
                what = f"the {name} has {min(pair & stated)} without {min(pair - stated)}"
                raise QuantityError(what, mend="state both or neither")
        if not stated:
            raise QuantityError("no dimension is stated", allowed="such as depth_deviation")
        return self


# Under a zone, by key. One line each.
PROCESSES: Mapping[str, type[Process]] = MappingProxyType(
    {
        "corrosion": Corrosion,
        "chloride": Chloride,
        "carbonation": Carbonation,
        "dimensions": Dimensions,
    }
)
