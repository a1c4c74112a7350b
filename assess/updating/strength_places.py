"""What cores and indirect tests of the same places say of the strength there, together.

Given the common variables, ln of the local strength is normal and cores and indirect readings are
linear in it, so that it integrates out. Each kind contributes the density of its readings given
those of the kinds before it at the same places: the product over kinds is the joint density.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from assess import operations as op
from assess.updating.core_values import correction_shift
from assess.updating.kind import FloatArray, IntArray, Numeric, Rows, zone_values
from assess.updating.local import (
    Local,
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

REFERENCE = float(np.log(30.0))  # [ln MPa] strength at which the level of a device is stated
CORES = "cores"


@dataclass(frozen=True, slots=True, eq=False)
class PairedRows(Rows):
    """Readings of one kind, with those that kinds before it took anywhere in the structure."""

    devices: tuple[str, ...] = ()  # ``extra["device"]`` is an index into them
    earlier: tuple[tuple[str, Rows], ...] = ()


class Sums(NamedTuple):
    """What normal readings say of each place's ln strength less its zone's, last axis place."""

    precision: Numeric
    weighted: Numeric
    square: Numeric
    log_scale: Numeric  # of the readings' own densities

    def plus(self, other: "Sums") -> "Sums":
        """Add readings of another kind."""
        return Sums(*(a + b for a, b in zip(self, other, strict=True)))


class Units(NamedTuple):
    """Readings of one device at one place, which share how the place departs from its line."""

    of_row: IntArray
    device: IntArray  # of each unit
    place: IntArray


def units(rows: PairedRows) -> Units:
    """Group rows by place and device."""
    device = rows.extra["device"].astype(np.int64)
    key, of_row = np.unique(rows.place * len(rows.devices) + device, return_inverse=True)
    return Units(of_row.astype(np.int64), key % len(rows.devices), key // len(rows.devices))


def own_data(key: str, rows: PairedRows, stage: int) -> dict[str, NDArray[Any]]:
    """Mean and error variance of each unit's active readings, under names that begin with key."""
    found = units(rows)
    weight = np.where(rows.stage <= stage, 1.0 / rows.extra["variance"], 0.0)
    total = np.bincount(found.of_row, weights=weight, minlength=len(found.place))
    value = np.bincount(found.of_row, weights=weight * rows.value, minlength=len(found.place))
    active = total > 0.0
    held = np.where(active, total, 1.0)
    return {
        f"{key}_mean": value / held,
        f"{key}_error": 1.0 / held,
        f"{key}_active": active.astype(np.float64),
    }


def data(key: str, rows: PairedRows, stage: int) -> dict[str, NDArray[Any]]:
    """Arrays of a kind's readings and of those of the kinds before it."""
    found = own_data(key, rows, stage)
    for name, earlier in rows.earlier:
        if isinstance(earlier, PairedRows):
            found |= own_data(f"{key}_{name}", earlier, stage)
        else:
            active = earlier.stage <= stage
            found[f"{key}_{name}_value"] = earlier.value
            found[f"{key}_{name}_precision"] = np.where(active, earlier.extra["precision"], 0.0)
    return found


def variable_name(key: str, device: str, what: str) -> str:
    """Name a variable of a device."""
    return f"{key}.{device}.{what}"


def _line(key: str, rows: PairedRows, values: Mapping[str, Numeric], what: str) -> Numeric:
    """Stack one variable of all devices, last axis device."""
    return op.stack_last([values[variable_name(key, device, what)] for device in rows.devices])


def _matrix(place: IntArray, names: tuple[str, ...], rows: Rows, count: int) -> FloatArray:
    """Build the 0/1 matrix (n, count) from entries with places of their own to those of rows."""
    # Rows on their own have no name: they meet no other.
    numbers = {name: number for number, name in enumerate(rows.places) if name}
    matrix = np.zeros((len(place), count))
    for entry, one in enumerate(place):
        number = numbers.get(names[one])
        if number is not None:
            matrix[entry, number] = 1.0
    return matrix


def _mean_at(rows: Rows, values: Mapping[str, Numeric]) -> Numeric:
    return op.log(zone_values(rows, values, "concrete_mean"))[..., rows.place_zone]


