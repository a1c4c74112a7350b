"""What indirect tests of strength have in common: devices, their lines, and pairs with cores."""

from abc import abstractmethod
from collections.abc import Mapping, Sequence
from dataclasses import fields, replace
from typing import Annotated, Any, ClassVar, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import AfterValidator, Field

from assess.case.distributions import Distribution, NumberDistribution, distribution_of
from assess.case.forms import Closed, Column, EvidenceEntry
from assess.case.processes import only_positive
from assess.case.quantities import InUnit
from assess.case.reader import Case, Evidence
from assess.errors import Fault
from assess.updating import strength_places
from assess.updating.indirect_faults import curve_faults, uncounted_readings
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    Numeric,
    Rows,
    build_rows,
    gather,
)
from assess.updating.local import LocalModel
from assess.updating.measuring import restated_faults
from assess.updating.strength_places import StrengthRows
from assess.updating.variables import Variable

EN_13791 = "EN 13791"
READINGS = Column(
    "readings", "single readings behind the row", "-", required=False, above=0.0, below=1000.0
)
PositiveNumberDistribution = Annotated[NumberDistribution, AfterValidator(only_positive)]
ReadingCount = Annotated[float, InUnit("-", "a number of readings", at_least=1.0)]


class Device(Closed):
    """A rebound hammer, or a pulse velocity tester."""

    name: str = Field(
        description="Readings of one name share one line between reading and strength. Concretes "
        "that differ in aggregate, age or carbonation want a name each."
    )
    source: str = Field("", description="Calibration record.")


class StatedLine(Closed):
    """The line of a device as the engineer states it: ln of the reading against ln of strength."""

    slope: PositiveNumberDistribution = Field(
        description="Growth of ln of the reading with ln of the strength. [-]"
    )
    scatter: PositiveNumberDistribution = Field(
        description="Standard deviation of ln of the reading from place to place at one strength. "
        "[-]"
    )


class IndirectEntry(EvidenceEntry):
    """What a survey says of its indirect readings, beside what the kind adds."""

    device: Device


class IndirectStrength(EvidenceKind):
    r"""Indirect strength: ln reading = ln a + b (ln f - ln 30 MPa) + place's departure + error.

    Notes
    -----
    Level a (the reading at a strength of 30 MPa), slope b and scatter s belong to the device.
    Readings of a device at one place share its departure :math:`\delta \sim N(0, s^2)` from the
    line (moisture, carbonation, aggregate); a reading has an error of its own, the stated
    coefficient of variation over the square root of the number of single readings behind it. A
    line in the logarithms is a power law, the form of conversion models that keeps both sides
    positive [1]_. How places that cores, too, know of enter: `strength_places.log_likelihood`.

    References
    ----------
    .. [1] D. Breysse, Nondestructive evaluation of concrete strength: an historical review and a
       new perspective by combining NDT methods, Constr. Build. Mater. 33 (2012) 139-163.
    """

    log_scale = True
    carrier = "concrete_mean"

    symbol: ClassVar[str]

    @abstractmethod
    def earlier(self, case: Case) -> dict[str, Rows]:
        """Gather what the kinds before this one have measured."""

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find devices without a line, and with more than one; readings that are no number."""
        found: list[Fault] = list(curve_faults(case, self.form))
        for _, item in gather(case, self.form.key):
            found += uncounted_readings(item.table)
        return found or list(restated_faults(case, self.variables(case), only_positive))

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give level, slope and scatter of each device."""
        return tuple(
            Variable(
                name=f"{self.form.key}.{name}.{what}",
                label=f"{words}, {name}",
                symbol=f"${symbol}_\\mathrm{{{self.symbol}}}$",
                unit=self.unit if what == "level" else "-",
                zone="",
                source=stated.source,
                marginal=stated.marginal(),
            )
            for name, curve in devices(case, self.form.key).items()
            for what, words, symbol in (
                ("level", f"{self.form.value} at 30 MPa", "a"),
                ("slope", f"growth of ln {self.form.value} with ln strength", "b"),
                ("scatter", f"scatter of ln {self.form.value} from place to place", "s"),
            )
            for stated in (self._stated(curve, what),)
        )

    def _stated(self, curve: object, what: str) -> Distribution:
        """Give the prior of one variable: stated, of the published curve, or wide for pairs."""
        if isinstance(curve, StatedLine):
            return cast(Distribution, getattr(curve, what))
        basis = f"by {EN_13791}" if curve == EN_13791 else "left to pairs"
        entry = f"{self.form.value} {what} {basis}"
        return distribution_of(self.unit if what == "level" else "-").model_validate(
            {"catalogue": entry}
        )

    def rows(self, case: Case) -> StrengthRows | None:
        """Gather the readings of all surveys, and those of the kinds before."""
        items = gather(case, self.form.key)
        if not items:
            return None
        names = tuple(devices(case, self.form.key))
        value, error, device = [], [], []
        for _, item in items:
            entry = cast(Any, item.entry)
            value.append(np.log(item.table.numbers[self.form.value]))
            said = item.table.numbers["readings"]
            count = np.where(np.isfinite(said), said, entry.readings)
            error.append(np.log1p(entry.reading_error**2) / count)
            device.append(np.full(len(item.table), float(names.index(entry.device.name))))
        rows = build_rows(items, value, {"error": error, "device": device})
        known = {one.name: getattr(rows, one.name) for one in fields(Rows)}
        return StrengthRows(**known, devices=names, earlier=self.earlier(case))

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Statistics of lone readings and readings of shared places, later surveys off."""
        return strength_places.data(self.form.key, cast(StrengthRows, rows), stage)

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active readings given those of the kinds before."""
        known = cast(StrengthRows, rows)
        return strength_places.log_likelihood(self.form.key, known, values, data)

    def without(self, rows: Rows, key: str) -> Rows:
        """Leave out readings of another kind that these are given."""
        known = cast(StrengthRows, rows)
        if key not in known.earlier:
            return rows
        kept = {name: some for name, some in known.earlier.items() if name != key}
        return replace(known, earlier=kept)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw ln of the same readings given those of the kinds before, (n_draw, n_row)."""
        return strength_places.simulate(self.form.key, cast(StrengthRows, rows), values, rng)

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Strength at a section read by this test, given all kinds before it, too."""
        known = cast(StrengthRows | None, rows)
        at = (section, zone)
        return strength_places.local_strength(self.form.key, known, stage, at, values)


def devices(case: Case, key: str) -> dict[str, object]:
    """Name the devices of a kind in order of first use, each with its curve, None for none."""
    found: dict[str, object] = {}
    for _, item in gather(case, key):
        name, curve = device_and_curve(item)
        found[name] = found.get(name) or curve
    return found


def device_and_curve(item: Evidence) -> tuple[str, object]:
    """Give what an entry says of its device and of that one's curve."""
    entry = cast(Any, item.entry)
    return entry.device.name, entry.curve
