"""What every case file says, whatever kinds of evidence, limit state and option exist.

The fields that depend on the kinds (`CaseSpec.surveys`, `Member.sections`,
`Decision.options`) are narrowed by `assess.case.schema.case_model`.
"""

import re
from collections.abc import Collection, Iterator
from datetime import date
from typing import Annotated, Any, ClassVar, Literal

from pydantic import (
    AfterValidator,
    BeforeValidator,
    Discriminator,
    Field,
    Tag,
    WithJsonSchema,
    model_validator,
)

from assess.case.distributions import (
    LengthDistribution,
    NumberDistribution,
    StressDistribution,
)
from assess.case.events import Event
from assess.case.forms import Closed, EvidenceEntry, OptionEntry, SectionEntry
from assess.case.load_models import AnyLoadModel
from assess.case.load_quantities import AnyQuantity, Undotted
from assess.case.processes import (
    PROCESSES,
    Carbonation,
    Chloride,
    Corrosion,
    Dimensions,
    Process,
    only_positive,
    within_one,
)
from assess.case.quantities import (
    CoefficientOfVariation,
    ConcreteStrength,
    CoverDepth,
    InUnit,
    Number,
    PositiveNumber,
    Stress,
    YieldStrength,
)
from assess.units import NONE, QuantityError

Text = Annotated[str, Field(min_length=1)]
_ISO = "a date as year-month-day, such as 2019-06-12"


def _read_date(value: object) -> date:
    if isinstance(value, date):
        return value
    if isinstance(value, str) and re.fullmatch(r"\d{4}-\d{2}-\d{2}", value.strip()):
        try:
            return date.fromisoformat(value.strip())
        except ValueError:
            raise QuantityError("there is no such date", value, _ISO) from None
    raise QuantityError("this is not a date", str(value)[:40], _ISO)


def _read_built(value: object) -> date:
    if isinstance(value, int) and not isinstance(value, bool):
        if 1800 <= value <= 2100:
            return date(value, 1, 1)
        raise QuantityError("this is not a year of construction", str(value), "1800 to 2100")
    return _read_date(value)


def _not_truth(value: object) -> object:
    if isinstance(value, bool):
        raise QuantityError("a number is wanted", str(value).lower(), "a whole number")
    return value


IsoDate = Annotated[
    date, BeforeValidator(_read_date), WithJsonSchema({"type": "string", "format": "date"})
]
Built = Annotated[
    date,
    BeforeValidator(_read_built),
    WithJsonSchema(
        {
            "anyOf": [
                {"type": "integer", "minimum": 1800, "maximum": 2100},
                {"type": "string", "format": "date"},
            ]
        }
    ),
]
Whole = Annotated[int, BeforeValidator(_not_truth)]


class Structure(Closed):
    """The structure and the time that the assessment covers."""

    name: Text = Field(description="name of the structure")
    built: Built = Field(description="year of construction, or its date; a year means 1 January")
    assessed: Whole = Field(ge=1800, le=2200, description="year of the assessment")
    horizon: Whole = Field(ge=1, le=200, description="years that the assessment looks ahead [yr]")
    note: str | None = Field(None, description="anything the report should say")
    invented: bool = Field(False, description="true for an example that no structure stands for")
    description: str | None = Field(None, description="what kind of structure it is")


class GradedConcrete(Closed):
    """Concrete known by its grade: the prior is the published one of that grade."""

    grade: Text = Field(description="strength grade from the drawings, such as C35")
    production: Literal["ready-mixed", "precast"] = Field(description="how it was produced")
    source: Text = Field(description="where the grade is stated")


class MeasuredConcrete(Closed):
    """Concrete known by a mean strength and the number of tests its knowledge is worth."""

    mean: ConcreteStrength = Field(description="mean compressive strength")
    V: CoefficientOfVariation = Field(description="coefficient of variation of the strength")
    equivalent_tests: PositiveNumber = Field(
        description="number of tests that the mean is worth as knowledge"
    )
    scatter: Literal["unknown", "known"] = Field(
        "unknown", description="known: V is taken as certain; unknown: it is updated too"
    )
    source: Text = Field(description="where mean and V come from")


