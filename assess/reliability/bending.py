"""Limit state: bending of a reinforced-concrete section with corroding bars."""

from collections.abc import Mapping, Sequence
from typing import Annotated, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field
from scipy import special

from assess.case.forms import (
    Closed,
    Complaint,
    Dimension,
    LimitStateForm,
    SectionEntry,
    StatedBars,
)
from assess.case.quantities import CoefficientOfVariation, InUnit, Length, PositiveNumber
from assess.case.spec import CaseSpec, NominalCover, Whole
from assess.mechanics.bending import bending_resistance
from assess.mechanics.corrosion import (
    penetration_depth,
    pit_depth,
    pitting_factor_distribution,
    residual_area_pit,
    residual_area_uniform,
)
from assess.mechanics.dimensions import dimension_deviation, effective_depth
from assess.mechanics.model_uncertainty import model_uncertainty
from assess.reliability.bending_faults import (
    Shape,
    impossible_load,
    impossible_shape,
    twice_stated,
    unknown_quantities,
)
from assess.reliability.limit_state import AnnualMaximum, LimitState, Surroundings
from assess.reliability.loads import Loads, permanent_effect

FloatArray = NDArray[np.float64]
Built = FloatArray | float  # a dimension, uncertain or not

RESISTANCE_MODEL = "concrete: bending"
LOAD_EFFECT_MODEL = "load effect: moments in frames"
LEAST_BUILT = 1.0  # [mm] a normal deviation reaches below nothing; far from any built dimension
FURTHEST = 37.0  # beyond it the normal probability cannot be represented
MOST_PITS = 6  # pitting factors sampled per section; more bars share them in groups


class Factor(Closed):
    """A lognormal model factor."""

    mean: PositiveNumber = Field(description="mean of the factor [-]")
    V: CoefficientOfVariation = Field(description="coefficient of variation of the factor")
    source: str = Field(description="where mean and V come from")


class Flange(Closed):
    """Compression flange of a T section."""

    width: Length = Field(description="effective width of the flange")
    thickness: Length = Field(description="thickness of the flange")


class Bars(Closed):
    """Tension bars, in one layer."""

    count: Annotated[Whole, Field(ge=1, le=200, description="number of bars")]
    diameter: Length = Field(description="diameter of the sound bars")
    steel: str = Field(description="name under `steel`")
    spread: Length | None = Field(
        None,
        description="width over which the bars lie, where it is not that of the web, as above a "
        "support in a slab; only checked against their number",
    )
    pit_length: Length = Field(
        1000.0,
        description="length of bar over which the deepest pit governs. "
        "Engineering judgement, no source.",
    )


class BendingSection(SectionEntry):
    """A section checked in bending."""

    limit_state: Literal["bending"]
    depth: Length = Field(description="overall depth")
    depth_sd: Annotated[float, InUnit("mm", "a standard deviation", at_least=0.0)] | None = Field(
        None, description="standard deviation of the depth; left out: JCSS part 3.10 by the depth"
    )
    width: Length = Field(description="width of the web")
    flange: Flange | None = None
    link_diameter: Annotated[float, InUnit("mm", "a diameter", at_least=0.0)] = Field(
        description="diameter of the links, 0 where cover is that of the main bars"
    )
    bars: Bars
    loads: Loads
    resistance_model: Factor | None = Field(
        None, description="factor on the resistance; left out: JCSS part 3.9, concrete bending"
    )
    load_effect_model: Factor | None = Field(
        None, description="factor on all load effects; left out: JCSS part 3.9, moments in frames"
    )

    def steels(self) -> tuple[str, ...]:
        """Name the reinforcement of the section."""
        return (self.bars.steel,)

    def dimensions(self) -> Mapping[str, Dimension]:
        """Give depth and width, and the thickness of a flange."""
        found = {"depth": Dimension(self.depth, self.depth_sd), "width": Dimension(self.width)}
        if self.flange is not None:
            found["flange thickness"] = Dimension(self.flange.thickness)
        return found

    def stated_bars(self) -> StatedBars:
        """Give the tension bars."""
        return StatedBars(self.bars.count, self.bars.diameter)


def _factor(stated: Factor | None, name: str) -> Factor:
    """Take the stated model factor, else the published one."""
    if stated is not None:
        return stated
    published = model_uncertainty(name)
    return Factor(mean=published.mean, V=published.variation, source=published.source)


def _lognormal(factor: Factor, z: FloatArray) -> FloatArray:
    """Map standard normals to a lognormal factor of given mean and V."""
    log_variance = np.log1p(factor.V**2)
    return np.asarray(factor.mean * np.exp(np.sqrt(log_variance) * z - 0.5 * log_variance))


def _pit_groups(count: int) -> FloatArray:
    """Share the bars out into at most `MOST_PITS` groups of equal pitting factor."""
    groups = min(count, MOST_PITS)
    return np.array([len(part) for part in np.array_split(np.arange(count), groups)], dtype=float)


