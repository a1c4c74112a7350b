"""Evidence: concrete cover read with a meter."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Annotated, Any, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field
from scipy import special

from assess import operations as op
from assess.case.forms import Closed, Column, EvidenceEntry, EvidenceForm
from assess.case.quantities import InUnit, Length
from assess.case.reader import Case
from assess.errors import Fault
from assess.probability.marginals import make_marginal
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    IntArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    membership,
    population_local,
    zone_values,
)
from assess.updating.local import (
    LocalModel,
    TabulatedLocal,
    quantile_table,
    scores_of_density,
)
from assess.updating.nested import local_posterior, nested_log_likelihood
from assess.updating.variables import Variable

REACH_GRID = 401  # points at which a cover known to lie beyond a meter's range is tabulated


class Meter(Closed):
    """A cover meter as its calibration describes it."""

    name: str = Field(description="Readings of one name share one bias.")
    bias: Annotated[float, InUnit("mm", "a bias", at_least=0.0)] = Field(
        description="Standard deviation of its unknown constant bias, 0 for none. [mm]"
    )
    scatter: Length = Field(description="Standard deviation of one reading. [mm]")
    source: str = Field("", description="Calibration record or standard.")


class CoverEntry(EvidenceEntry):
    """What a survey says of its cover readings."""

    meter: Meter
    outer_bar: Length | None = Field(
        None,
        description="Diameter of the outer bars (links, distribution bars), where the table has "
        "readings of the layer within them. [mm]",
    )
    layer_gap: Annotated[float, InUnit("mm", "a standard deviation", at_least=0.0)] = Field(
        2.0,
        description="Standard deviation of how far inner bars stand off the outer ones. [mm] "
        "Engineering judgement, no source.",
    )
    exposed_error: Length = Field(
        1.0,
        description="Standard deviation of a cover measured at a bar laid bare. [mm] "
        "Engineering judgement, no source.",
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Groups:
    """Readings that need nothing but their sufficient statistics, by survey, zone and meter."""

    key: NDArray[np.int64]  # (n_group, 4): stage, zone, meter, number of the reading variance
    of_row: IntArray  # group of each row


class Cover(EvidenceKind):
    r"""Cover: reading = local cover + meter bias + reading error.

    Notes
    -----
    Local covers of a zone are :math:`N(m, s^2)`, a meter's bias is :math:`N(0, b^2)`, common to
    all of its readings, its reading error :math:`N(0, e^2)` with stated e. Rows on their own
    are independent given (m, s, bias), so a group of n of them enters through n, mean and sum
    of squares alone; rows of one section or location share its cover, integrated out
    (`nested_log_likelihood`). A reading ">80" says that the meter would have read more than 80:
    it enters with the upper tail probability, as a place of its own.

    The local cover is that of the outer bars. A bar of the inner layer lies deeper by the stated
    diameter of the outer ones, and scatters by how the layers touch. A bar that was read and then
    laid bare gives two readings of one local cover, the second without bias: many of them tell
    the meter's bias from the zone's cover.
    """

    form = EvidenceForm(
        key="cover",
        title="Cover readings",
        entry=CoverEntry,
        columns=(
            Column(
                "cover",
                "cover of a bar, as read",
                "mm",
                above=0.0,
                below=400.0,
                usual=(3.0, 150.0),
                typical=(10.0, 120.0),
                censored=True,
            ),
            Column(
                "layer",
                "layer of bars that was read, the outer one if left empty",
                required=False,
                choices=("outer", "inner"),
            ),
            Column(
                "exposed cover",
                "cover of the same bar measured where it was laid bare",
                "mm",
                required=False,
                above=0.0,
                below=400.0,
                usual=(3.0, 150.0),
            ),
        ),
        value="cover",
    )
    unit = "mm"
    log_scale = False
    assumption = (
        "Covers of a zone are normal from place to place; a meter has one unknown bias for all of "
        "its readings and a stated scatter; readings beyond its range count as at least that much. "
        "Cover is that of the outer bars; readings of the inner layer count less their diameter."
    )
    carrier = "cover_mean"

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find meters of which two biases are stated, and inner bars without outer ones."""
        first: dict[str, tuple[float, int]] = {}
        found = []
        for _, item in gather(case, self.form.key):
            entry = cast(CoverEntry, item.entry)
            meter = entry.meter
            inner = np.flatnonzero(item.table.texts["layer"] == "inner")
            if entry.outer_bar is None and len(inner):
                what = "readings of the inner layer need the diameter of the outer bars"
                mend = "state outer_bar in the entry of this table"
                line = int(item.table.lines[inner[0]])
                found.append(Fault(str(item.table.path), line, what, "inner", "", mend))
            keys = (*item.keys, "meter", "bias")
            bias, line = first.setdefault(meter.name, (meter.bias, case.document.line(keys)))
            if bias != meter.bias:
                what = f"meter {meter.name!r} has another bias in line {line}"
                given, allowed = f"{meter.bias:g} mm", f"{bias:g} mm"
                mend = "a name stands for one unknown bias: say the same, or use another name"
                found.append(
                    case.document.fault(keys, what, given=given, allowed=allowed, mend=mend)
                )
        return found

    def rows(self, case: Case) -> Rows | None:
        """Gather the readings of all surveys."""
        items = gather(case, self.form.key)
        if not items:
            return None
        meters = self._meters(case)
        names = list(meters)
        entries = [cast(CoverEntry, item.entry) for _, item in items]
        inner = [item.table.texts["layer"] == "inner" for _, item in items]
        offset = [i * (e.outer_bar or 0.0) for i, e in zip(inner, entries, strict=True)]
        beyond = [item.table.beyond["cover"] for _, item in items]
        meter = [
            np.full(len(i), float(names.index(e.meter.name)))
            for i, e in zip(inner, entries, strict=True)
        ]
        reach = _reach(np.concatenate(meter), np.concatenate(beyond))
        rows = build_rows(
            items,
            [item.table.numbers["cover"] - o for (_, item), o in zip(items, offset, strict=True)],
            {
                "beyond": [b - o for b, o in zip(beyond, offset, strict=True)],
                "reach": [reach - np.concatenate(offset)],
                "meter": meter,
                "variance": [
                    e.meter.scatter**2 + i * e.layer_gap**2
                    for i, e in zip(inner, entries, strict=True)
                ],
            },
        )
        exposed = np.concatenate(
            [i.table.numbers["exposed cover"] - o for (_, i), o in zip(items, offset, strict=True)]
        )
        error = np.concatenate(
            [e.exposed_error**2 + i * e.layer_gap**2 for i, e in zip(inner, entries, strict=True)]
        )
        return _with_exposed(rows, exposed, error, len(names))

    def _meters(self, case: Case) -> dict[str, Meter]:
        """Name the meters of a case in order of first use."""
        found: dict[str, Meter] = {}
        for _, item in gather(case, self.form.key):
            meter = cast(CoverEntry, item.entry).meter
            found.setdefault(meter.name, meter)
        return found

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the bias of each meter that has one."""
        return tuple(
            Variable(
                name=_bias_name(number),
                label=f"bias of cover meter {meter.name}",
                symbol="$b_\\mathrm{meter}$",
                unit="mm",
                zone="",
                source=meter.source or "as stated in the case",
                marginal=make_marginal("normal", parameters={"mean": 0.0, "sd": meter.bias}),
            )
            for number, meter in enumerate(self._meters(case).values())
            if meter.bias > 0.0
        )

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Sufficient statistics of single readings and precisions of shared places."""
        single = self._single(rows)
        groups = _groups(rows)
        active = rows.stage <= stage
        read = active & single & np.isfinite(rows.value)
        count = _by_group(groups, read, np.ones_like(rows.value))
        mean = _by_group(groups, read, rows.value) / np.maximum(count, 1.0)
        centred = np.where(read, rows.value - mean[groups.of_row], 0.0)
        square = _by_group(groups, read, centred**2)
        beyond = active & np.isfinite(rows.extra["beyond"])
        limits, limit_group = _limits(rows, groups)
        censored = np.zeros(len(limits))
        if len(limits):
            which = _limit_of_row(rows, limits, limit_group, groups)
            np.add.at(censored, which[beyond], 1.0)
        chosen = ~single
        shared = active & np.isfinite(rows.value)
        return {
            "cover_count": count,
            "cover_mean": mean,
            "cover_square": square,
            "cover_censored": censored,
            "cover_shared": np.nan_to_num(rows.value)[chosen],
            "cover_shared_precision": np.where(shared, 1.0 / rows.extra["variance"], 0.0)[chosen],
        }

    def _single(self, rows: Rows) -> NDArray[np.bool_]:
        """Tell which rows are places of their own."""
        return np.asarray(
            np.bincount(rows.place, minlength=len(rows.places))[rows.place] == 1, dtype=np.bool_
        )

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active readings, local covers integrated out."""
        mean = zone_values(rows, values, "cover_mean")
        variance = zone_values(rows, values, "cover_scatter") ** 2
        groups = _groups(rows)
        zone, meter = groups.key[:, 1], groups.key[:, 2]
        total = variance[..., zone] + _group_variance(rows, groups)
        centre = mean[..., zone] + _biases(values, meter)
        single = -0.5 * (
            data["cover_count"] * (op.log(total) + (data["cover_mean"] - centre) ** 2 / total)
            + data["cover_square"] / total
        )
        result = single.sum(axis=-1)
        limits, limit_group = _limits(rows, groups)
        if len(limits):
            excess = (centre[..., limit_group] - limits) / op.sqrt(total[..., limit_group])
            result = result + (data["cover_censored"] * op.log_normal_cdf(excess)).sum(axis=-1)
        chosen = ~self._single(rows)
        if chosen.any():
            zone_of = rows.zone[chosen]
            residual = (
                data["cover_shared"]
                - mean[..., zone_of]
                - _biases(values, rows.extra["meter"][chosen].astype(np.int64))
            )
            weighted = data["cover_shared_precision"] * residual
            shared, place = np.unique(rows.place[chosen], return_inverse=True)
            by_place = membership(place.astype(np.int64), len(shared)).T
            result = result + nested_log_likelihood(
                data["cover_shared_precision"] @ by_place,
                weighted @ by_place,
                (weighted * residual) @ by_place,
                variance[..., rows.place_zone[shared]],
            ).sum(axis=-1)
        return result

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw readings of the same design; beyond the meter's range gives NaN."""
        mean = zone_values(rows, values, "cover_mean")
        scatter = zone_values(rows, values, "cover_scatter")
        draws = len(mean)
        local = mean[:, rows.place_zone] + scatter[:, rows.place_zone] * rng.standard_normal(
            (draws, len(rows.places))
        )
        bias = _biases(values, rows.extra["meter"].astype(np.int64))
        error = np.sqrt(rows.extra["variance"]) * rng.standard_normal((draws, len(rows.value)))
        reading = local[:, rows.place] + bias + error
        return np.where(reading > rows.extra["reach"], np.nan, reading)

    def observed(self, rows: Rows, value: FloatArray) -> Rows:
        """Put other readings in place of those of the rows; NaN is beyond the meter's range."""
        beyond = np.where(np.isnan(value), rows.extra["reach"], np.nan)
        return replace(rows, value=value, extra={**rows.extra, "beyond": beyond})

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Cover at a section, given its own readings where there are any."""
        population = population_local(
            "cover", values, zone, "cover_mean", "cover_scatter", logarithm=False
        )
        place = None if rows is None else rows.place_of(section)
        if rows is None or place is None:
            return (population,)
        here = (rows.place == place) & (rows.stage <= stage)
        read = here & np.isfinite(rows.value)
        count = len(population.mean)
        precision = 1.0 / rows.extra["variance"][read]
        residual = rows.value[read] - _bias_of(rows, read, values, count)
        mean, sd = local_posterior(
            precision.sum(),
            (residual - population.mean[:, None]) @ precision,
            population.mean,
            population.sd**2,
        )
        beyond = here & ~np.isfinite(rows.value)
        if not beyond.any():
            return (replace(population, mean=mean, sd=sd),)
        limit = rows.extra["beyond"][beyond] - _bias_of(rows, beyond, values, count)
        return (_beyond_reach(mean, sd, limit, np.sqrt(rows.extra["variance"][beyond])),)


def _with_exposed(rows: Rows, exposed: FloatArray, variance: FloatArray, without_bias: int) -> Rows:
    """Add a reading without bias, at the same place, for each row whose bar was laid bare."""
    opened = np.flatnonzero(np.isfinite(exposed))
    if len(opened) == 0:
        return rows
    every = np.concatenate([np.arange(len(rows.value)), opened])
    more: dict[str, FloatArray | float] = {
        "beyond": np.nan,
        "reach": np.inf,
        "meter": float(without_bias),
        "variance": variance[opened],
    }
    count = len(opened)
    return replace(
        rows,
        value=np.concatenate([rows.value, exposed[opened]]),
        stage=rows.stage[every],
        zone=rows.zone[every],
        place=rows.place[every],
        extra={
            name: np.concatenate([rows.extra[name], np.broadcast_to(value, count)])
            for name, value in more.items()
        },
    )


def _bias_of(
    rows: Rows, chosen: NDArray[np.bool_], values: Mapping[str, FloatArray], count: int
) -> FloatArray:
    """Bias of the meters of chosen rows, (n_draw, n_chosen)."""
    meter = rows.extra["meter"][chosen].astype(np.int64)
    return np.broadcast_to(_biases(values, meter), (count, len(meter)))


def _beyond_reach(
    mean: FloatArray, sd: FloatArray, limit: FloatArray, error: FloatArray
) -> TabulatedLocal:
    """Condition a normal cover on readings beyond the meter's range.

    ``mean`` and ``sd`` (n_draw,) hold before; ``limit`` (n_draw, n_reading) is the cover at which
    each meter reads its limit, ``error`` (n_reading,) its scatter.
    """
    top = np.maximum(mean + 8.0 * sd, limit.max(axis=1) + 8.0 * error.max())
    share = np.linspace(0.0, 1.0, REACH_GRID)
    low = (mean - 8.0 * sd)[:, None]
    grid = low + (top[:, None] - low) * share
    log_density = -0.5 * ((grid - mean[:, None]) / sd[:, None]) ** 2
    for k in range(limit.shape[1]):
        log_density = log_density + special.log_ndtr((grid - limit[:, k, None]) / error[k])
    scores, _ = scores_of_density(grid, log_density)
    return TabulatedLocal("cover", quantile_table(grid, scores))


def _bias_name(meter: int) -> str:
    return f"cover_meter_{meter + 1}.bias"


def _biases(values: Mapping[str, Numeric], meter: IntArray) -> Numeric:
    """Pick the bias of each meter index, last axis as ``meter``; zero where it has none."""
    if len(meter) == 0:
        return 0.0
    columns = [values.get(_bias_name(k)) for k in range(int(meter.max()) + 1)]
    known = [column for column in columns if column is not None]
    if not known:
        return 0.0
    return op.stack_last([known[0] * 0.0 if c is None else c for c in columns])[..., meter]


def _groups(rows: Rows) -> _Groups:
    """Group rows by stage, zone, meter and variance of reading."""
    meter = rows.extra["meter"].astype(np.int64)
    _, variance = np.unique(rows.extra["variance"], return_inverse=True)
    parts = (rows.stage, rows.zone, meter, variance)
    sizes = [int(part.max()) + 1 for part in parts]
    # One number for each combination: sorting numbers is ten times faster than sorting rows.
    joined, of_row = np.unique(np.ravel_multi_index(parts, sizes), return_inverse=True)
    key = np.column_stack(np.unravel_index(joined, sizes))
    return _Groups(key.astype(np.int64), of_row.reshape(-1).astype(np.int64))


def _by_group(groups: _Groups, chosen: NDArray[np.bool_], value: FloatArray) -> FloatArray:
    """Sum a value over the chosen rows of each group."""
    return np.bincount(
        groups.of_row[chosen], weights=value[chosen], minlength=len(groups.key)
    ).astype(np.float64)


def _group_variance(rows: Rows, groups: _Groups) -> FloatArray:
    """Give the reading variance of each group's meter."""
    variance = np.zeros(len(groups.key))
    variance[groups.of_row] = rows.extra["variance"]
    return variance