class VagueConcrete(Closed):
    """Concrete of which nothing is known before the cores."""

    vague: Literal[True] = Field(description="true: a prior that leaves the cores to speak")
    source: str | None = Field(None, description="why nothing is known")


class ScatteredCover(Closed):
    """Cover by the distributions of its mean in the zone and of its scatter in place."""

    mean: LengthDistribution = Field(description="the zone's mean cover, as uncertain")
    scatter: Annotated[LengthDistribution, AfterValidator(only_positive)] = Field(
        description="standard deviation of the cover from place to place, as uncertain"
    )


class NominalCover(Closed):
    """Cover by its nominal value: the prior is the published one."""

    nominal: CoverDepth = Field(description="nominal cover on the drawings")
    source: Text = Field(description="where the nominal cover is stated")


def _form(value: Any, keys: tuple[str, ...]) -> str | None:
    """Name the form a mapping has: the one of `keys` it says; None if none or several."""
    if not isinstance(value, dict):
        return None
    said = [key for key in keys if key in value]
    return f"by {said[0]}" if len(said) == 1 else None


def _concrete_form(value: Any) -> str | None:
    return _form(value, ("grade", "mean", "vague"))


def _cover_form(value: Any) -> str | None:
    if isinstance(value, dict) and "nominal" not in value and "scatter" in value:
        return "by mean"  # so that a missing mean is what the fault says
    return _form(value, ("mean", "nominal"))


def _target_form(value: Any) -> str | None:
    return _form(value, ("set", "index"))


def _one_of(*keys: str) -> dict[str, Any]:
    return {
        "custom_error_type": "one_form",
        "custom_error_message": "exactly one form must be said",
        "custom_error_context": {"keys": " or ".join(keys)},
    }


Concrete = Annotated[
    Annotated[GradedConcrete, Tag("by grade")]
    | Annotated[MeasuredConcrete, Tag("by mean")]
    | Annotated[VagueConcrete, Tag("by vague")],
    Discriminator(
        _concrete_form, **_one_of("grade", "mean with V and equivalent_tests", "vague: true")
    ),
]
Cover = Annotated[
    Annotated[ScatteredCover, Tag("by mean")] | Annotated[NominalCover, Tag("by nominal")],
    Discriminator(_cover_form, **_one_of("mean with scatter", "nominal")),
]


class Zone(Closed):
    """A part of the structure with one concrete, one cover specification, one exposure."""

    concrete: Concrete = Field(description="what is known of the strength before the survey")
    cover: Cover = Field(description="what is known of the cover before the survey")
    corrosion: Corrosion | None = Field(None, description="left out: the zone stays sound")
    chloride: Chloride | None = Field(None, description="how chlorides enter; for profiles")
    carbonation: Carbonation | None = Field(None, description="how carbonation goes in")
    dimensions: Dimensions | None = Field(
        None,
        description="how built dimensions stray in the zone; left out: JCSS part 3.10, each "
        "section by itself",
    )
    description: str | None = Field(None, description="where the zone is")

    @staticmethod
    def variable_names(processes: Collection[str]) -> tuple[str, ...]:
        """Name the common variables of a zone with some processes (keys of `PROCESSES`)."""
        stated = (name for key in PROCESSES if key in processes for name in PROCESSES[key].meanings)
        return ("concrete_mean", "concrete_scatter", "cover_mean", "cover_scatter", *stated)

    def processes(self) -> dict[str, Process]:
        """Give the processes that the zone has, by key."""
        found = ((key, getattr(self, key)) for key in PROCESSES)
        return {key: process for key, process in found if process is not None}

    def variables(self) -> tuple[str, ...]:
        """Name this zone's common variables."""
        stated = (name for one in self.processes().values() for name, _, _ in one.priors())
        return (*self.variable_names(()), *stated)


