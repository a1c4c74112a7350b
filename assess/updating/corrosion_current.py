"""Evidence: corrosion current density by polarisation resistance or embedded sensors."""

from collections.abc import Mapping, Sequence
from typing import Annotated, Any, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, model_validator

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm
from assess.case.processes import only_positive
from assess.case.quantities import CoefficientOfVariation, CurrentDensity, InUnit
from assess.case.reader import Case
from assess.errors import Fault
from assess.mechanics.corrosion_current import TEMPERATURE_RANGE, temperature_factor
from assess.probability.marginals import make_marginal
from assess.units import QuantityError
from assess.updating import current_places
from assess.updating.corrosion_faults import zones_without_corrosion
from assess.updating.corrosion_history import LEAST
from assess.updating.current_places import Readings
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    IntArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    zone_values,
)
from assess.updating.local import LocalModel
from assess.updating.measuring import catalogue_variable, restated_faults
from assess.updating.variables import Variable

PASSIVE = ("passive", "none", "below limit")
SEASON = 0.5  # V of an instant reading about the yearly mean, engineering judgement, no source

Celsius = Annotated[
    float,
    InUnit(
        "-",
        "a temperature in degrees Celsius",
        at_least=TEMPERATURE_RANGE[0],
        at_most=TEMPERATURE_RANGE[1],
    ),
]


class CorrosionCurrentEntry(EvidenceEntry):
    """What a survey says of its readings."""

    device: str = Field(
        min_length=1, description="Readings of one device share one unknown factor."
    )
    average: bool = Field(
        False,
        description="True for yearly means, such as of an embedded sensor; false for instant "
        "readings, which the season has its part in.",
    )
    season: CoefficientOfVariation | None = Field(
        None,
        description="Coefficient of variation of an instant reading about the yearly mean, common "
        f"to all readings of one visit; {SEASON:g} if left out (engineering judgement, no source).",
    )
    repeatability: CoefficientOfVariation = Field(
        0.2,
        description="Coefficient of variation of one reading about the mean of many at the same "
        "spot and time. Engineering judgement, no source.",
    )
    passive_limit: CurrentDensity = Field(
        0.1,
        description="Readings below it, or said to be passive, tell that the bar is passive or "
        "corrodes slowly; a reading such as <0.2 has its own limit. [µA/cm²] Default: negligible "
        "corrosion after RILEM TC 154-EMC, read in a secondary source.",
    )
    temperature: Celsius | None = Field(
        None, description="Temperature of the concrete when read; together with mean_temperature."
    )
    mean_temperature: Celsius | None = Field(
        None, description="Yearly mean of that temperature: readings are taken to it."
    )

    @model_validator(mode="after")
    def _agrees(self) -> "CorrosionCurrentEntry":
        if (self.temperature is None) != (self.mean_temperature is None):
            given = "temperature" if self.mean_temperature is None else "mean_temperature"
            allowed = "temperature and mean_temperature, or neither"
            raise QuantityError("one temperature without the other", given, allowed)
        if self.average and (self.season is not None or self.temperature is not None):
            given = "season" if self.season is not None else "temperature"
            mend = "leave it out, or say average: false"
            raise QuantityError("a yearly mean has no season", given, "average alone", mend)
        return self

    @property
    def log_season(self) -> float:
        """Standard deviation of ln of the season's factor; 0 for yearly means."""
        V = SEASON if self.season is None else self.season
        return 0.0 if self.average else float(np.sqrt(np.log1p(V**2)))

    @property
    def log_correction(self) -> float:
        """Logarithm of the factor from the temperature when read to the yearly mean."""
        if self.temperature is None or self.mean_temperature is None:
            return 0.0
        read, mean = temperature_factor([self.temperature, self.mean_temperature])
        return float(np.log(mean / read))


