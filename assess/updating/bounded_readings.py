"""Readings of normal local values, some of which are only bounds.

Rows on their own enter through sufficient statistics and closed tail probabilities. Rows that
share a place share its local value: what was read there is integrated out in closed form, bounds
at such a place by a quadrature whose panels end where the bounds lie.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from assess import operations as op
from assess.updating.bounds import is_below, is_beyond
from assess.updating.kind import membership
from assess.updating.nested import local_posterior, nested_log_likelihood

Numeric = Any  # float, ndarray or PyTensor variable
FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

NODES = 32  # Gauss-Legendre, per panel; tests compare with adaptive quadrature
REACH = 7.0  # standard deviations of the local value that the quadrature spans to each side
NEVER = 1e6  # stands for no bound
ABOVE, UNDER = 1.0, -1.0  # sides of a bound


@dataclass(frozen=True, slots=True, eq=False)
class Slots:
    """Distinct bounds that readings of a unit (a group of rows, or a place) can be.

    Arrays of shape (n_slot,), but ``low`` and ``high`` (n_row,): the slot that a row would fall
    into, -1 for none.
    """

    unit: IntArray
    limit: FloatArray
    variance: FloatArray
    side: FloatArray
    low: IntArray
    high: IntArray

    def count(self, value: FloatArray, active: BoolArray) -> FloatArray:
        """Count the rows that are bounds, by slot."""
        counts = np.zeros(len(self.unit))
        np.add.at(counts, self.low[active & is_below(value) & (self.low >= 0)], 1.0)
        np.add.at(counts, self.high[active & is_beyond(value) & (self.high >= 0)], 1.0)
        return counts


@dataclass(frozen=True, eq=False)
class Readings:
    """What was read where, whatever the readings were; arrays of shape (n_row,).

    ``low`` and ``high`` are limits below and beyond which a reading is only a bound, on the scale
    on which readings are normal and infinite for none; ``variance`` is that of reading error.
    """

    prefix: str  # of the names of the data
    low: FloatArray
    high: FloatArray
    variance: FloatArray
    stage: IntArray
    zone: IntArray
    place: IntArray

    @cached_property
    def single(self) -> BoolArray:
        """Rows that are places of their own."""
        return np.asarray(np.bincount(self.place)[self.place] == 1, dtype=np.bool_)

    @cached_property
    def groups(self) -> tuple[FloatArray, IntArray]:
        """Stage, zone and variance of each group of single rows, and the group of each."""
        key = np.column_stack([self.stage, self.zone, self.variance])[self.single]
        groups, of_row = np.unique(key.reshape(-1, 3), axis=0, return_inverse=True)
        return groups, of_row.astype(np.int64).ravel()

    @cached_property
    def shared(self) -> tuple[IntArray, IntArray]:
        """Zone of each place with several rows, and the place of each of these rows."""
        _, first, of_row = np.unique(
            self.place[~self.single], return_index=True, return_inverse=True
        )
        return self.zone[~self.single][first], of_row.astype(np.int64).ravel()

    @cached_property
    def single_slots(self) -> Slots:
        """Bounds that single rows can be; the unit is the group."""
        return self._slots(self.groups[1], self.single)

    @cached_property
    def shared_slots(self) -> Slots:
        """Bounds that rows of shared places can be; the unit is the place."""
        return self._slots(self.shared[1], ~self.single)

    def _slots(self, unit: IntArray, chosen: BoolArray) -> Slots:
        limits = ((self.low[chosen], UNDER), (self.high[chosen], ABOVE))
        keys = [
            np.column_stack([unit, limit, self.variance[chosen], np.full(len(unit), side)])
            for limit, side in limits
        ]
        table = np.concatenate(keys)
        possible = np.isfinite(table[:, 1])
        slots, which = np.unique(table[possible].reshape(-1, 4), axis=0, return_inverse=True)
        of_row = np.full(len(table), -1, dtype=np.int64)
        of_row[possible] = which.ravel()
        low, high = np.split(of_row, 2)
        return Slots(slots[:, 0].astype(np.int64), slots[:, 1], slots[:, 2], slots[:, 3], low, high)

    def data(self, value: FloatArray, stage: int) -> dict[str, NDArray[Any]]:
        """Sufficient statistics with later surveys switched off; bounds in `value` as marks.

        Parameters
        ----------
        value : ndarray, shape (n_row,)
            Readings on the scale of ``low`` and ``high``; see `assess.updating.bounds`.
        stage : int
            Number of surveys that count.

        Returns
        -------
        dict
            Shapes do not depend on ``value`` or ``stage``.
        """
        active = self.stage <= stage
        read = active & np.isfinite(value)
        groups, group = self.groups
        count, mean, square = _moments(
            value[self.single], read[self.single].astype(np.float64), group, len(groups)
        )
        zones, place = self.shared
        weight = np.where(read, 1.0 / self.variance, 0.0)[~self.single]
        precision, centre, spread = _moments(value[~self.single], weight, place, len(zones))
        bounds = self.shared_slots.count(value[~self.single], active[~self.single])
        return {
            f"{self.prefix}_count": count,
            f"{self.prefix}_mean": mean,
            f"{self.prefix}_square": square,
            f"{self.prefix}_bounds": self.single_slots.count(
                value[self.single], active[self.single]
            ),
            f"{self.prefix}_shared_precision": precision,
            f"{self.prefix}_shared_mean": centre,
            f"{self.prefix}_shared_square": spread,
            f"{self.prefix}_shared_bounds": bounds,
            f"{self.prefix}_shared_window": self._window(bounds),
        }

    def _window(self, bounds: FloatArray) -> FloatArray:
        """Give the tightest bounds of each shared place, (n_place, 2): from below, from above."""
        slots = self.shared_slots
        window = np.tile([-NEVER, NEVER], (len(self.shared[0]), 1))
        over = (bounds > 0.0) & (slots.side == ABOVE)
        under = (bounds > 0.0) & (slots.side == UNDER)
        np.maximum.at(window[:, 0], slots.unit[over], slots.limit[over])
        np.minimum.at(window[:, 1], slots.unit[under], slots.limit[under])
        return window

    def log_likelihood(self, mean: Numeric, variance: Numeric, data: Mapping[str, Numeric]) -> Any:
        r"""Log-likelihood of all active readings, local values integrated out.

        Parameters
        ----------
        mean, variance : numeric, last axis zone
            Of the local values of each zone.
        data : mapping
            From `data`, as numbers or as graph variables.

        Returns
        -------
        numeric
            Up to terms of the reading errors alone; the last axis is summed over.

        Notes
        -----
        Readings :math:`y = u + e` with local :math:`u \sim N(\mu, \sigma^2)` and
        :math:`e \sim N(0, s^2)`. A single row that says no more than "beyond c" has
        :math:`\Phi((\mu - c) / \sqrt{\sigma^2 + s^2})`. At a place with several rows those that
        were read leave :math:`u \sim N(m, v)` and the others contribute

        .. math:: \int \prod_k \Phi\left(\pm \frac{m + \sqrt v z - c_k}{s_k}\right)^{n_k}
                  \varphi(z)\, dz

        by Gauss-Legendre quadrature over panels that end at the tightest bounds, where the
        integrand steps if reading errors are small beside :math:`\sqrt v`; the substitution
        :math:`x^2 (3 - 2 x)` gathers nodes at the ends of each panel.

        References
        ----------
        .. [1] P. J. Davis, P. Rabinowitz, Methods of Numerical Integration, 2nd ed., 1984, ch. 2.
        """
        groups, _ = self.groups
        zone = groups[:, 1].astype(np.int64)
        centre, total = mean[..., zone], variance[..., zone] + groups[:, 2]
        count = data[f"{self.prefix}_count"]
        distance = data[f"{self.prefix}_mean"] - centre
        read = count * (op.log(total) + distance * distance / total)
        result = -0.5 * (read + data[f"{self.prefix}_square"] / total).sum(axis=-1)
        slots = self.single_slots
        if len(slots.unit):
            excess = slots.side * (centre[..., slots.unit] - slots.limit)
            chance = op.log_normal_cdf(excess / op.sqrt(total[..., slots.unit]))
            result = result + (data[f"{self.prefix}_bounds"] * chance).sum(axis=-1)
        zones, _ = self.shared
        if len(zones):
            result = result + self._shared(mean[..., zones], variance[..., zones], data).sum(
                axis=-1
            )
        return result

    def _shared(self, mean: Numeric, variance: Numeric, data: Mapping[str, Numeric]) -> Numeric:
        """Log-likelihood of each place with several rows, last axis place."""
        precision = data[f"{self.prefix}_shared_precision"]
        distance = data[f"{self.prefix}_shared_mean"] - mean
        weighted = precision * distance
        square = data[f"{self.prefix}_shared_square"] + weighted * distance
        read = nested_log_likelihood(precision, weighted, square, variance)
        slots = self.shared_slots
        if not len(slots.unit):
            return read
        known, sd = local_posterior(precision, weighted, mean, variance)
        return read + self._bounded(known, sd, data)

    def _bounded(self, mean: Numeric, sd: Numeric, data: Mapping[str, Numeric]) -> Numeric:
        """Log-probability of the bounds of each place, given the normal that is left there."""
        slots, count = self.shared_slots, data[f"{self.prefix}_shared_bounds"]
        window = data[f"{self.prefix}_shared_window"]
        by_place = membership(slots.unit, len(self.shared[0]))
        share, weight = _gathered_nodes()
        edges = [0.0 * mean - REACH, *self._cuts(window, mean, sd), 0.0 * mean + REACH]
        peak: Numeric = -NEVER
        panels = []
        for start, end in zip(edges[:-1], edges[1:], strict=True):
            width = (end - start)[..., None]
            z = start[..., None] + width * share
            local = (mean[..., None] + sd[..., None] * z)[..., slots.unit, :]
            score = slots.side[:, None] * (local - slots.limit[:, None])
            chance = op.log_normal_cdf(score / np.sqrt(slots.variance)[:, None])
            log_density = op.normal_logpdf(z) + by_place @ (count[:, None] * chance)
            panels.append((log_density, width * weight))
            peak = op.maximum(peak, log_density.max(axis=-1))
        total: Numeric = 0.0
        for log_density, width in panels:
            total = total + (op.exp(log_density - peak[..., None]) * width).sum(axis=-1)
        return op.where(by_place @ count > 0.0, peak + op.log(total), 0.0)

    def _cuts(self, window: Numeric, mean: Numeric, sd: Numeric) -> list[Numeric]:
        """Give the scores of the tightest bounds of each place, in order; of sides that occur."""
        cuts = [
            op.maximum(op.minimum((window[:, k] - mean) / sd, REACH), -REACH)
            for k, side in enumerate((ABOVE, UNDER))
            if np.any(self.shared_slots.side == side)
        ]
        return cuts if len(cuts) == 1 else [op.minimum(*cuts), op.maximum(*cuts)]


def _gathered_nodes() -> tuple[FloatArray, FloatArray]:
    """Nodes and weights on 0 to 1 that gather at both ends."""
    node, weight = np.polynomial.legendre.leggauss(NODES)
    x = 0.5 * (node + 1.0)
    return x * x * (3.0 - 2.0 * x), 3.0 * weight * x * (1.0 - x)


def _moments(
    value: FloatArray, weight: FloatArray, unit: IntArray, count: int
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Sum of weights, weighted mean and weighted sum of squares about it, by unit."""
    known = np.where(weight > 0.0, value, 0.0)
    total = np.bincount(unit, weight, count)
    mean = np.bincount(unit, weight * known, count) / np.where(total > 0.0, total, 1.0)
    square = np.bincount(unit, weight * (known - mean[unit]) ** 2, count)
    return total, mean, square
