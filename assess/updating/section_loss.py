"""Evidence: loss of bar diameter measured at break-outs, and break-outs without loss."""

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess.case.forms import Column, EvidenceEntry, EvidenceForm, Judged, Table
from assess.case.quantities import CoefficientOfVariation, Length
from assess.case.reader import Case
from assess.errors import Fault
from assess.updating import corrosion_history as history
from assess.updating.corrosion_history import Places, Population
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    IntArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    population_local,
    zone_values,
)
from assess.updating.local import LocalModel
from assess.updating.local_corrosion import measured_corrosion
from assess.updating.loss_faults import healed_place, impossible_losses
from assess.updating.loss_readings import LossReadings, loss_readings


def _loss_of_diameter(entry: EvidenceEntry, table: Table) -> FloatArray:
    """Loss of diameter that counts as found, NaN elsewhere [mm]."""
    read = _read(cast(SectionLossEntry, entry), table)
    loss = np.full(len(table), np.nan)
    loss[read.row[::-1]] = 2.0 * np.exp(read.log_loss[::-1])  # the even loss before the pit
    return loss


NONE_FOUND = ("none", "no loss", "none found", "no loss found")


class SectionLossEntry(EvidenceEntry):
    """What a survey says of its break-outs."""

    detection_limit: Length = Field(
        description="Smallest loss of radius that would have been noticed; smaller losses are "
        "reported as none found. [mm]"
    )
    error: CoefficientOfVariation = Field(
        description="Coefficient of variation of a measured loss about the true mean loss."
    )
    pit_length: Length = Field(
        200.0, description="Length of bar over which the deepest pit was looked for. [mm]"
    )


def _read(entry: SectionLossEntry, table: Table) -> LossReadings:
    return loss_readings(table, entry.detection_limit, entry.error, entry.pit_length)


