"""Onset and rate of corrosion at a place, given what break-outs there found.

The local onset is integrated out by a quadrature that follows the zone's distribution of onsets;
given the onset, the local rate is lognormal and integrates in closed form.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from assess import operations as op
from assess.mechanics.corrosion import penetration_depth
from assess.updating import nested
from assess.updating.kind import FloatArray, Numeric, Rows

NODES = 56  # Gauss-Legendre, per stretch between visits; tests compare with adaptive quadrature
GATHER = 6.0  # nodes resolve e^-GATHER of a stretch
REACH = 6.0  # standard deviations of ln onset that the quadrature spans to each side
OFF = 1e3  # stands for no bound on ln rate
LEAST_AGE = 1e-12  # [yr] keeps logarithms finite; at it nothing has corroded
LEAST = 1e-290  # keeps the logarithm of a likelihood finite


class Population(NamedTuple):
    """Zone parameters of onset [ln yr] and rate of loss of radius [ln mm/yr]; broadcast."""

    log_onset: Numeric
    onset_scatter: Numeric
    log_rate: Numeric
    rate_scatter: Numeric


def population(
    onset: Numeric, onset_scatter: Numeric, current: Numeric, current_scatter: Numeric
) -> Population:
    """Build the population from a zone's common variables (onset [yr], current [µA/cm²])."""
    return Population(
        op.log(onset), onset_scatter, op.log(penetration_depth(current, 1.0)), current_scatter
    )


@dataclass(frozen=True, slots=True, eq=False)
class Places:
    """What was found at each place, padded to the largest number of visits.

    ``log_last`` (n_place,) is ln of the age up to which the onset matters: the first visit that
    found loss, else the last visit. The others have shape (n_place, n_visit). ``log_edge`` holds,
    in order, ln of the ages of earlier visits that found none, then ``log_last`` to fill up:
    between them the likelihood is smooth in the onset. ``found`` and ``none`` are 1 where a visit
    found loss or found none, 0 at padding and for later surveys.
    """

    log_last: Any
    log_edge: Any
    age: Any  # of the structure at the visit [yr]
    found: Any
    none: Any
    log_loss: Any  # ln of measured loss of radius [ln mm], 0 where none
    precision: Any  # one over the variance of log_loss, 0 where none
    limit: Any  # ln of the detection limit [ln mm]
    visits: int  # length of the last axis

    def data(self) -> dict[str, NDArray[Any]]:
        """Arrays by the names under which the sampler holds them."""
        return {f"loss_{name}": getattr(self, name) for name in _ARRAYS}

    @staticmethod
    def from_data(data: Mapping[str, Numeric], visits: int) -> "Places":
        """Take the arrays back, as numbers or as graph variables."""
        return Places(**{name: data[f"loss_{name}"] for name in _ARRAYS}, visits=visits)

    def one(self, place: int) -> "Places":
        """Pick one place, keeping the axis."""
        arrays = {name: getattr(self, name)[place : place + 1] for name in _ARRAYS}
        return Places(**arrays, visits=self.visits)

    @property
    def anything_known(self) -> bool:
        """Whether any visit counts at this stage."""
        return bool(np.any(self.found > 0) or np.any(self.none > 0))


_ARRAYS = tuple(field.name for field in fields(Places) if field.name != "visits")


def count_visits(rows: Rows) -> int:
    """Largest number of rows at one place."""
    return int(np.bincount(rows.place).max())


def places(rows: Rows, stage: int) -> Places:
    """Arrange break-outs by place, with later surveys switched off."""
    visit = np.zeros(len(rows.place), dtype=np.int64)
    seen = np.zeros(len(rows.places), dtype=np.int64)
    for row, place in enumerate(rows.place):
        visit[row] = seen[place]
        seen[place] += 1
    shape = (len(rows.places), count_visits(rows))

    def padded(values: NDArray[Any], fill: float = 0.0) -> FloatArray:
        array = np.full(shape, fill)
        array[rows.place, visit] = values
        return array

    active = rows.stage <= stage
    loss = np.isfinite(rows.value)
    found = padded(np.where(active & loss, 1.0, 0.0))
    none = padded(np.where(active & ~loss, 1.0, 0.0))
    age = padded(rows.extra["age"], fill=1.0)
    first_found = np.where(found > 0, age, np.inf).min(axis=1)
    last_none = np.where(none > 0, age, 1.0).max(axis=1)
    last = np.where(np.isfinite(first_found), first_found, last_none)
    edge = np.sort(np.where((none > 0) & (age < last[:, None]), age, last[:, None]), axis=1)
    return Places(
        log_last=np.log(last),
        log_edge=np.log(edge),
        age=age,
        found=found,
        none=none,
        log_loss=padded(np.where(active & loss, np.nan_to_num(rows.value), 0.0)),
        precision=padded(np.where(active & loss, rows.extra["precision"], 0.0)),
        limit=padded(rows.extra["limit"]),
        visits=shape[1],
    )


def years_at_visits(seen: Places, onset: Numeric) -> list[Numeric]:
    """Give ln of the years corroded by each visit; far below any rate's reach before the onset."""
    return [op.log(op.maximum(seen.age[:, k, None] - onset, LEAST_AGE)) for k in range(seen.visits)]


def healed_places(rows: Rows) -> list[str]:
    """Name the places where loss was found that a visit no earlier and no less keen denies."""
    loss, age, limit = np.isfinite(rows.value), rows.extra["age"], rows.extra["limit"]
    healed = []
    for place, name in enumerate(rows.places):
        found = np.flatnonzero((rows.place == place) & loss)
        none = np.flatnonzero((rows.place == place) & ~loss)
        if np.any((age[none, None] >= age[found]) & (limit[none, None] <= limit[found])):
            healed.append(name)
    return healed