class CorrosionCurrent(EvidenceKind):
    r"""Corrosion current: reading = local current, device factor, season and error, if active.

    Notes
    -----
    At a place whose onset lies before the survey, with :math:`\ln i \sim N(\ln \bar\imath, s_i^2)`
    the local mean current since the onset,

    .. math:: \ln r = \ln i + \ln f_{device} + \sigma_{season}\, b_{visit} + \epsilon, \quad
              \epsilon \sim N(0, \ln(1 + V^2))

    :math:`f_{device}` is common to all readings of a device, :math:`b_{visit}` (standard normal)
    to all instant readings of one visit, as weather is. A reading below the device's limit for
    passive steel says that the bar is passive, or active and reads so low; a passive bar always
    does. Onset and current of a place are integrated out: in closed form for a reading on its
    own, which then enters through counts, mean and sum of squares of its table and zone; by
    `current_places` for places that were read more than once.
    """

    form = EvidenceForm(
        key="corrosion_current",
        title="Corrosion current density",
        entry=CorrosionCurrentEntry,
        columns=(
            Column(
                "current",
                "corrosion current density as read",
                "µA/cm^2",
                above=0.0,
                below=1000.0,
                usual=(0.01, 30.0),
                below_detection=True,
                absent=PASSIVE,
            ),
        ),
        value="current",
        log_scale=True,
    )
    unit = "µA/cm²"
    log_scale = True
    assumption = (
        "A corrosion current that was read is the local mean current since the onset times a "
        "factor of the device, one of the season at that visit and an error; a passive bar reads "
        "below the device's limit; a place that was also looked at by other means counts as "
        "another place of the zone, and a reading at a section informs the zone, not the section's "
        "own onset and current."
    )
    carrier = "current"

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the factor of each device, and the season of each visit with instant readings."""
        items = gather(case, self.form.key)
        visits = {
            stage: item.survey
            for stage, item in items
            if not cast(CorrosionCurrentEntry, item.entry).average
        }
        standard = make_marginal("normal", parameters={"mean": 0.0, "sd": 1.0})
        return (
            *(
                catalogue_variable(
                    _device_name(number),
                    f"factor of device {name} on corrosion currents",
                    "$f_\\mathrm{device}$",
                    "-",
                    "corrosion current device factor",
                )
                for number, name in enumerate(self._devices(case))
            ),
            *(
                Variable(
                    _season_name(stage),
                    f"season's part in the currents of {survey}, in its standard deviations",
                    "$b_\\mathrm{season}$",
                    "-",
                    "",
                    "by construction; its scatter is that of the survey's entry",
                    standard,
                )
                for stage, survey in visits.items()
            ),
        )

    def _devices(self, case: Case) -> list[str]:
        """Name the devices of a case in order of first use."""
        items = gather(case, self.form.key)
        return list(
            dict.fromkeys(cast(CorrosionCurrentEntry, item.entry).device for _, item in items)
        )

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find readings in zones that do not corrode, and impossible device factors."""
        items = gather(case, self.form.key)
        devices = [one for one in self.variables(case) if one.name.startswith(_DEVICE)]
        return [
            *zones_without_corrosion(case, items, "a corrosion current was measured"),
            *restated_faults(case, devices, only_positive),
        ]

    def rows(self, case: Case) -> Rows | None:
        """Gather the readings of all surveys; `Rows.value` is ln at the mean temperature."""
        items = gather(case, self.form.key)
        if not items:
            return None
        devices = self._devices(case)
        value: list[FloatArray] = []
        extra: dict[str, list[FloatArray]] = {
            name: [] for name in ("age", "limit", "variance", "season", "device", "table")
        }
        for number, (_, item) in enumerate(items):
            entry = cast(CorrosionCurrentEntry, item.entry)
            current, below = item.table.numbers["current"], item.table.below["current"]
            limit = np.where(np.isfinite(below), below, entry.passive_limit)
            active = np.nan_to_num(current, nan=0.0) >= limit
            value.append(np.log(np.where(active, current, np.nan)) + entry.log_correction)
            for name, one in (
                ("age", item.age),
                ("limit", np.log(limit) + entry.log_correction),
                ("variance", float(np.log1p(entry.repeatability**2))),
                ("season", entry.log_season),
                ("device", float(devices.index(entry.device))),
                ("table", float(number)),
            ):
                extra[name].append(np.broadcast_to(one, current.shape))
        return build_rows(items, value, extra)

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Sufficient statistics of single readings, and the readings of shared places."""
        group, first = _groups(rows)
        single = _single(rows)
        active = rows.stage <= stage
        read = active & single & np.isfinite(rows.value)
        value = np.nan_to_num(rows.value)
        count = np.bincount(group[read], minlength=len(first)).astype(np.float64)
        mean = _sums(group, first, np.where(read, value, 0.0)) / np.maximum(count, 1.0)
        square = _sums(group, first, np.where(read, (value - mean[group]) ** 2, 0.0))
        low = active & single & ~np.isfinite(rows.value)
        return {
            "corrosion_current_count": count,
            "corrosion_current_mean": mean,
            "corrosion_current_square": square,
            "corrosion_current_low": np.bincount(group[low], minlength=len(first)).astype(
                np.float64
            ),
            **current_places.data(rows, ~single, stage),
        }

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active readings, onsets and local currents integrated out."""
        centre, score = _centre(rows, values), _score(rows, values)
        variance = zone_values(rows, values, "current_scatter")[..., rows.zone] ** 2
        _, first = _groups(rows)
        total = variance[..., first] + rows.extra["variance"][first]
        count, mean = data["corrosion_current_count"], data["corrosion_current_mean"]
        deviation = mean - centre[..., first]
        low = op.normal_cdf((rows.extra["limit"][first] - centre[..., first]) / op.sqrt(total))
        passive_or_low = op.normal_cdf(-score[..., first]) + op.normal_cdf(score[..., first]) * low
        result = (
            count * (op.log_normal_cdf(score[..., first]) - 0.5 * op.log(total))
            - 0.5 * (count * deviation**2 + data["corrosion_current_square"]) / total
            + data["corrosion_current_low"] * op.log(op.maximum(passive_or_low, LEAST))
        ).sum(axis=-1)
        shared = ~_single(rows)
        if shared.any():
            readings = Readings.from_data(data, rows, shared)
            result = result + current_places.log_likelihood(readings, centre, variance, score).sum(
                axis=-1
            )
        return result

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw ln of readings at the same places, NaN where they would be below the limit."""
        centre, score = _centre(rows, values), _score(rows, values)
        shape = (len(centre), len(rows.places))
        scatter = zone_values(rows, values, "current_scatter")[:, rows.place_zone]
        local = scatter * rng.standard_normal(shape)
        onset = rng.standard_normal(shape)[:, rows.place]  # its score, as that of the age
        error = np.sqrt(rows.extra["variance"]) * rng.standard_normal(centre.shape)
        reading = centre + local[:, rows.place] + error
        active = onset < score
        return np.where(active & (reading >= rows.extra["limit"]), reading, np.nan)

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Leave onset and current of a section to the break-outs, which give them jointly."""
        return ()


