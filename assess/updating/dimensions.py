"""Evidence: depths, widths and flange thicknesses as built."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess import operations as op
from assess.case.forms import Column, Dimension, EvidenceEntry, EvidenceForm, Judged, Table
from assess.case.processes import MEASURED_DIMENSIONS, dimension_key
from assess.case.quantities import Length
from assess.case.reader import Case, Evidence
from assess.errors import Fault
from assess.mechanics.dimensions import Deviation, dimension_deviation
from assess.updating.dimension_faults import (
    contradictions,
    unusable_readings,
    zones_that_state,
)
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    IntArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    index_places,
    place_keys,
)
from assess.updating.local import Local, LocalModel
from assess.updating.place_statistics import Places, normal_log_likelihood, without_prefix


class DimensionsEntry(EvidenceEntry):
    """What a survey says of its readings of dimensions."""

    error: Length = Field(
        3.0,
        description="Standard deviation of one reading about the dimension at its place. [mm] "
        "Engineering judgement, no source.",
    )


def _deviation(_entry: EvidenceEntry, table: Table) -> FloatArray:
    """Deviation of the rows that state a nominal dimension, NaN elsewhere [mm]."""
    return table.numbers["measured"] - table.numbers["nominal"]


class Dimensions(EvidenceKind):
    r"""Dimensions: reading - nominal = deviation of the place + error.

    Notes
    -----
    Built less nominal, :math:`\Delta`, of a section is :math:`N(m, s^2)`: with the published m
    and s (`dimension_deviation`), or the section's own s, each section is by itself and its
    readings tell of it alone. Where the zone states `dimensions`, m is the deviation common to
    the zone and s the scatter from place to place, both uncertain; then readings of any place tell
    of m and s, and through m of sections that nobody measured. Either way :math:`\Delta` of a
    place integrates out in closed form, and is normal given the readings of its section
    (`place_statistics`).

    `Rows.value` is the reading less the nominal dimension.
    """

    form = EvidenceForm(
        key="dimensions",
        title="Dimensions, built less nominal",
        entry=DimensionsEntry,
        columns=(
            Column("dimension", "what was measured", choices=MEASURED_DIMENSIONS),
            Column("measured", "dimension as read", "mm", above=0.0, below=20_000.0),
            Column(
                "nominal",
                "nominal dimension; left out: that of the row's section",
                "mm",
                required=False,
                above=0.0,
                below=20_000.0,
            ),
        ),
        value="measured",
        judged=Judged("built less nominal dimension", _deviation),
        apart=("nominal",),
    )
    unit = "mm"
    log_scale = False
    assumption = (
        "Built less nominal dimensions are normal, those of depth, width and flange thickness "
        "independent (JCSS part 3.10 gives a correlation of about 0.12)."
    )
    carrier = "depth_deviation"

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find readings that nothing can be learned from, and those that cannot be true."""
        items = gather(case, self.form.key)
        found = [fault for _, item in items for fault in unusable_readings(case, item)]
        if found:
            return found
        for _, item in items:
            error = cast(DimensionsEntry, item.entry).error
            found += contradictions(
                item, _nominals(case, item), _prior_deviation(case, item), error
            )
        return found

    def rows(self, case: Case) -> Rows | None:
        """Gather the readings of all surveys as deviations from the nominal dimensions."""
        items = gather(case, self.form.key)
        if not items:
            return None
        value: list[FloatArray] = []
        keys: list[str] = []
        labels: list[str] = []
        names = ("precision", "dimension", "known_mean", "known_sd")
        extra: dict[str, list[FloatArray]] = {name: [] for name in names}
        for _, item in items:
            what = item.table.texts["dimension"].tolist()
            value.append(item.table.numbers["measured"] - _nominals(case, item))
            known = _known_deviation(case, item)
            error = cast(DimensionsEntry, item.entry).error
            extra["precision"].append(np.full(len(what), error**-2.0))
            extra["dimension"].append(np.array([MEASURED_DIMENSIONS.index(w) for w in what], float))
            extra["known_mean"].append(known.mean)
            extra["known_sd"].append(known.sd)
            keys += [f"{w}: {k}" if k else "" for w, k in zip(what, place_keys(item), strict=True)]
            labels += [_label(z, w) for z, w in zip(item.zone.tolist(), what, strict=True)]
        rows = build_rows(items, value, extra)
        latent = index_places(keys)[0]
        # Data sets are of one dimension: each has a zone of its own beside that of the depths.
        zones = tuple(dict.fromkeys([*labels, *rows.zones]))
        zone = np.array([zones.index(label) for label in labels], dtype=np.int64)
        place_zone = np.zeros(len(rows.places), dtype=np.int64)
        place_zone[rows.place] = zone
        more = {**rows.extra, "latent": latent.astype(np.float64)}
        return Rows(rows.value, rows.stage, zone, rows.place, place_zone, zones, rows.places, more)

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Statistics of places read alike, with later surveys switched off."""
        return dict(_design(rows).places.data(rows.value, stage))

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active readings, deviations of the places integrated out."""
        of = _design(rows).places.group_population
        mean, sd = (part[..., of] for part in _populations(rows, values))
        found = without_prefix(_PREFIX, data)
        return normal_log_likelihood(found, mean, sd**2).sum(axis=-1)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw deviations as read at the same places, shape (n_draw, n_row)."""
        places = _design(rows).places
        mean, sd = _populations(rows, values)
        draws = len(next(iter(values.values())))
        shape = (draws, places.latents)
        of = places.population_of
        local = mean[..., of] + sd[..., of] * rng.standard_normal(shape)
        error = rng.standard_normal((draws, len(rows.value)))
        return np.asarray(local[:, places.latent] + error / np.sqrt(rows.extra["precision"]))

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Deviations at a section: given its own readings, else as its zone says of them.

        A dimension that neither was measured there nor is common to the zone is left to the
        limit state.
        """
        found: list[LocalModel] = []
        for number, dimension in enumerate(MEASURED_DIMENSIONS):
            key = dimension_key(dimension)
            mean = values.get(f"{zone}.{key}_deviation")
            sd = values.get(f"{zone}.{key}_scatter")
            here = _at(rows, stage, section, number)
            if mean is None or sd is None:
                if rows is None or not len(here):
                    continue
                draws = len(next(iter(values.values())))
                mean = np.full(draws, rows.extra["known_mean"][here[0]])
                sd = np.full(draws, rows.extra["known_sd"][here[0]])
            if rows is not None and len(here):
                precision = rows.extra["precision"][here]
                variance = sd**2 / (1.0 + precision.sum() * sd**2)
                off = precision @ rows.value[here] - precision.sum() * mean
                mean, sd = mean + variance * off, np.sqrt(variance)
            found.append(Local(f"{dimension} deviation", mean, sd))
        return tuple(found)