class SectionLoss(EvidenceKind):
    r"""Section loss: onset and corrosion current of a place, seen through the loss of its bar.

    Notes
    -----
    At a place :math:`\ln t_i \sim N(\ln \bar t, s_t^2)` (onset), :math:`\ln i \sim N(\ln \bar
    \imath, s_i^2)` (current), and at time t the loss of radius is :math:`p = k\, i\, (t -
    t_i)^+` by Faraday's law. A loss is found when p reaches the detection limit; then it is
    measured as :math:`p e^{\epsilon}`, :math:`\epsilon \sim N(0, \ln(1+V^2))`. "None found"
    says that p is below the limit, whether corrosion has begun or not. Onset and current of the
    place are integrated out, `corrosion_history.log_likelihood`.
    """

    form = EvidenceForm(
        key="section_loss",
        title="Loss of bar diameter",
        entry=SectionLossEntry,
        columns=(
            Column(
                "original diameter",
                "diameter of the sound bar",
                "mm",
                above=0.0,
                below=100.0,
                usual=(5.0, 50.0),
            ),
            Column(
                "residual diameter",
                "mean diameter left after cleaning",
                "mm",
                required=False,
                above=0.0,
                below=100.0,
                usual=(3.0, 50.0),
                absent=NONE_FOUND,
            ),
            Column(
                "residual mass",
                "mass per length left after cleaning, in place of the diameter",
                "g/mm",
                required=False,
                above=0.0,
                below=100.0,
            ),
            Column(
                "pit depth",
                "depth of the deepest pit below the sound surface",
                "mm",
                required=False,
                above=0.0,
                below=50.0,
                usual=(0.05, 25.0),
            ),
        ),
        value="residual diameter",
        log_scale=True,
        judged=Judged("loss of diameter", _loss_of_diameter),
    )
    unit = "mm"
    log_scale = True
    assumption = (
        "Onset and corrosion current at a place are lognormal within the zone and independent of "
        "each other there; the current is constant from the onset on; a break-out without loss "
        "says that the loss was below its detection limit."
    )
    carrier = "onset"

    def rows(self, case: Case) -> Rows | None:
        """Gather the break-outs of all surveys; `Rows.value` is ln of the loss of radius."""
        items = gather(case, self.form.key)
        if not items:
            return None
        value: list[FloatArray] = []
        extra: dict[str, list[FloatArray]] = {"age": [], "limit": [], "precision": []}
        taken: list[IntArray] = []
        before = 0
        for _, item in items:
            read = _read(cast(SectionLossEntry, item.entry), item.table)
            value.append(read.log_loss)
            extra["age"].append(np.full(len(read.row), item.age))
            extra["limit"].append(read.log_limit)
            extra["precision"].append(1.0 / read.variance)
            taken.append(before + read.row)
            before += len(item.table)
        # One entry a row first, for places and zones; then each reading takes those of its row.
        count = [np.full(len(item.table), np.nan) for _, item in items]
        rows = build_rows(items, count, {})
        row = np.concatenate(taken)
        return replace(
            rows,
            value=np.concatenate(value),
            stage=rows.stage[row],
            zone=rows.zone[row],
            place=rows.place[row],
            extra={
                "row": row.astype(np.float64),
                **{name: np.concatenate(parts) for name, parts in extra.items()},
            },
        )

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find residual diameters above the original, and losses that have healed."""
        found: list[Fault] = []
        for _, item in gather(case, self.form.key):
            found += impossible_losses(item.table)
            without = [z for z in dict.fromkeys(item.zone) if case.spec.zones[z].corrosion is None]
            found += [
                Fault(
                    str(item.table.path),
                    int(item.table.lines[np.flatnonzero(item.zone == zone)[0]]),
                    "loss was looked for in a zone without corrosion",
                    zone,
                    "zones with `corrosion`",
                    "state onset and current of the zone in the case file",
                )
                for zone in without
            ]
        rows = None if found else self.rows(case)
        if rows is not None:
            for place in history.healed_places(rows):
                found.append(healed_place(rows, place, gather(case, self.form.key)))
        return found

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Places with their earliest found and latest none-found times, and measured losses."""
        return history.places(rows, stage).data()

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active break-outs, onset and current integrated out."""
        population = self._population(rows, values)
        zone = rows.place_zone
        return history.log_likelihood(
            Places.from_data(data, history.count_visits(rows)),
            Population(*(part[..., zone, None] for part in population)),
        ).sum(axis=-1)

    def _population(self, rows: Rows, values: Mapping[str, Numeric]) -> Population:
        return history.population(
            zone_values(rows, values, "onset"),
            zone_values(rows, values, "onset_scatter"),
            zone_values(rows, values, "current"),
            zone_values(rows, values, "current_scatter"),
        )

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw ln of the loss at the same break-outs, NaN where none would be found."""
        draws = self._population(rows, values)
        shape = (len(draws.log_onset), len(rows.places))
        onset = np.exp(
            draws.log_onset[:, rows.place_zone]
            + draws.onset_scatter[:, rows.place_zone] * rng.standard_normal(shape)
        )[:, rows.place]
        log_rate = (
            draws.log_rate[:, rows.place_zone]
            + draws.rate_scatter[:, rows.place_zone] * rng.standard_normal(shape)
        )[:, rows.place]
        age = np.maximum(rows.extra["age"] - onset, 1e-12)
        log_loss = log_rate + np.log(age)
        error = rng.standard_normal(log_loss.shape) / np.sqrt(rows.extra["precision"])
        return np.where(log_loss >= rows.extra["limit"], log_loss + error, np.nan)

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Onset and current at a section, given its own break-outs."""
        if f"{zone}.onset" not in values:
            return ()
        place = None if rows is None else rows.place_of(section)
        known = None if rows is None or place is None else history.places(rows, stage).one(place)
        if known is None or not known.anything_known:
            return (
                population_local("onset", values, zone, "onset", "onset_scatter", logarithm=True),
                population_local(
                    "current", values, zone, "current", "current_scatter", logarithm=True
                ),
            )
        zone_of = history.population(
            *(
                values[f"{zone}.{name}"]
                for name in ("onset", "onset_scatter", "current", "current_scatter")
            )
        )
        return (measured_corrosion(known, zone_of),)
