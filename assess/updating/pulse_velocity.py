"""Evidence: velocities of ultrasonic pulses through the concrete."""

from collections.abc import Sequence
from typing import Annotated, ClassVar, Literal, cast

from pydantic import AfterValidator, Field

from assess.case.distributions import Distribution
from assess.case.forms import Column, EvidenceEntry, EvidenceForm, Table
from assess.case.processes import only_positive
from assess.case.quantities import CoefficientOfVariation
from assess.case.reader import Case
from assess.errors import Fault
from assess.mechanics.indirect_strength import VELOCITY_RANGE
from assess.updating.indirect_faults import beyond_curve
from assess.updating.indirect_strength import (
    EN_13791,
    READINGS,
    IndirectEntry,
    IndirectStrength,
    ReadingCount,
    StatedLine,
)
from assess.updating.kind import Rows
from assess.updating.rebound import Rebound

REBOUND = Rebound()


class VelocityDistribution(Distribution):
    """An uncertain velocity, in km/s."""

    unit: ClassVar[str] = "km/s"
    positive: ClassVar[bool] = True


class VelocityLine(StatedLine):
    """The line of pulse velocities as the engineer states it."""

    level: Annotated[VelocityDistribution, AfterValidator(only_positive)] = Field(
        description="Pulse velocity at a strength in the structure of 30 MPa. [km/s]"
    )


class PulseVelocityEntry(IndirectEntry):
    """What a survey says of its pulse velocities."""

    curve: Literal["EN 13791"] | VelocityLine | None = Field(
        None,
        description="Line from strength to pulse velocity before any pair is looked at. Left out: "
        "it is learned from places that have cores, too.",
    )
    readings: ReadingCount = Field(
        1.0, description="Single readings behind a row, if it has no column readings."
    )
    reading_error: CoefficientOfVariation = Field(
        0.02,
        description="Coefficient of variation of single readings at one place. ACI 228.1R: about "
        "0.02 (from memory).",
    )


def _doubts(entry: EvidenceEntry, table: Table) -> Sequence[Fault]:
    if cast(PulseVelocityEntry, entry).curve != EN_13791:
        return ()
    return beyond_curve(PulseVelocity.form, table, VELOCITY_RANGE, EN_13791)


class PulseVelocity(IndirectStrength):
    """Pulse velocities: see `IndirectStrength`; given cores and rebound at the same places."""

    form = EvidenceForm(
        key="pulse_velocity",
        title="Pulse velocities",
        entry=PulseVelocityEntry,
        columns=(
            Column(
                "pulse velocity",
                "path over transit time, direct transmission or corrected to it",
                "km/s",
                above=0.0,
                below=8.0,
                usual=(3.0, 5.5),
            ),
            READINGS,
        ),
        value="pulse velocity",
        log_scale=True,
        doubts=_doubts,
    )
    unit = "km/s"
    symbol = "v"
    assumption = (
        "ln of a pulse velocity is a line in ln of the local strength, one for each device, with a "
        "scatter from place to place that is independent of that of the rebound number; it is "
        "learned from places with cores, or stated. Aggregate sets its level; wet concrete and "
        "bars along the path read high, cracks read low: places with cores tell of this only if "
        "they are alike."
    )

    def earlier(self, case: Case) -> dict[str, Rows]:
        """Gather the cores and the rebound numbers."""
        rebound = REBOUND.rows(case)
        return REBOUND.earlier(case) | ({} if rebound is None else {REBOUND.form.key: rebound})