def _number_or_distribution(value: Any) -> str:
    return "uncertain" if isinstance(value, dict | StressDistribution) else "known"


class Steel(Closed):
    """Reinforcement of one delivery or grade."""

    mean: YieldStrength = Field(description="mean yield strength")
    sd: Stress = Field(description="standard deviation of that mean: its level is uncertain")
    local_sd: Annotated[
        Annotated[Stress, Tag("known")]
        | Annotated[StressDistribution, AfterValidator(only_positive), Tag("uncertain")],
        Discriminator(_number_or_distribution),
    ] = Field(
        8.0,
        description="standard deviation from bar to bar; or its distribution, for coupons to tell",
    )
    source: Text = Field(description="where the yield strength comes from")


class Survey(Closed):
    """The measurements of one visit."""

    date: IsoDate = Field(description="day of the visit, year-month-day")
    name: Text | None = Field(None, description="name of the stage; the date if left out")

    def entries(self) -> Iterator[tuple[str, int, EvidenceEntry]]:
        """Go through (kind, position in its list, entry)."""
        for kind in type(self).model_fields:
            if kind not in Survey.model_fields:
                for index, entry in enumerate(getattr(self, kind)):
                    yield kind, index, entry


class Member(Closed):
    """A member and the sections where it is checked."""

    also_known: ClassVar[frozenset[str]] = frozenset()  # keys said for all sections

    name: Text = Field(description="name of the member")
    sections: tuple[SectionEntry, ...] = Field(
        min_length=1,
        description="sections to check; a key said at the member holds for all its sections",
    )


class Dependence(Closed):
    """Dependence between two common variables in the prior."""

    between: tuple[Text, Text] = Field(
        description="the two variables, as zone.variable or steel.name"
    )
    spearman: Number | None = Field(None, description="rank correlation after Spearman")
    kendall: Number | None = Field(None, description="rank correlation after Kendall")
    pearson: Number | None = Field(None, description="linear correlation")
    source: Text = Field(description="where the coefficient comes from")

    @model_validator(mode="after")
    def _one_coefficient(self) -> "Dependence":
        given = [name for name in _COEFFICIENTS if getattr(self, name) is not None]
        if len(given) != 1:
            what = "dependence takes exactly one coefficient"
            raise QuantityError(what, " and ".join(given) or "none", ", ".join(_COEFFICIENTS))
        if not -1.0 < self.coefficient < 1.0:
            what = f"a {given[0]} coefficient must be between -1 and 1"
            raise QuantityError(what, f"{self.coefficient:g}", "more than -1 and less than 1")
        return self

    @property
    def measure(self) -> Literal["spearman", "kendall", "pearson"]:
        """Name the coefficient that was given."""
        if self.spearman is not None:
            return "spearman"
        return "kendall" if self.kendall is not None else "pearson"

    @property
    def coefficient(self) -> float:
        """Give the coefficient [-]."""
        value: float = getattr(self, self.measure)
        return value


_COEFFICIENTS = ("spearman", "kendall", "pearson")


class Pooling(Closed):
    """Zones whose variable is alike to a degree that the measurements tell."""

    variable: Text = Field(description="variable of each zone, such as concrete_mean")
    zones: tuple[Text, ...] = Field(min_length=2, description="zones that are pooled")
    share: Annotated[NumberDistribution, AfterValidator(within_one)] = Field(
        description="share of the variable's prior variance that is the zone's own, as uncertain; "
        "0: the zones are one, 1: they have nothing in common"
    )


class NamedTarget(Closed):
    """Target index of a published document."""

    set: Text = Field(description="document, such as EN 1990")
    class_: Text = Field(alias="class", description="class within the document")
    period: PositiveNumber = Field(description="reference period of the index [yr]")


