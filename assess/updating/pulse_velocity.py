"""Evidence: ultrasonic pulse velocity."""

from typing import Any

from pydantic import Field

from assess.case.forms import Column, EvidenceForm
from assess.case.quantities import CoefficientOfVariation
from assess.case.reader import Case
from assess.updating.cores import Cores
from assess.updating.indirect_strength import IndirectEntry, IndirectStrength
from assess.updating.kind import FloatArray, Rows

TYPICAL = 4.2  # [km/s] that a coefficient of variation of reading is taken of


class PulseVelocityEntry(IndirectEntry):
    """What a survey says of its pulse velocities."""

    V: CoefficientOfVariation = Field(
        0.02,
        description="Coefficient of variation of one velocity about that of its place. ACI 228.1R "
        "(from memory).",
    )


class PulseVelocity(IndirectStrength):
    """Pulse velocity: linear in ln strength, an exponential curve of strength in velocity."""

    form = EvidenceForm(
        key="pulse_velocity",
        title="Pulse velocity",
        entry=PulseVelocityEntry,
        columns=(
            Column(
                "velocity",
                "velocity of longitudinal pulses",
                "km/s",
                above=0.5,
                below=8.0,
                usual=(3.0, 5.3),
            ),
        ),
        value="velocity",
    )
    unit = "km/s"
    log_scale = False
    assumption = (
        "Pulse velocity is linear in the logarithm of strength, places depart from the line "
        "normally; moisture, cracks and bars along the path are taken as avoided or alike at all "
        "places of a device."
    )
    column = "velocity"

    def transformed(self, reading: FloatArray) -> FloatArray:
        """Leave velocities as they are."""
        return reading

    def reading_variance(self, entry: Any) -> float:
        """Variance of the mean of a row's readings."""
        return float((entry.V * TYPICAL) ** 2 / entry.readings)

    def unit_of(self, what: str) -> str:
        """Give velocities."""
        return "km/s"

    def earlier(self, case: Case) -> tuple[tuple[str, Rows], ...]:
        """Gather the cores."""
        cores = Cores().rows(case)
        return () if cores is None else (("cores", cores),)