_PREFIX = "dimensions"


@dataclass(frozen=True, eq=False)
class _Design:
    """Places with their populations; arrays (n_population,), NaN where the zone's variables are."""

    places: Places
    zone: IntArray
    mean: FloatArray
    sd: FloatArray


@lru_cache(maxsize=8)
def _design(rows: Rows) -> _Design:
    """Arrange readings by places and populations; kept, for every evaluation asks for it."""
    known = np.column_stack([rows.zone, rows.extra["known_mean"], rows.extra["known_sd"]])
    _, first, population = np.unique(
        np.nan_to_num(known, nan=-1.0), axis=0, return_index=True, return_inverse=True
    )
    places = Places(
        prefix=_PREFIX,
        latent=rows.extra["latent"].astype(np.int64),
        population=population.ravel().astype(np.int64),
        sort=np.zeros(len(rows.value), dtype=np.int64),
        precision=rows.extra["precision"],
        stage=rows.stage,
    )
    return _Design(places, rows.zone[first], *(known[first, k] for k in (1, 2)))


def _populations(rows: Rows, values: Mapping[str, Numeric]) -> tuple[Numeric, Numeric]:
    """Mean and standard deviation of the deviations [mm], last axis population."""
    design = _design(rows)
    if np.isfinite(design.sd).all():
        return design.mean, design.sd
    known = np.isfinite(design.sd)
    means: list[Numeric] = []
    sds: list[Numeric] = []
    shape = next(
        values[f"{zone}.{key}_scatter"] * 0.0
        for zone, key in (_zone_and_key(rows.zones[k]) for k in design.zone[~known])
    )
    for number, label in enumerate(design.zone.tolist()):
        if known[number]:
            means.append(shape + design.mean[number])
            sds.append(shape + design.sd[number])
        else:
            zone, key = _zone_and_key(rows.zones[label])
            means.append(values[f"{zone}.{key}_deviation"])
            sds.append(values[f"{zone}.{key}_scatter"])
    return op.stack_last(means), op.stack_last(sds)