class IndexTarget(Closed):
    """Target index that the engineer states."""

    index: Number = Field(description="target reliability index [-]")
    period: PositiveNumber = Field(description="reference period of the index [yr]")
    source: Text = Field(description="where the target is agreed")


Target = Annotated[
    Annotated[NamedTarget, Tag("by set")] | Annotated[IndexTarget, Tag("by index")],
    Discriminator(_target_form, **_one_of("set with class", "index")),
]


class Costs(Closed):
    """What failure and time cost, in one currency."""

    currency: Text = Field(description="currency of all costs, such as EUR")
    failure: PositiveNumber = Field(description="cost of a failure with its consequences")
    discount_rate: Annotated[float, InUnit(NONE, "a discount rate", at_least=0.0, below=0.5)] = (
        Field(description="yearly discount rate, as a fraction")
    )


class Decision(Closed):
    """What is to be decided: target, options, costs."""

    target: Target = Field(description="reliability that is asked for")
    options: tuple[OptionEntry, ...] = Field((), description="what may be done")
    costs: Costs | None = Field(None, description="left out: no costs are compared")


class Sampling(Closed):
    """How the posterior is sampled and integrated."""

    seed: Whole = Field(20260901, ge=0, lt=2**63, description="the same seed, the same numbers")
    chains: Whole = Field(4, ge=2, le=64, description="Markov chains")
    draws: Whole = Field(1000, ge=100, le=1_000_000, description="draws per chain")
    tune: Whole = Field(1000, ge=100, le=1_000_000, description="tuning steps per chain")
    target_accept: Annotated[float, InUnit(NONE, "an acceptance", at_least=0.5, below=1.0)] = Field(
        0.9, description="acceptance that the sampler aims at"
    )
    integration_error: Annotated[
        float, InUnit(NONE, "an error of the index", above=0.0, at_most=0.1)
    ] = Field(0.01, description="integration error of the index that is aimed at [-]")


class CaseSpec(Closed):
    """One structure with its surveys, loads and options."""

    structure: Structure = Field(description="the structure and the time looked at")
    zones: dict[Text, Zone] = Field(min_length=1, description="zones by name")
    steel: dict[Text, Steel] = Field({}, description="reinforcement by name")
    load_models: dict[Text, AnyLoadModel] = Field(
        {}, description="variable loads whose yearly maxima are uncertain, by name"
    )
    quantities: dict[Undotted, AnyQuantity] = Field(
        {},
        description="densities and thicknesses that permanent loads are proportional to, by name",
    )
    surveys: tuple[Survey, ...] = Field((), description="visits with their measurements")
    members: tuple[Member, ...] = Field(min_length=1, description="members to check")
    events: tuple[Event, ...] = Field(
        (), description="load tests survived and years served; they count after the last survey"
    )
    dependence: tuple[Dependence, ...] = Field((), description="dependence in the prior")
    pooling: tuple[Pooling, ...] = Field((), description="zones that are alike to a degree")
    priors: dict[Text, dict[str, Any]] = Field(
        {},
        description="distributions in place of the tool's own, by variable, such as "
        "cover_meter_1.bias; in the unit of the variable",
    )
    decision: Decision = Field(description="what is to be decided")
    sampling: Sampling = Field(default_factory=lambda: Sampling(), description="how it is computed")

    def stages(self) -> dict[date, str]:
        """Name the state of knowledge after each date of surveys, in order of date.

        Surveys of one date lead to one state; it bears the names of those that have one.
        """
        names: dict[date, list[str]] = {}
        for survey in sorted(self.surveys, key=lambda one: one.date):
            names.setdefault(survey.date, []).extend([survey.name] if survey.name else [])
        return {day: " and ".join(found) or day.isoformat() for day, found in names.items()}

    def sections(self) -> dict[str, SectionEntry]:
        """Give all sections by name, in the order of the file."""
        return {entry.name: entry for member in self.members for entry in member.sections}