def _gumbel(location: FloatArray, inverse_scale: FloatArray, z: FloatArray) -> FloatArray:
    """Map standard normals to a Gumbel maximum, accurate in both tails."""
    tail = special.ndtr(-np.minimum(np.abs(z), FURTHEST))
    below = -np.where(z > 0.0, np.log1p(-tail), np.log(tail))  # -ln of the probability below
    return np.asarray(location - np.log(below) / inverse_scale)


def _yield_strength(entry: BendingSection, spec: CaseSpec, here: Surroundings) -> FloatArray:
    """Yield strength of the section's bars [MPa]."""
    if "yield strength" in here.local:  # a coupon or hardness was taken here
        return here.local["yield strength"]
    name, scatter = entry.bars.steel, spec.steel[entry.bars.steel].local_sd
    sd = scatter if isinstance(scatter, float) else here.common[f"steel.{name}.scatter"]
    return here.common[f"steel.{name}"] + sd * here.chance["yield strength"]


def _depth(entry: BendingSection, here: Surroundings) -> FloatArray:
    """Depth as built [mm]."""
    if "depth deviation" in here.local:
        return entry.depth + here.local["depth deviation"]
    if entry.depth_sd is not None:
        return entry.depth + entry.depth_sd * here.chance["depth deviation"]
    deviation = dimension_deviation(entry.depth)
    return entry.depth + deviation.mean + deviation.sd * here.chance["depth deviation"]


def _outline(entry: BendingSection, here: Surroundings) -> tuple[Built, Built | None, Built | None]:
    """Width of the web, width and thickness of the flange [mm]: nominal where nothing is known."""
    width: Built = entry.width
    if "width deviation" in here.local:
        width = np.maximum(width + here.local["width deviation"], LEAST_BUILT)
    if entry.flange is None:
        return width, None, None
    thickness: Built = entry.flange.thickness
    if "flange thickness deviation" in here.local:
        thickness = np.maximum(thickness + here.local["flange thickness deviation"], LEAST_BUILT)
    return width, np.maximum(entry.flange.width, width), thickness


def _load_words(entry: BendingSection) -> str:
    model = entry.loads.variable.annual_maximum.load_model
    if model is None:
        return (
            "The year's largest variable load effect has a Gumbel distribution, years independent "
            "given the other variables; its parameters are taken as known."
        )
    return (
        f"The year's largest variable load effect follows the load model {model!r}, years "
        "independent given its parameters, which are uncertain like all other variables."
    )


