"""What may be done about a structure. One class and one registry line per kind."""

from abc import ABC, abstractmethod
from collections.abc import Mapping
from types import MappingProxyType
from typing import Annotated, Any, ClassVar, Literal

import numpy as np
from pydantic import Field

from assess.case.forms import OptionEntry, OptionForm
from assess.case.quantities import Fraction, InUnit
from assess.case.spec import CaseSpec
from assess.reliability.limit_state import Action
from assess.units import NONE

LEAVE = "leave"


class CostedOption(OptionEntry):
    """What every option says of its price."""

    cost: Annotated[float, InUnit(NONE, "a cost", at_least=0.0)] | None = Field(
        None, description="cost in the year it is carried out, in the currency of `costs`"
    )


class ArrestCorrosion(CostedOption):
    """Corrosion slowed or stopped from a year on."""

    kind: Literal["arrest corrosion"]
    from_year: int = Field(alias="from", description="first year in which it works")
    efficiency: Fraction = Field(1.0, description="share of the corrosion current it stops")


class LimitLoad(CostedOption):
    """The variable load limited from a year on."""

    kind: Literal["limit load"]
    from_year: int = Field(alias="from", description="first year in which the limit holds")
    factor: Annotated[float, InUnit(NONE, "a factor", above=0.0, at_most=1.0)] = Field(
        description="on the year's largest variable load effect, its scatter scaled with it"
    )


class OptionKind(ABC):
    """One kind of option."""

    form: ClassVar[OptionForm]

    @abstractmethod
    def action(self, entry: Any, spec: CaseSpec, years: "np.ndarray", age: "np.ndarray") -> Action:
        """Say what the option does, given calendar years and ages at their ends."""

    @abstractmethod
    def describe(self, entry: Any) -> str:
        """Describe the option in a sentence for the report."""


class Arrest(OptionKind):
    """Corrosion slowed or stopped: loss goes on from the arrest at the current that is left."""

    form = OptionForm("arrest corrosion", "Arrest corrosion", ArrestCorrosion)

    def action(
        self, entry: ArrestCorrosion, spec: CaseSpec, years: "np.ndarray", age: "np.ndarray"
    ) -> Action:
        """Slow corrosion from the start of the stated year."""
        start = age[0] - 1.0 + (entry.from_year - spec.structure.assessed)
        return Action(arrest_age=float(start), arrest_efficiency=entry.efficiency)

    def describe(self, entry: ArrestCorrosion) -> str:
        """Describe the option."""
        share = "" if entry.efficiency == 1.0 else f" by {entry.efficiency:.0%}"
        verb = "stopped" if entry.efficiency == 1.0 else "reduced"
        return f"Corrosion {verb}{share} from the start of {entry.from_year}."


class Limit(OptionKind):
    """The variable load scaled down: all of it, mode and scale of the year's maximum alike."""

    form = OptionForm("limit load", "Limit the variable load", LimitLoad)

    def action(
        self, entry: LimitLoad, _spec: CaseSpec, years: "np.ndarray", _age: "np.ndarray"
    ) -> Action:
        """Scale the load from the stated year on."""
        return Action(load_factor=np.where(years >= entry.from_year, entry.factor, 1.0))

    def describe(self, entry: LimitLoad) -> str:
        """Describe the option."""
        return (
            f"Variable load limited to {entry.factor:g} of today's from {entry.from_year}, "
            "its distribution scaled; the limit is taken as obeyed."
        )


OPTIONS: Mapping[str, OptionKind] = MappingProxyType(
    {kind.form.key: kind for kind in (Arrest(), Limit())}
)