_COMMA = ", "


def _label(zone: str, dimension: str) -> str:
    """Name the data set of a dimension in a zone: the zone itself for depths."""
    return zone if dimension == MEASURED_DIMENSIONS[0] else f"{zone}{_COMMA}{dimension}"


def _zone_and_key(label: str) -> tuple[str, str]:
    """Take a label apart again."""
    for dimension in MEASURED_DIMENSIONS[1:]:
        if label.endswith(f"{_COMMA}{dimension}"):
            return label.removesuffix(f"{_COMMA}{dimension}"), dimension_key(dimension)
    return label, dimension_key(MEASURED_DIMENSIONS[0])


def _at(rows: Rows | None, stage: int, section: str, dimension: int) -> IntArray:
    """Rows of one dimension at a section that count."""
    place = None if rows is None else rows.place_of(section)
    if rows is None or place is None:
        return np.zeros(0, dtype=np.int64)
    here = (rows.place == place) & (rows.extra["dimension"] == dimension)
    return np.flatnonzero(here & (rows.stage <= stage))


def _stated(case: Case, item: Evidence) -> list[Dimension | None]:
    """Give what the section of each row states of the dimension, None where it names none."""
    of = {name: entry.dimensions() for name, entry in case.spec.sections().items()}
    rows = zip(item.section.tolist(), item.table.texts["dimension"].tolist(), strict=True)
    return [of[section][what] if section else None for section, what in rows]


def _nominals(case: Case, item: Evidence) -> FloatArray:
    """Nominal dimension of each row [mm]."""
    pairs = zip(item.table.numbers["nominal"].tolist(), _stated(case, item), strict=True)
    return np.array([own if one is None else one.nominal for own, one in pairs], dtype=np.float64)


def _known_deviation(case: Case, item: Evidence) -> Deviation:
    """Mean and standard deviation of each row's population [mm], NaN where its zone states it."""
    sections = np.array([one is not None for one in _stated(case, item)])
    own = np.array([np.nan if one is None or one.sd is None else one.sd for one in
                    _stated(case, item)])  # fmt: skip
    published = dimension_deviation(_nominals(case, item))
    by_section = sections & ~zones_that_state(case, item)
    mean = np.where(np.isfinite(own), 0.0, published.mean)
    sd = np.where(np.isfinite(own), own, published.sd)
    return Deviation(np.where(by_section, mean, np.nan), np.where(by_section, sd, np.nan))


def _prior_deviation(case: Case, item: Evidence) -> Deviation:
    """Mean and standard deviation of each row's deviation before any reading [mm]."""
    known = _known_deviation(case, item)
    mean, sd = known.mean.copy(), known.sd.copy()
    what = item.table.texts["dimension"]
    for zone, process in case.spec.zones.items():
        if process.dimensions is None:
            continue
        priors = {name: prior.marginal() for name, _, prior in process.dimensions.priors()}
        for dimension in MEASURED_DIMENSIONS:
            rows = np.isnan(sd) & (item.zone == zone) & (what == dimension)
            if rows.any():
                level = priors[f"{dimension_key(dimension)}_deviation"]
                scatter = priors[f"{dimension_key(dimension)}_scatter"]
                mean[rows], sd[rows] = level.mean, np.hypot(level.sd, scatter.mean)
    return Deviation(mean, sd)