class Bending(LimitState):
    r"""Bending: :math:`\theta_R M_R(y) \ge \theta_E (G + Q)`.

    Notes
    -----
    The load capacity is :math:`q = \theta_R M_R / \theta_E - G`. :math:`M_R` follows from the
    bars' area left at the end of the year; each bar (or group of bars beyond `MOST_PITS`, which
    errs on the safe side of averaging) has its own pitting factor. Every bar of the section has
    the section's onset and current.
    """

    form = LimitStateForm(key="bending", title="Bending resistance", entry=BendingSection)

    def faults(self, entry: BendingSection, spec: CaseSpec) -> Sequence[Complaint]:
        """Find impossible geometry, and variable loads that vanish or do not exist."""
        cover = spec.zones[entry.zone].cover
        nominal = cover.nominal if isinstance(cover, NominalCover) else cover.mean.marginal().mean
        flange = None if entry.flange is None else (entry.flange.width, entry.flange.thickness)
        shape = Shape(
            entry.depth,
            entry.width,
            flange,
            entry.link_diameter,
            entry.bars.count,
            entry.bars.diameter,
            entry.bars.spread or entry.width,
        )
        return [
            *impossible_shape(shape, nominal),
            *impossible_load(entry.loads, spec),
            *unknown_quantities(entry.loads, spec),
            *twice_stated(entry.depth_sd, spec.zones[entry.zone]),
        ]

    def chances(self, entry: BendingSection) -> Mapping[str, str]:
        """Name the section's own standard normals with their groups."""
        pits = {f"pitting {k + 1}": "pitting" for k in range(len(_pit_groups(entry.bars.count)))}
        return {
            "yield strength": "steel strength",
            "depth deviation": "cover and depth",
            "resistance model": "resistance model",
            "load effect model": "load effect model",
            "permanent load": "permanent load",
            **pits,
        }

    def steels(self, entry: BendingSection) -> tuple[str, ...]:
        """Name the reinforcement of the section."""
        return entry.steels()

    def quantities(self, entry: BendingSection) -> tuple[str, ...]:
        """Name the quantities that permanent loads are proportional to."""
        return tuple(
            dict.fromkeys(name for load in entry.loads.permanent for name in load.proportional_to)
        )

    def load_capacity(
        self, entry: BendingSection, spec: CaseSpec, here: Surroundings
    ) -> FloatArray:
        """Variable moment that uses the section up, (n, k, n_year) [N·mm]."""
        lever = effective_depth(
            _depth(entry, here),
            np.maximum(here.local["cover"], 0.0),
            entry.link_diameter,
            here.local.get("bar diameter", entry.bars.diameter),
        )
        width, flange_width, flange_thickness = _outline(entry, here)
        resistance = bending_resistance(
            self._steel_area(entry, spec, here),
            np.maximum(_yield_strength(entry, spec, here), 0.0),
            here.local["strength"],
            lever,
            width,
            flange_width,
            flange_thickness,
        )
        resistance_model = _factor(entry.resistance_model, RESISTANCE_MODEL)
        effect_model = _factor(entry.load_effect_model, LOAD_EFFECT_MODEL)
        ratio = _lognormal(resistance_model, here.chance["resistance model"]) / _lognormal(
            effect_model, here.chance["load effect model"]
        )
        quantities = {
            name: here.common[f"quantity.{name}"] / spec.quantities[name].stated_mean
            for name in self.quantities(entry)
        }
        mean, sd = permanent_effect(entry.loads, quantities)
        permanent = mean + sd * here.chance["permanent load"]
        return np.asarray(ratio * resistance - permanent)

    def _steel_area(
        self, entry: BendingSection, spec: CaseSpec, here: Surroundings
    ) -> FloatArray | float:
        """Area of all bars at the end of each year [mm²]."""
        diameter = here.local.get("bar diameter", entry.bars.diameter)
        count = here.local.get("bar count", entry.bars.count)
        if not here.corrodes:
            return count * np.pi * diameter**2 / 4.0
        corrosion = spec.zones[entry.zone].corrosion
        penetration = penetration_depth(here.local["current"], here.corroding())
        if corrosion is None or corrosion.attack == "uniform":
            return np.asarray(
                count * residual_area_uniform(diameter, penetration), dtype=np.float64
            )
        location, inverse_scale = pitting_factor_distribution(diameter, entry.bars.pit_length)
        area: FloatArray | float = 0.0
        for k, bars in enumerate(_pit_groups(entry.bars.count)):
            factor = _gumbel(location, inverse_scale, here.chance[f"pitting {k + 1}"])
            area = area + bars * residual_area_pit(
                diameter, pit_depth(penetration, np.maximum(factor, 1.0))
            )
        return area * (count / entry.bars.count)  # pits of found bars are shared by fewer or more

    def load_models(self, entry: BendingSection) -> tuple[str, ...]:
        """Name the load model of the variable load, if it has one."""
        name = entry.loads.variable.annual_maximum.load_model
        return () if name is None else (name,)

    def annual_maximum(
        self,
        entry: BendingSection,
        spec: CaseSpec,
        years: FloatArray,
        common: Mapping[str, FloatArray],
    ) -> AnnualMaximum:
        """Largest variable moment of each year [N·mm]."""
        maximum = entry.loads.variable.annual_maximum
        return maximum.in_years(years, spec.structure.assessed, common)

    def assumptions(self, entry: BendingSection, spec: CaseSpec) -> tuple[str, ...]:
        """Say what the check assumes."""
        resistance = _factor(entry.resistance_model, RESISTANCE_MODEL)
        effect = _factor(entry.load_effect_model, LOAD_EFFECT_MODEL)
        said = [
            "Bending resistance by plane sections with a rectangular stress block of 0.85 times "
            "the cylinder strength over 0.8 of the compressed depth, crushing at a strain of "
            "0.0035 (EN 1992-1-1, 3.1.7); no axial force; bars fully anchored.",
            f"Resistance model factor lognormal, mean {resistance.mean:g}, V {resistance.V:g} "
            f"({resistance.source}).",
            f"Load effect model factor lognormal, mean {effect.mean:g}, V {effect.V:g} "
            f"({effect.source}).",
            _load_words(entry),
            "Resistance counts as that at the end of each year.",
        ]
        zone = spec.zones[entry.zone].dimensions
        if zone is not None and zone.depth_deviation is not None:
            said.append(
                "Depth deviates from its nominal value by a part common to the zone and one of the "
                "section."
            )
        elif entry.depth_sd is None:
            said.append("Depth deviates from its nominal value as in JCSS part 3.10.")
        said += [
            f"The effect of {load.name} is proportional to {' and to '.join(load.proportional_to)},"
            " taken as the mean over the structure."
            for load in entry.loads.permanent
            if load.proportional_to
        ]
        corrosion = spec.zones[entry.zone].corrosion
        if corrosion is not None:
            said.append(
                f"Zone {entry.zone}: all tension bars of a section start to corrode together and "
                "at one current; by Faraday's law. "
                + (
                    "Each bar has its own largest pit (Gumbel factor after Stewart 2004, pit "
                    "geometry after Val and Melchers 1997)."
                    if corrosion.attack == "pitting"
                    else "Loss is uniform around the bar."
                )
            )
        return tuple(said)
