"""What a limit state must bring, and what it is told about a section.

A limit state is one subclass of `LimitState` in a file of its own and one line in
`assess.reliability.limit_states`.
"""

from abc import ABC, abstractmethod
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray

from assess.case.forms import Complaint, LimitStateForm
from assess.case.spec import CaseSpec
from assess.reliability.annual_maximum import AnnualMaximum as AnnualMaximum

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Action:
    """What an option does to a section, as far as its reliability is concerned.

    Attributes
    ----------
    arrest_age : float
        Age of the structure from which corrosion is slowed [yr]; inf for never.
    arrest_efficiency : float
        Share of the corrosion current that is then stopped [-].
    load_factor : ndarray, shape (n_year,), or 1.0
        On the variable load effect of each year [-].
    """

    arrest_age: float = np.inf
    arrest_efficiency: float = 1.0
    load_factor: FloatArray | float = 1.0


@dataclass(frozen=True, slots=True, eq=False)
class Surroundings:
    """What a limit state sees of one section: draws, local values and the passing of time.

    ``local`` holds what the kinds of evidence know of the section, each (n, k, 1): strength
    [MPa], cover [mm], onset [yr], current [µA/cm²] where the zone corrodes; where measured, or
    where the zone says more of them, yield strength [MPa], deviations of dimensions and bar
    diameter [mm], bar count; ``common`` the common variables by name, (n, 1, 1); ``chance`` the
    limit state's own standard normals, each (n, k, 1), without those that a local variable of
    the same name stands for. ``corroding`` turns an onset into years of corrosion at full
    current, (n, k, n_year), the option's arrest included.
    """

    local: Mapping[str, FloatArray]
    common: Mapping[str, FloatArray]
    chance: Mapping[str, FloatArray]
    age: FloatArray  # of the structure at the end of each year, (n_year,) [yr]
    action: Action = field(default_factory=Action)

    @property
    def corrodes(self) -> bool:
        """Whether the zone has a corrosion model."""
        return "onset" in self.local

    def corroding(self) -> FloatArray:
        """Years of corrosion at full current at the end of each year, (n, k, n_year)."""
        onset = self.local["onset"]
        before = np.minimum(self.age, self.action.arrest_age)
        years = np.maximum(before - onset, 0.0)
        if self.action.arrest_efficiency < 1.0:
            since = np.maximum(self.age - np.maximum(onset, self.action.arrest_age), 0.0)
            years = years + (1.0 - self.action.arrest_efficiency) * since
        return years


class LimitState(ABC):
    """One limit state at a section."""

    form: ClassVar[LimitStateForm]

    def faults(self, entry: Any, spec: CaseSpec) -> Sequence[Complaint]:
        """Find what no section can be like, though each of its quantities is allowed."""
        return ()

    @abstractmethod
    def chances(self, entry: Any) -> Mapping[str, str]:
        """Name the section's own standard normals, each with the group it counts to in words."""

    @abstractmethod
    def steels(self, entry: Any) -> tuple[str, ...]:
        """Name the reinforcements that the section uses."""

    @abstractmethod
    def load_capacity(self, entry: Any, spec: CaseSpec, here: Surroundings) -> FloatArray:
        """Variable load effect that uses the section up exactly, (n, k, n_year)."""

    def load_models(self, entry: Any) -> tuple[str, ...]:
        """Name the load models, with uncertain parameters, that the section uses."""
        return ()

    def quantities(self, entry: Any) -> tuple[str, ...]:
        """Name the measurable quantities that the section's permanent loads depend on."""
        return ()

    @abstractmethod
    def annual_maximum(
        self, entry: Any, spec: CaseSpec, years: FloatArray, common: Mapping[str, FloatArray]
    ) -> AnnualMaximum:
        """Give the largest variable load effect of each calendar year, before any option."""

    @abstractmethod
    def assumptions(self, entry: Any, spec: CaseSpec) -> tuple[str, ...]:
        """Say in sentences what the check assumes, for the report."""
