"""Evidence: rebound numbers of the concrete's surface."""

from collections.abc import Sequence
from typing import Literal, cast

from pydantic import Field

from assess.case.forms import Column, EvidenceEntry, EvidenceForm, Table
from assess.case.quantities import CoefficientOfVariation
from assess.case.reader import Case
from assess.errors import Fault
from assess.mechanics.indirect_strength import REBOUND_RANGE
from assess.updating.indirect_faults import beyond_curve
from assess.updating.indirect_strength import (
    EN_13791,
    READINGS,
    IndirectEntry,
    IndirectStrength,
    PositiveNumberDistribution,
    ReadingCount,
    StatedLine,
)
from assess.updating.kind import Rows
from assess.updating.strength_places import CORES


class ReboundLine(StatedLine):
    """The line of a rebound hammer as the engineer states it."""

    level: PositiveNumberDistribution = Field(
        description="Rebound number at a strength in the structure of 30 MPa. [-]"
    )


class ReboundEntry(IndirectEntry):
    """What a survey says of its rebound numbers."""

    curve: Literal["EN 13791"] | ReboundLine | None = Field(
        None,
        description="Line from strength to rebound number before any pair is looked at. Left out: "
        "it is learned from places that have cores, too.",
    )
    readings: ReadingCount = Field(
        9.0,
        description="Single readings behind a row, if it has no column readings. EN 12504-2 wants "
        "at least nine.",
    )
    reading_error: CoefficientOfVariation = Field(
        0.10,
        description="Coefficient of variation of single readings at one place. ACI 228.1R: about "
        "0.10 (from memory).",
    )


def _doubts(entry: EvidenceEntry, table: Table) -> Sequence[Fault]:
    if cast(ReboundEntry, entry).curve != EN_13791:
        return ()
    return beyond_curve(Rebound.form, table, REBOUND_RANGE, EN_13791)


class Rebound(IndirectStrength):
    """Rebound numbers: see `IndirectStrength`; given cores at the same places."""

    form = EvidenceForm(
        key="rebound",
        title="Rebound numbers",
        entry=ReboundEntry,
        columns=(
            Column(
                "rebound number",
                "median of the readings at a place, impact horizontal or corrected to it",
                "-",
                above=0.0,
                below=100.0,
                usual=(20.0, 60.0),
            ),
            READINGS,
        ),
        value="rebound number",
        log_scale=True,
        doubts=_doubts,
    )
    unit = "-"
    symbol = "R"
    assumption = (
        "ln of a rebound number is a line in ln of the local strength, one for each device, with a "
        "scatter from place to place; it is learned from places with cores, or stated. Carbonated, "
        "dry or hammered-smooth surfaces read high, wet ones low, and impact that is not "
        "horizontal reads otherwise: places with cores tell of this only if they are alike."
    )

    def earlier(self, case: Case) -> dict[str, Rows]:
        """Gather the cores."""
        cores = CORES.rows(case)
        return {} if cores is None else {CORES.form.key: cores}
