"""Strength at places that cores and indirect tests have in common, integrated out.

Each kind of test adds the density of its readings given those of the kinds before it at the same
place; over the kinds that is the joint density, whichever of them a case has.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import lru_cache
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from assess import operations as op
from assess.updating.core_values import correction_shift
from assess.updating.cores import Cores
from assess.updating.kind import (
    FloatArray,
    IntArray,
    Numeric,
    Rows,
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
from assess.updating.robust import (
    Readings,
    padded_places,
    robust_local_density,
    robust_log_likelihood,
)

REFERENCE = float(np.log(30.0))  # ln of the strength at which a device's level is stated [MPa]
CORES = Cores()
LINE = ("level", "slope", "scatter")  # variables of a device


@dataclass(frozen=True, slots=True, eq=False)
class StrengthRows(Rows):
    """Readings of an indirect test, beside those of the kinds of test before it.

    ``value`` is ln of a reading; ``extra`` has ``device``, an index into ``devices``, and
    ``error``, the variance of the reading about what the device would show at its place.
    """

    devices: tuple[str, ...] = ()
    earlier: Mapping[str, Rows] = field(default_factory=dict)  # key of the kind -> readings


def given(rows: Rows, earlier: Mapping[str, Rows]) -> Rows:
    """Put other readings of the kinds before in place of those that the rows know of."""
    if not isinstance(rows, StrengthRows):
        return rows
    return replace(rows, earlier={key: earlier.get(key, old) for key, old in rows.earlier.items()})


class Units(NamedTuple):
    """Readings of one device at one place: they share how the place departs from the line."""

    of_row: IntArray
    place: IntArray  # of each unit
    device: IntArray


class Means(NamedTuple):
    """What a stage knows of each unit."""

    value: Any  # mean of ln of its readings
    error: Any  # variance of that mean about what the device would show
    active: Any  # 1 where there are readings, else 0


class At(NamedTuple):
    """Entries of one kind at the shared places: units of an indirect test, rows of cores."""

    entry: IntArray
    position: IntArray  # index into the shared places
    size: int  # number of shared places

    def sum(self, part: Numeric) -> Numeric:
        """Sum what is given by entry over each shared place."""
        return part @ membership(self.position, self.size).T


@dataclass(frozen=True, slots=True, eq=False)
class Layout:
    """How readings enter: units alone at their place in groups, others place by place."""

    units: Units
    lone: IntArray  # units that nothing else was read beside
    group: IntArray  # of each lone unit
    group_zone: IntArray
    group_device: IntArray
    group_error: FloatArray
    shared: IntArray  # the other places
    own: At
    earlier: Mapping[str, At]


class Sums(NamedTuple):
    """What normal readings say of ln strength less a mean, last axis shared place."""

    precision: Numeric
    weighted: Numeric
    square: Numeric
    log_variance: Numeric  # summed logarithms of the variances of the readings themselves


class Heavy(NamedTuple):
    """Cores with Student-t errors, of the places that have any."""

    place: IntArray  # index into the shared places
    readings: Readings


@lru_cache(maxsize=64)
def find_units(rows: StrengthRows) -> Units:
    """Group rows by place and device."""
    device = rows.extra["device"].astype(np.int64)
    count = len(rows.devices)
    key, of_row = np.unique(rows.place * count + device, return_inverse=True)
    return Units(of_row.reshape(-1).astype(np.int64), key // count, key % count)


def unit_means(rows: StrengthRows, stage: int) -> Means:
    """Average the active readings of each unit, weighted by their precision."""
    units = find_units(rows)
    weight = np.where(rows.stage <= stage, 1.0 / rows.extra["error"], 0.0)
    total = np.bincount(units.of_row, weight, len(units.place))
    active = total > 0.0
    held = np.where(active, total, 1.0)
    value = np.bincount(units.of_row, weight * rows.value, len(units.place)) / held
    return Means(value, 1.0 / held, active.astype(np.float64))


@lru_cache(maxsize=16)
def lay_out(rows: StrengthRows) -> Layout:
    """Tell units alone at their place from such as share it with any other reading."""
    units = find_units(rows)
    elsewhere = {name for other in rows.earlier.values() for name in other.places if name}
    many = np.bincount(units.place, minlength=len(rows.places)) > 1
    met = many | np.array([name in elsewhere for name in rows.places], dtype=np.bool_)
    last = np.zeros(len(units.place), dtype=np.int64)
    np.maximum.at(last, units.of_row, rows.stage)
    met[rows.place[rows.stage < last[units.of_row]]] = True  # read in several surveys
    lone = np.flatnonzero(~met[units.place])
    error = unit_means(rows, int(rows.stage.max())).error
    key = np.column_stack(
        [rows.place_zone[units.place[lone]], units.device[lone], last[lone], error[lone]]
    )
    groups, group = np.unique(key, axis=0, return_inverse=True)
    shared = np.flatnonzero(met)
    position = np.full(len(rows.places), -1)
    position[shared] = np.arange(len(shared))
    own = np.flatnonzero(met[units.place])
    names = {rows.places[place]: k for k, place in enumerate(shared) if rows.places[place]}
    return Layout(
        units,
        lone,
        group.reshape(-1).astype(np.int64),
        groups[:, 0].astype(np.int64),
        groups[:, 1].astype(np.int64),
        groups[:, 3],
        shared,
        At(own, position[units.place[own]], len(shared)),
        {key: _entries(other, names, len(shared)) for key, other in rows.earlier.items()},
    )


def _entries(rows: Rows, positions: Mapping[str, int], count: int) -> At:
    """Find what another kind read at places of the given names."""
    place = find_units(rows).place if isinstance(rows, StrengthRows) else rows.place
    position = np.array([positions.get(rows.places[p], -1) for p in place], dtype=np.int64)
    entry = np.flatnonzero(position >= 0)
    return At(entry, position[entry], count)


def data(key: str, rows: StrengthRows, stage: int) -> dict[str, NDArray[Any]]:
    """Give the arrays of the likelihood with later surveys of every kind switched off.

    Parameters
    ----------
    key : str
        Of the kind; begins the names of the arrays.
    rows : StrengthRows
        All readings.
    stage : int
        Number of surveys that count.

    Returns
    -------
    dict of str to ndarray
        ``count``, ``mean`` and ``square`` (sum of squares about it) of each group of lone units;
        ``value``, ``error``, ``active`` of units at shared places, likewise for indirect tests
        before, under their keys; ``cores_value`` and ``cores_precision`` of cores there.
    """
    layout = lay_out(rows)
    means = unit_means(rows, stage)
    active, value = means.active[layout.lone], means.value[layout.lone]
    groups = len(layout.group_zone)
    count = np.bincount(layout.group, active, groups).astype(np.float64)
    mean = np.bincount(layout.group, active * value, groups) / np.maximum(count, 1.0)
    off = active * (value - mean[layout.group]) ** 2
    found = {"count": count, "mean": mean, "square": np.bincount(layout.group, off, groups)}
    found |= _of_units("", means, layout.own)
    for other, at in layout.earlier.items():
        before = rows.earlier[other]
        if isinstance(before, StrengthRows):
            found |= _of_units(f"{other}_", unit_means(before, stage), at)
        else:
            precision = np.where(before.stage <= stage, before.extra["precision"], 0.0)
            found[f"{other}_value"] = before.value[at.entry]
            found[f"{other}_precision"] = precision[at.entry]
    return {f"{key}_{name}": array for name, array in found.items()}


def _of_units(start: str, means: Means, at: At) -> dict[str, NDArray[Any]]:
    return {f"{start}{name}": part[at.entry] for name, part in means._asdict().items()}


def _line(key: str, rows: StrengthRows, values: Mapping[str, Numeric], device: IntArray) -> Any:
    """Level, slope and scatter of the device of each entry, last axis entry."""
    return (
        op.stack_last([values[f"{key}.{name}.{what}"] for name in rows.devices])[..., device]
        for what in LINE
    )


def _sums(
    kind: tuple[str, StrengthRows],
    values: Mapping[str, Numeric],
    at: At,
    means: Means,
    mean: Numeric,
) -> Sums:
    """Sum what an indirect test says at each shared place of ln strength less ``mean``."""
    key, rows = kind
    level, slope, scatter = _line(key, rows, values, find_units(rows).device[at.entry])
    variance = scatter**2 + means.error
    expected = op.log(level) + slope * (mean[..., at.position] - REFERENCE)
    residual = means.value - expected
    weight = means.active / variance
    parts = (
        weight * slope**2,
        weight * slope * residual,
        weight * residual**2,
        means.active * op.log(variance),
    )
    return Sums(*(at.sum(part) for part in parts))


def _before(
    key: str, rows: StrengthRows, values: Mapping[str, Numeric], arrays: Mapping[str, Numeric]
) -> tuple[Numeric, Numeric, Heavy | None]:
    """Mean and variance of ln strength at shared places given the kinds before.

    Cores whose errors are not normal are no part of it and come along apart.
    """
    layout = lay_out(rows)
    zone = rows.place_zone[layout.shared]
    mean = op.log(zone_values(rows, values, "concrete_mean"))[..., zone]
    variance = (zone_values(rows, values, "concrete_scatter") ** 2)[..., zone]
    heavy = None
    for other, at in layout.earlier.items():
        if not len(at.entry):
            continue
        test = rows.earlier[other]
        if isinstance(test, StrengthRows):
            means = Means(*(arrays[f"{key}_{other}_{name}"] for name in Means._fields))
            sums = _sums((other, test), values, at, means, mean)
            precision, weighted = sums.precision, sums.weighted
        else:
            part = {k: v[at.entry] for k, v in test.extra.items()}
            value = arrays[f"{key}_{other}_value"]
            reading = (
                value - correction_shift(replace(test, extra=part), values) + 0.0 * mean[..., :1]
            )
            weight = arrays[f"{key}_{other}_precision"]
            freedom = part.get("freedom", np.full(len(at.entry), np.inf))
            heavy = _heavy(reading, weight, freedom, at.position)
            normal = weight * np.isinf(freedom)
            precision = at.sum(normal)
            weighted = at.sum(normal * (reading - mean[..., at.position]))
        mean, sd = local_posterior(precision, weighted, mean, variance)
        variance = sd**2
    return mean, variance, heavy


def _heavy(reading: Numeric, weight: Numeric, freedom: FloatArray, position: IntArray) -> Any:
    """Arrange the cores whose errors are not normal by place; None if there are none."""
    chosen = np.flatnonzero(np.isfinite(freedom))
    if not len(chosen):
        return None
    place = np.unique(position[chosen])
    row, once = padded_places(position[chosen], place)
    row = chosen[row]
    return Heavy(place, Readings(reading[..., row], weight[row] * once, freedom[row]))


def log_likelihood(
    key: str, rows: StrengthRows, values: Mapping[str, Numeric], arrays: Mapping[str, Numeric]
) -> Numeric:
    r"""Log-density of a test's active readings given those of the kinds before it.

    Parameters
    ----------
    key : str
        Of the kind.
    rows : StrengthRows
        All readings.
    values : mapping
        Common variables, as scalars of a graph or draws.
    arrays : mapping
        From `data`.

    Returns
    -------
    numeric
        A scalar of the graph, or shape (n_draw,); up to a constant.

    Notes
    -----
    The mean :math:`\bar y` of ln of a device's readings at a place is

    .. math:: \bar y = \ln a + b (u - u_0) + \delta + \bar e, \quad u \sim N(\mu, \sigma^2),
              \quad \delta \sim N(0, s^2), \quad \bar e \sim N(0, e^2)

    with u the ln of the strength there. Alone at its place it is normal with variance
    :math:`b^2\sigma^2 + s^2 + e^2`: units of one zone, device, survey and e enter through number,
    mean and sum of squares. Elsewhere :math:`\mu` and :math:`\sigma` are those of u given the
    kinds before (normal, closed form), and with loadings b the density of the units of a place is
    that of `nested_log_likelihood` with :math:`P = \sum b^2/\tau`, :math:`W = \sum b r/\tau`,
    :math:`Q = \sum r^2/\tau`, :math:`\tau = s^2 + e^2`, times :math:`\prod \tau^{-1/2}`. Where
    cores have Student-t errors t(u), the ratio :math:`\int t N_1 / \int t N_0` of their
    densities after and before these readings is added (`robust_log_likelihood`).
    """
    layout = lay_out(rows)
    result: Numeric = 0.0
    if len(layout.lone):
        result = _lone(key, rows, values, arrays, layout).sum(axis=-1)
    if not len(layout.shared):
        return result
    mean, variance, heavy = _before(key, rows, values, arrays)
    means = Means(*(arrays[f"{key}_{name}"] for name in Means._fields))
    own = _sums((key, rows), values, layout.own, means, mean)
    nested = nested_log_likelihood(own.precision, own.weighted, own.square, variance)
    result = result + (nested - 0.5 * own.log_variance).sum(axis=-1)
    if heavy is not None:
        here, readings = heavy
        after, sd = local_posterior(own.precision, own.weighted, mean, variance)
        ratio = robust_log_likelihood(
            readings, after[..., here], (sd**2)[..., here]
        ) - robust_log_likelihood(readings, mean[..., here], variance[..., here])
        result = result + ratio.sum(axis=-1)
    return result


def _lone(
    key: str,
    rows: StrengthRows,
    values: Mapping[str, Numeric],
    arrays: Mapping[str, Numeric],
    layout: Layout,
) -> Numeric:
    """Log-density of each group of units that are alone at their places."""
    level, slope, scatter = _line(key, rows, values, layout.group_device)
    mean = op.log(zone_values(rows, values, "concrete_mean"))[..., layout.group_zone]
    spread = zone_values(rows, values, "concrete_scatter")[..., layout.group_zone]
    total = (slope * spread) ** 2 + scatter**2 + layout.group_error
    centre = op.log(level) + slope * (mean - REFERENCE)
    count = arrays[f"{key}_count"]
    square = arrays[f"{key}_square"] + count * (arrays[f"{key}_mean"] - centre) ** 2
    return -0.5 * (count * op.log(total) + square / total)


def simulate(
    key: str, rows: StrengthRows, values: Mapping[str, FloatArray], rng: np.random.Generator
) -> FloatArray:
    """Draw readings of the same design given all readings of the kinds before it.

    Parameters
    ----------
    key : str
        Of the kind.
    rows : StrengthRows
        All readings.
    values : mapping of str to ndarray (n_draw,)
        Common variables.
    rng : numpy.random.Generator
        Source of chance.

    Returns
    -------
    ndarray, shape (n_draw, n_row)
        ln of the readings.
    """
    layout = lay_out(rows)
    mean = np.log(zone_values(rows, values, "concrete_mean"))[:, rows.place_zone]
    sd = zone_values(rows, values, "concrete_scatter")[:, rows.place_zone]
    score = rng.standard_normal(mean.shape)
    local = mean + sd * score
    if len(layout.shared):
        last = max(int(one.stage.max()) for one in (rows, *rows.earlier.values()))
        base, variance, heavy = _before(key, rows, values, data(key, rows, last))
        local[:, layout.shared] = base + np.sqrt(variance) * score[:, layout.shared]
        if heavy is not None:
            for k, place in enumerate(heavy.place):
                readings = heavy.readings
                some = np.flatnonzero(readings.precision[k])
                grid, density = robust_local_density(
                    readings.value[:, k, some],
                    readings.precision[k, some],
                    readings.freedom[k, some],
                    base[:, place],
                    np.sqrt(variance[:, place]),
                )
                table = quantile_table(grid, scores_of_density(grid, density)[0])
                at = layout.shared[place]
                drawn = TabulatedLocal("u", table).values(
                    score[:, at, None, None], np.arange(len(score))
                )
                local[:, at] = drawn["u"][:, 0]
    units = layout.units
    level, slope, scatter = _line(key, rows, values, units.device)
    shown = np.log(level) + slope * (local[:, units.place] - REFERENCE)
    shown = shown + scatter * rng.standard_normal(shown.shape)
    error = np.sqrt(rows.extra["error"]) * rng.standard_normal((len(shown), len(rows.value)))
    return np.asarray(shown[:, units.of_row] + error)


def local_strength(
    key: str,
    rows: StrengthRows | None,
    stage: int,
    at: tuple[str, str],
    values: Mapping[str, FloatArray],
) -> tuple[LocalModel, ...]:
    """Condition the strength of a section on this test and on all kinds before it.

    Parameters
    ----------
    key : str
        Of the kind.
    rows : StrengthRows or None
        All readings.
    stage : int
        Number of surveys that count.
    at : tuple of str
        Section, and its zone.
    values : mapping of str to ndarray (n_draw,)
        Common variables.

    Returns
    -------
    tuple of LocalModel
        Nothing where this test was not done at the section by then: the kinds before say what is
        known there.
    """
    section, zone = at
    place = None if rows is None else rows.place_of(section)
    if rows is None or place is None or rows.stage[rows.place == place].min() > stage:
        return ()
    found = population_local(
        "strength", values, zone, "concrete_mean", "concrete_scatter", logarithm=True
    )
    mean, variance = found.mean, found.sd**2
    for other, test in ((key, rows), *rows.earlier.items()):
        here = test.place_of(section)
        if here is None or not isinstance(test, StrengthRows):
            continue
        entry = np.flatnonzero(find_units(test).place == here)
        means = Means(*(part[entry] for part in unit_means(test, stage)))
        entries = At(entry, np.zeros(len(entry), dtype=np.int64), 1)
        sums = _sums((other, test), values, entries, means, mean[:, None])
        mean, sd = local_posterior(sums.precision[:, 0], sums.weighted[:, 0], mean, variance)
        variance = sd**2
    # To the cores, what the other tests leave is the population that the section comes from.
    left = {f"{zone}.concrete_mean": np.exp(mean), f"{zone}.concrete_scatter": np.sqrt(variance)}
    return CORES.local(rows.earlier.get("cores"), stage, section, zone, {**values, **left})
