"""What rebound number and pulse velocity share as evidence: devices, pairs, published curves."""

from abc import abstractmethod
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any, ClassVar, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess.case.forms import EvidenceEntry
from assess.case.processes import only_positive
from assess.case.reader import Case
from assess.errors import Fault
from assess.updating import strength_places
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    place_keys,
)
from assess.updating.local import LocalModel
from assess.updating.measuring import catalogue_variable, restated_faults
from assess.updating.strength_places import PairedRows, variable_name
from assess.updating.variables import Variable

FEWEST_PAIRS = 1
WORDS = {
    "level": ("at a strength of 30 MPa", "$a$"),
    "slope": ("for a unit of ln strength", "$b$"),
    "scatter": ("scatter of places about the line", "$s$"),
}


class IndirectEntry(EvidenceEntry):
    """What a survey says of an indirect test."""

    device: str = Field(
        "device",
        pattern=r"^[^.]+$",
        description="Name of the device with its operator's way of using it: readings of one name "
        "share one line.",
    )
    curve: str | None = Field(
        None,
        description="'published' where no cores were taken at places of these readings: the line "
        "of the literature then counts with its full uncertainty.",
        pattern="^published$",
    )
    readings: float = Field(
        1.0, ge=1.0, description="Number of readings that each row is the mean of."
    )


class IndirectStrength(EvidenceKind):
    r"""Readings that rise with strength: y = a + b (ln f - ln 30 MPa) + departure + error.

    Notes
    -----
    a, b and the scatter of the departures are common to all readings of a device and have
    published priors; places that have cores too teach them, all other places are read by what
    they have become. The departure of a place from the line (moisture, carbonation, aggregate)
    stays the same in repeated readings there, the error of reading averages out. Local strengths
    integrate out in closed form, together with cores (`strength_places.log_likelihood`).

    References
    ----------
    .. [1] EN 13791:2019, clause 8.2: indirect testing with at least eight pairs (from memory).
    .. [2] ACI 228.1R, In-Place Methods to Estimate Concrete Strength (from memory).
    """

    column: ClassVar[str]  # of the table
    before: ClassVar[tuple[str, ...]]  # kinds that this one's density is given
    carrier = ""

    @abstractmethod
    def transformed(self, reading: FloatArray) -> FloatArray:
        """Give readings on the scale on which they are linear in ln strength."""

    @abstractmethod
    def reading_variance(self, entry: Any) -> float:
        """Variance of the error of one row, on that scale."""

    @abstractmethod
    def earlier(self, case: Case) -> tuple[tuple[str, Rows], ...]:
        """Gather the readings of the kinds before this one."""

    def rows(self, case: Case) -> PairedRows | None:
        """Gather the readings of all surveys."""
        items = gather(case, self.form.key)
        if not items:
            return None
        entries = [cast(IndirectEntry, item.entry) for _, item in items]
        devices = tuple(dict.fromkeys(entry.device for entry in entries))
        counts = [len(item.zone) for _, item in items]
        rows = build_rows(
            items,
            [self.transformed(item.table.numbers[self.column]) for _, item in items],
            {
                "device": [
                    np.full(n, float(devices.index(e.device)))
                    for n, e in zip(counts, entries, strict=True)
                ],
                "variance": [
                    np.full(n, self.reading_variance(e))
                    for n, e in zip(counts, entries, strict=True)
                ],
            },
        )
        return PairedRows(
            rows.value,
            rows.stage,
            rows.zone,
            rows.place,
            rows.place_zone,
            rows.zones,
            rows.places,
            rows.extra,
            devices,
            self.earlier(case),
        )

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the line of each device."""
        key = self.form.key
        entries = [cast(IndirectEntry, item.entry) for _, item in gather(case, key)]
        devices = dict.fromkeys(entry.device for entry in entries)
        return tuple(
            catalogue_variable(
                variable_name(key, device, what),
                f"{self.form.title.lower()} {words}, {device}",
                symbol,
                self.unit_of(what),
                f"{key.replace('_', ' ')}, {what}",
            )
            for device in devices
            for what, (words, symbol) in WORDS.items()
        )

    def unit_of(self, what: str) -> str:
        """Give the unit of a variable of the line."""
        return "-"

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find devices without a core at any of their places, and lines that fall."""
        key = self.form.key
        cored = {
            name
            for _, item in gather(case, strength_places.CORES)
            for name in place_keys(item)
            if name
        }
        paired: dict[str, int] = {}
        items = gather(case, key)
        for _, item in items:
            device = cast(IndirectEntry, item.entry).device
            paired[device] = paired.get(device, 0) + len(cored.intersection(place_keys(item)))
        found = []
        for _, item in items:
            entry = cast(IndirectEntry, item.entry)
            if entry.curve is None and paired[entry.device] < FEWEST_PAIRS:
                found.append(
                    case.document.fault(
                        item.keys,
                        f"no core was taken at a place that {entry.device!r} read",
                        mend="name places alike in both tables (location or section), or say "
                        "curve: published",
                    )
                )
        slopes = [v for v in self.variables(case) if not v.name.endswith(".level")]
        found += restated_faults(case, slopes, only_positive)
        return found

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Means by place, with later surveys switched off."""
        return strength_places.data(self.form.key, cast(PairedRows, rows), stage)

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-density of all active readings given the kinds before."""
        return strength_places.log_likelihood(self.form.key, cast(PairedRows, rows), values, data)

    def without(self, rows: Rows, key: str) -> Rows:
        """Leave out readings of another kind that these are given."""
        paired = cast(PairedRows, rows)
        if all(name != key for name, _ in paired.earlier):
            return rows
        return replace(
            paired, earlier=tuple((name, some) for name, some in paired.earlier if name != key)
        )

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw readings at the same places, given the cores that were taken there."""
        return strength_places.simulate(self.form.key, cast(PairedRows, rows), values, rng)

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Strength at a section by these readings, its cores and what else was read there."""
        place = None if rows is None else rows.place_of(section)
        if rows is None or place is None:
            return ()
        if rows.stage[rows.place == place].min() > stage:
            return ()
        paired = cast(PairedRows, rows)
        return (strength_places.local_strength(self.form.key, paired, stage, place, values),)
