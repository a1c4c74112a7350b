"""Evidence: rebound numbers."""

from typing import Any

import numpy as np
from pydantic import Field

from assess.case.forms import Column, EvidenceForm
from assess.case.quantities import CoefficientOfVariation
from assess.case.reader import Case
from assess.updating.indirect_strength import IndirectEntry, IndirectStrength
from assess.updating.kind import FloatArray, Rows
from assess.updating.pulse_velocity import PulseVelocity


class ReboundEntry(IndirectEntry):
    """What a survey says of its rebound numbers."""

    readings: float = Field(
        10.0, ge=1.0, description="Number of readings that each row is the mean or median of."
    )
    V: CoefficientOfVariation = Field(
        0.10,
        description="Coefficient of variation of one rebound number about that of its place. ACI "
        "228.1R (from memory).",
    )


class Rebound(IndirectStrength):
    """Rebound number: ln linear in ln strength, a power law."""

    form = EvidenceForm(
        key="rebound",
        title="Rebound number",
        entry=ReboundEntry,
        columns=(
            Column(
                "rebound",
                "rebound number of a place, corrected for the angle of the hammer",
                "-",
                above=5.0,
                below=100.0,
                usual=(20.0, 60.0),
            ),
        ),
        value="rebound",
        log_scale=True,
    )
    unit = "-"
    log_scale = True
    assumption = (
        "The logarithm of the rebound number is linear in that of strength, places depart from the "
        "line normally; carbonation and moisture of the surface are taken as alike at all places "
        "of a device."
    )
    column = "rebound"

    def transformed(self, reading: FloatArray) -> FloatArray:
        """Take logarithms."""
        return np.log(reading)

    def reading_variance(self, entry: Any) -> float:
        """Variance of ln of the mean of a row's readings."""
        return float(np.log1p(entry.V**2 / entry.readings))

    def earlier(self, case: Case) -> tuple[tuple[str, Rows], ...]:
        """Gather cores and pulse velocities."""
        velocity = PulseVelocity()
        found = velocity.rows(case)
        return (
            *velocity.earlier(case),
            *(() if found is None else ((velocity.form.key, found),)),
        )