_DEVICE = "corrosion_current.device_"


def _device_name(device: int) -> str:
    return f"{_DEVICE}{device + 1}"


def _season_name(stage: int) -> str:
    return f"corrosion_current.season_{stage}"


def _centre(rows: Rows, values: Mapping[str, Numeric]) -> Numeric:
    """Give the mean of ln of each reading of an active bar, last axis row."""
    centre = op.log(zone_values(rows, values, "current"))[..., rows.zone]
    for device in np.unique(rows.extra["device"]):
        factor = values[_device_name(int(device))][..., None]
        centre = centre + op.log(factor) * (rows.extra["device"] == device)
    for stage in np.unique(rows.stage):
        season = values.get(_season_name(int(stage)))
        if season is not None:  # else yearly means only
            centre = centre + season[..., None] * rows.extra["season"] * (rows.stage == stage)
    return centre


def _score(rows: Rows, values: Mapping[str, Numeric]) -> Numeric:
    """Give the score of ln of each survey's age among the zone's onsets, last axis row."""
    median = zone_values(rows, values, "onset")[..., rows.zone]
    scatter = zone_values(rows, values, "onset_scatter")[..., rows.zone]
    return (np.log(rows.extra["age"]) - op.log(median)) / scatter


def _single(rows: Rows) -> NDArray[np.bool_]:
    """Tell which rows are places of their own."""
    count = np.bincount(rows.place, minlength=len(rows.places))
    return np.asarray(count[rows.place] == 1, dtype=np.bool_)


def _groups(rows: Rows) -> tuple[IntArray, IntArray]:
    """Give the group of each row, by table, zone and limit, and one row of each group."""
    key = np.column_stack([rows.extra["table"], rows.zone, rows.extra["limit"]])
    _, first, group = np.unique(key, axis=0, return_index=True, return_inverse=True)
    return group.reshape(-1).astype(np.int64), first.astype(np.int64)


def _sums(group: IntArray, first: IntArray, value: FloatArray) -> FloatArray:
    return np.bincount(group, weights=value, minlength=len(first)).astype(np.float64)