def _indirect_sums(
    kind: str,
    test: PairedRows,
    values: Mapping[str, Numeric],
    arrays: Mapping[str, Numeric],
    rows: Rows,
    mean: Numeric,
) -> Sums:
    """Sum units of an indirect test over the places of rows; ``mean`` is ln there."""
    found = units(test)
    own = test is rows
    if own:
        matrix = np.zeros((len(found.place), len(rows.places)))
        matrix[np.arange(len(found.place)), found.place] = 1.0
    else:
        matrix = _matrix(found.place, test.places, rows, len(rows.places))
    place = matrix.argmax(axis=1)
    level, slope, scatter = (
        _line(kind, test, values, what)[..., found.device] for what in ("level", "slope", "scatter")
    )
    variance = scatter**2 + arrays["error"]
    precision = arrays["active"] * slope**2 / variance
    residual = (arrays["mean"] - level) / slope + REFERENCE - mean[..., place]
    return Sums(
        precision @ matrix,
        (precision * residual) @ matrix,
        (precision * residual**2) @ matrix,
        (-0.5 * arrays["active"] * op.log(variance)) @ matrix,
    )


class _Cores(NamedTuple):
    """Cores at the places of rows: normal ones as sums, others reading by reading."""

    sums: Sums
    heavy: IntArray  # places with a core whose error is not normal
    readings: Readings | None  # of those places
    spread: FloatArray  # (n_heavy, n_place), puts values of those places at theirs


def _cores_at(
    cores: Rows, values: Mapping[str, Numeric], arrays: Mapping[str, Numeric], rows: Rows, mean: Any
) -> _Cores:
    matrix = _matrix(cores.place, cores.places, rows, len(rows.places))
    here = matrix.any(axis=1)
    place = matrix.argmax(axis=1)
    normal = np.isinf(cores.extra["freedom"]).astype(np.float64)
    reading = arrays["value"] - correction_shift(cores, values)
    precision = arrays["precision"] * normal
    residual = reading - mean[..., place]
    sums = Sums(
        precision @ matrix,
        (precision * residual) @ matrix,
        (precision * residual**2) @ matrix,
        0.0,
    )
    chosen = np.flatnonzero(here & (normal == 0.0))
    heavy = np.unique(place[chosen])
    if len(heavy) == 0:
        return _Cores(sums, heavy, None, np.zeros((0, len(rows.places))))
    row, once = padded_places(place[chosen], heavy)
    row = chosen[row]
    return _Cores(
        sums,
        heavy,
        Readings(reading[..., row], arrays["precision"][row] * once, cores.extra["freedom"][row]),
        np.eye(len(rows.places))[heavy],
    )


def _part(prefix: str, arrays: Mapping[str, Numeric]) -> dict[str, Numeric]:
    """Take the arrays whose names begin with a prefix, by the rest of their names."""
    start = f"{prefix}_"
    return {n.removeprefix(start): a for n, a in arrays.items() if n.startswith(start)}


def log_likelihood(
    key: str, rows: PairedRows, values: Mapping[str, Numeric], arrays: Mapping[str, Numeric]
) -> Numeric:
    r"""Log-density of a kind's active readings given those of the kinds before it.

    Parameters
    ----------
    key : str
        Of the kind.
    rows : PairedRows
        All readings.
    values : mapping
        Common variables, scalars of a graph or draws.
    arrays : mapping
        From `data`.

    Returns
    -------
    numeric
        Summed over all places.

    Notes
    -----
    A reading :math:`y = a + b (u - u_0) + \delta + e` of ln strength u, :math:`u \sim N(\mu,
    \sigma^2)` in the zone, says of u as much as a core of value :math:`(y - a)/b + u_0` and
    variance :math:`(s^2 + e^2)/b^2`, and has the scale :math:`\sqrt{s^2 + e^2}` itself. With J
    the joint density at a place, `nested_log_likelihood`, the contribution is
    J(all up to this kind) - J(all before it).
    """
    mean = _mean_at(rows, values)
    variance = zone_values(rows, values, "concrete_scatter")[..., rows.place_zone] ** 2
    before, cores = _before(key, rows, values, arrays, mean)
    own = _indirect_sums(key, rows, values, _part(key, arrays), rows, mean)
    after = own if before is None else before.plus(own)
    return _joint(after, cores, mean, variance).sum(axis=-1) - (
        0.0 if before is None else _joint(before, cores, mean, variance).sum(axis=-1)
    )


