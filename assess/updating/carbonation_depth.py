"""Evidence: depth of carbonation, shown by an indicator on freshly broken concrete."""

from collections.abc import Mapping, Sequence
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm, Table
from assess.case.quantities import CoefficientOfVariation, Length
from assess.case.reader import Case
from assess.errors import Fault
from assess.updating.bounded_readings import Readings
from assess.updating.bounds import bounded, lower_limits, marked, shifted, upper_limits
from assess.updating.carbonation_faults import none_without_limit
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    zone_values,
)
from assess.updating.local import LocalModel
from assess.updating.process_faults import rows_without_process

NONE_FOUND = ("none", "none found", "no carbonation")


class CarbonationDepthEntry(EvidenceEntry):
    """What a survey says of its carbonation depths."""

    error: CoefficientOfVariation = Field(
        description="coefficient of variation of a depth as read about that of its place: reading "
        "and unevenness of the front"
    )
    detection_limit: Length | None = Field(
        None,
        description="smallest depth that shows; 'none' in the table says less than that. Needed "
        "where the table says so",
    )


class CarbonationDepth(EvidenceKind):
    r"""Carbonation: ln of depth = ln of the local rate + half of ln of age + error.

    Notes
    -----
    At place j of a zone, read at age t:

    .. math:: \ln x_i = \ln k_j + \tfrac12 \ln t_i + e_i, \quad
              \ln k_j \sim N(\ln \bar k, \sigma^2), \quad e_i \sim N(0, \ln(1 + V^2))

    that is `carbonation_depth` with a lognormal error [1]_. Readings of a place share its rate,
    in one survey or in several. A depth ">45" says that the front was not reached where the
    concrete was open down to 45 mm; "none" and "<3" say that the reading would have been below
    the limit. `Readings` integrates local rates out.

    References
    ----------
    .. [1] EN 14630:2006 for the reading with phenolphthalein (from memory); the lognormal error
       is an assumption.
    """

    form = EvidenceForm(
        key="carbonation_depth",
        title="Carbonation depths",
        entry=CarbonationDepthEntry,
        columns=(
            Column(
                "depth",
                "mean depth of the carbonated layer",
                "mm",
                above=0.0,
                below=500.0,
                usual=(0.5, 120.0),
                censored=True,
                below_detection=True,
                absent=NONE_FOUND,
            ),
        ),
        value="depth",
        log_scale=True,
    )
    unit = "mm"
    log_scale = True
    assumption = (
        "Carbonation goes in with the root of time, at a rate that is lognormal from place to "
        "place within the zone and stays the same; depths that were not reached, or not found, "
        "count as bounds."
    )
    carrier = "carbonation_rate"

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find zones without carbonation, and depths not found without a limit of detection."""
        items = gather(case, self.form.key)
        found = list(rows_without_process(case, items, "carbonation", "carbonation was measured"))
        for _, item in items:
            entry = cast(CarbonationDepthEntry, item.entry)
            found += none_without_limit(case, item, entry.detection_limit)
        return found

    def rows(self, case: Case) -> Rows | None:
        """Gather the depths of all surveys; `Rows.value` is their logarithm."""
        items = gather(case, self.form.key)
        if not items:
            return None
        value: list[FloatArray] = []
        extra: dict[str, list[FloatArray]] = {"age": [], "variance": [], "low": [], "high": []}
        for _, item in items:
            entry = cast(CarbonationDepthEntry, item.entry)
            log_depth, low, high = _with_limits(item.table, entry.detection_limit)
            value.append(log_depth)
            count = len(log_depth)
            extra["age"].append(np.full(count, item.age))
            extra["variance"].append(np.full(count, np.log1p(entry.error**2)))
            extra["low"].append(low)
            extra["high"].append(high)
        return build_rows(items, value, extra)

    def _readings(self, rows: Rows) -> Readings:
        """Arrange the rows by ln of depth over the root of age, which is ln rate."""
        shift = 0.5 * np.log(rows.extra["age"])
        return Readings(
            self.form.key,
            rows.extra["low"] - shift,
            rows.extra["high"] - shift,
            rows.extra["variance"],
            rows.stage,
            rows.zone,
            rows.place,
        )

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Sufficient statistics of ln depth less half of ln age; counts of bounds."""
        log_rate = shifted(rows.value, -0.5 * np.log(rows.extra["age"]))
        return self._readings(rows).data(log_rate, stage)

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active depths, local rates integrated out."""
        mean = op.log(zone_values(rows, values, "carbonation_rate"))
        variance = zone_values(rows, values, "carbonation_rate_scatter") ** 2
        return self._readings(rows).log_likelihood(mean, variance, data)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw ln of the depths at the same places; NaN where only a bound would be known."""
        log_rate = np.log(zone_values(rows, values, "carbonation_rate"))
        scatter = zone_values(rows, values, "carbonation_rate_scatter")
        shape = (len(log_rate), len(rows.places))
        local = log_rate[:, rows.place_zone] + scatter[:, rows.place_zone] * rng.standard_normal(
            shape
        )
        error = np.sqrt(rows.extra["variance"]) * rng.standard_normal((shape[0], len(rows.value)))
        reading = local[:, rows.place] + 0.5 * np.log(rows.extra["age"]) + error
        return bounded(reading, rows.extra["low"], rows.extra["high"])

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Give no local variable: no limit state has one of carbonation."""
        return ()


def _with_limits(
    table: Table, detection_limit: float | None
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Logarithms of the depths of a table, bounds marked, and of each row's two limits [ln mm].

    A depth read below the stated detection limit says no more than that none was found.
    """
    depth, below, beyond = (part["depth"] for part in (table.numbers, table.below, table.beyond))
    if detection_limit is not None:
        under = table.absent["depth"] | (depth < detection_limit)
        depth = np.where(under, np.nan, depth)
        below = np.where(under, detection_limit, below)
    depth, below, beyond = np.log(depth), np.log(below), np.log(beyond)
    limit = None if detection_limit is None else float(np.log(detection_limit))
    return (
        marked(depth, below, beyond),
        lower_limits(depth, below, limit),
        upper_limits(depth, beyond),
    )