class RateGivenOnset(NamedTuple):
    """Distribution of ln rate given the onset, and how likely the findings are."""

    log_density: Numeric  # of the losses measured
    window: Numeric  # probability that loss was found, and not found, when it was
    mean: Numeric
    sd: Numeric
    lower: Numeric  # standard units
    upper: Numeric


def rate_given_onset(seen: Places, zone: Population, log_age: Sequence[Numeric]) -> RateGivenOnset:
    """Weigh the findings for given onsets.

    ``log_age`` holds, visit by visit, ln of the years corroded by then; it and the results have
    shape (n_place or n_draw, n_onset).
    """
    precision: Numeric = 0.0
    weighted: Numeric = 0.0
    square: Numeric = 0.0
    lower: Numeric = -OFF
    upper: Numeric = OFF
    for k, log_years in enumerate(log_age):
        residual = seen.log_loss[:, k, None] - log_years - zone.log_rate
        precision = precision + seen.precision[:, k, None]
        weighted = weighted + seen.precision[:, k, None] * residual
        square = square + seen.precision[:, k, None] * residual * residual
        # A visit that found loss bounds the rate from below, one that found none from above;
        # what a visit does not bound is shifted out of reach.
        idle_found = OFF * (1.0 - seen.found[:, k, None])
        idle_none = OFF * (1.0 - seen.none[:, k, None])
        lower = op.maximum(lower, seen.limit[..., k, None] - idle_found - log_years)
        upper = op.minimum(upper, seen.limit[..., k, None] + idle_none - log_years)
    variance = zone.rate_scatter**2
    mean, sd = nested.local_posterior(precision, weighted, zone.log_rate, variance)
    low, high = (lower - mean) / sd, (upper - mean) / sd
    # Phi(high) - Phi(low), taken in the tail where neither is close to 1.
    side = op.where(low > 0.0, -1.0, 1.0)
    window = side * (op.normal_cdf(side * high) - op.normal_cdf(side * low))
    density = nested.nested_log_likelihood(precision, weighted, square, variance)
    return RateGivenOnset(density, window, mean, sd, low, high)


def log_onset_density(zone: Population, log_onset: Numeric) -> Numeric:
    """Lognormal log-density of the onset [1/yr]."""
    score = (log_onset - zone.log_onset) / zone.onset_scatter
    return op.normal_logpdf(score) - op.log(zone.onset_scatter) - log_onset


def log_likelihood(seen: Places, zone: Population) -> Numeric:
    r"""Log-likelihood of the findings at each place, onset and rate integrated out.

    Parameters
    ----------
    seen : Places
        Findings of n_place places.
    zone : Population
        Parameters of shape (n_place, 1), or (1, 1).

    Returns
    -------
    numeric, shape (n_place,)
        Log-likelihood up to terms of measuring precision alone; 0 where nothing is known.

    Notes
    -----
    With T the age at the first visit that found loss (else at the last visit)

    .. math:: L = \int_0^T f(t_i)\, P(\text{findings} \mid t_i)\, dt_i
              + [1 - F(T)]\, 1[\text{no loss found}],

    by Gauss-Legendre quadrature over the standard normal score z of :math:`\ln t_i`, whatever
    the scatter of the onset. Each stretch between visits that found none, and up to T, is cut at
    `REACH` and substituted by :math:`z = z_{end} - (z_{end} - z_{start}) (e^{g x} - 1)/(e^g -
    1)`: nodes gather where the bar has corroded for a short time and the logarithm of that time
    varies fast.

    References
    ----------
    .. [1] P. J. Davis, P. Rabinowitz, Methods of Numerical Integration, 2nd ed., 1984, ch. 2.
    """
    node, weight = np.polynomial.legendre.leggauss(NODES)
    growth = np.exp(0.5 * GATHER * (node + 1.0))
    before = (growth - 1.0) / np.expm1(GATHER)  # share of the stretch from its end to the node
    share = 0.5 * GATHER * weight * growth / np.expm1(GATHER)
    score_last = (seen.log_last[:, None] - zone.log_onset) / zone.onset_scatter
    top = op.minimum(score_last, REACH)
    start = op.minimum(top, 0.0) - REACH
    stretches: list[tuple[Numeric, Numeric]] = []  # log-density, weight of each node
    for k in range(seen.visits):
        end = (seen.log_edge[:, k, None] - zone.log_onset) / zone.onset_scatter
        end = op.maximum(op.minimum(end, top), start)
        score = end - (end - start) * before
        onset = op.exp(zone.log_onset + zone.onset_scatter * score)
        rate = rate_given_onset(seen, zone, years_at_visits(seen, onset))
        stretches.append(
            (op.normal_logpdf(score) + rate.log_density, (end - start) * share * rate.window)
        )
        start = end
    peak: Numeric = -500.0
    for log_density, _ in stretches:
        peak = op.maximum(peak, log_density.max(axis=-1))
    found = seen.found.max(axis=1)
    known = op.maximum(found, seen.none.max(axis=1))
    total = (1.0 - found) * op.normal_cdf(-score_last)[..., 0] * op.exp(-peak)
    for log_density, weight_here in stretches:
        total = total + (op.exp(log_density - peak[..., None]) * weight_here).sum(axis=-1)
    return op.where(known > 0.0, peak + op.log(op.maximum(total, LEAST)), 0.0)