def _before(
    key: str,
    rows: PairedRows,
    values: Mapping[str, Numeric],
    arrays: Mapping[str, Numeric],
    mean: Numeric,
) -> tuple[Sums | None, _Cores | None]:
    """Sum what the kinds before say at the places of rows."""
    total: Sums | None = None
    cores: _Cores | None = None
    for name, earlier in rows.earlier:
        part = _part(f"{key}_{name}", arrays)
        if isinstance(earlier, PairedRows):
            sums = _indirect_sums(name, earlier, values, part, rows, mean)
        else:
            cores = _cores_at(earlier, values, part, rows, mean)
            sums = cores.sums
        total = sums if total is None else total.plus(sums)
    return total, cores


def _joint(sums: Sums, cores: _Cores | None, mean: Numeric, variance: Numeric) -> Numeric:
    """Log-density of all readings at each place, last axis place."""
    normal = (
        nested_log_likelihood(sums.precision, sums.weighted, sums.square, variance) + sums.log_scale
    )
    if cores is None or cores.readings is None:
        return normal
    shift, sd = local_posterior(sums.precision, sums.weighted, 0.0, variance)
    here = cores.heavy
    heavy = robust_log_likelihood(cores.readings, (mean + shift)[..., here], (sd * sd)[..., here])
    return normal + heavy @ cores.spread


def local_strength(
    key: str,
    rows: PairedRows,
    stage: int,
    place: int,
    values: Mapping[str, FloatArray],
    *,
    own: bool = True,
) -> LocalModel:
    """Local strength of one place given all that was read there.

    Parameters
    ----------
    key : str
        Of the kind.
    rows : PairedRows
        Its readings.
    stage : int
        Number of surveys that count.
    place : int
        Index into the places of rows.
    values : mapping
        Draws of the common variables.
    own : bool, default True
        False: what the kinds before this one say of it.

    Returns
    -------
    LocalModel
        Of the variable ``strength``.
    """
    arrays = data(key, rows, stage)
    mean = np.atleast_2d(_mean_at(rows, values))
    sums, cores = _before(key, rows, values, arrays, mean)
    if own:
        mine = _indirect_sums(key, rows, values, _part(key, arrays), rows, mean)
        sums = mine if sums is None else sums.plus(mine)
    zone = rows.zones[rows.place_zone[place]]
    centre, sd = mean[:, place], np.asarray(values[f"{zone}.concrete_scatter"], dtype=np.float64)
    if sums is None:
        return Local("strength", centre, sd, logarithm=True)
    shape = mean.shape
    precision, weighted = (
        np.broadcast_to(part, shape)[:, place] for part in (sums.precision, sums.weighted)
    )
    shift, sd = local_posterior(precision, weighted, 0.0, sd**2)
    normal = Local("strength", centre + shift, sd, logarithm=True)
    if cores is None or cores.readings is None or place not in cores.heavy:
        return normal
    which = int(np.flatnonzero(cores.heavy == place)[0])
    counts = np.asarray(cores.readings.precision)[which]
    read = counts > 0.0
    if not read.any():
        return normal
    value = np.broadcast_to(
        np.asarray(cores.readings.value)[..., which, :], (len(centre), len(counts))
    )
    grid, density = robust_local_density(
        value[:, read], counts[read], cores.readings.freedom[which][read], normal.mean, normal.sd
    )
    scores, _ = scores_of_density(grid, density)
    return TabulatedLocal("strength", np.exp(quantile_table(grid, scores)))


def simulate(
    key: str, rows: PairedRows, values: Mapping[str, FloatArray], rng: np.random.Generator
) -> FloatArray:
    """Draw readings of the same design given what the kinds before read at the same places.

    Returns
    -------
    ndarray, shape (n_draw, n_row)
        On the scale of `Rows.value`.
    """
    draws = len(next(iter(values.values())))
    found = units(rows)
    strength = np.empty((draws, len(rows.places)))
    every = np.arange(draws)
    last = int(rows.stage.max())
    for place in range(len(rows.places)):
        model = local_strength(key, rows, last, place, values, own=False)
        z = rng.standard_normal((draws, 1, 1))
        strength[:, place] = np.log(model.values(z, every)["strength"][:, 0])
    level, slope, scatter = (
        _line(key, rows, values, what)[:, found.device] for what in ("level", "slope", "scatter")
    )
    centre = level + slope * (strength[:, found.place] - REFERENCE)
    unit = centre + scatter * rng.standard_normal(centre.shape)
    error = np.sqrt(rows.extra["variance"]) * rng.standard_normal((draws, len(rows.value)))
    return np.asarray(unit[:, found.of_row] + error)