def _limits(rows: Rows, groups: _Groups) -> tuple[FloatArray, IntArray]:
    """Distinct censoring limits with their groups."""
    reach = rows.extra["reach"]
    pairs = np.unique(
        np.column_stack([groups.of_row, reach])[np.isfinite(reach)].reshape(-1, 2), axis=0
    )
    return pairs[:, 1], pairs[:, 0].astype(np.int64)


def _limit_of_row(
    rows: Rows, limits: FloatArray, limit_group: IntArray, groups: _Groups
) -> IntArray:
    """Index into the limits for each row that has one; 0 elsewhere."""
    match = (groups.of_row[:, None] == limit_group) & (rows.extra["reach"][:, None] == limits)
    return np.asarray(match.argmax(axis=1), dtype=np.int64)


def _reach(meter: FloatArray, beyond: FloatArray) -> FloatArray:
    """Give the cover at which each row is, or would be, censored; inf if never.

    A reading within the meter's range shares the least limit that the meter shows elsewhere.
    """
    reach = np.full(len(meter), np.inf)
    for m in np.unique(meter):
        mine = meter == m
        shown = beyond[mine & np.isfinite(beyond)]
        reach[mine] = np.min(shown, initial=np.inf)
    return np.where(np.isfinite(beyond), beyond, reach)
