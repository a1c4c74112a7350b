"""Sufficient statistics of readings of normal local values, in groups of places read alike.

Places of one population whose readings weigh the same at every stage enter the likelihood
through their number, the mean of their means and their scatter alone, so that its cost does not
grow with them.
"""

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from assess import operations as op

Numeric = Any  # float, ndarray or PyTensor variable
FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Places:
    """What was read where, whatever the readings were; arrays of shape (n_row,).

    A latent value is what all readings of one place read; each belongs to one population.
    ``sort`` tells readings of one latent value apart that relate to it in different ways.
    """

    prefix: str  # of the names of the data
    latent: IntArray
    population: IntArray
    sort: IntArray
    precision: FloatArray  # one over the variance of reading error
    stage: IntArray
    sorts: int = 1

    @cached_property
    def latents(self) -> int:
        """Number of latent values."""
        return int(self.latent.max()) + 1

    @cached_property
    def population_of(self) -> IntArray:
        """Population of each latent value, (n_latent,)."""
        found = np.zeros(self.latents, dtype=np.int64)
        found[self.latent] = self.population
        return found

    def _sums(self, weight: FloatArray) -> FloatArray:
        """Sum over the readings of each sort of each latent value, (n_latent, sorts)."""
        slot = self.latent * self.sorts + self.sort
        total = np.bincount(slot, weights=weight, minlength=self.latents * self.sorts)
        return total.reshape(self.latents, self.sorts)

    def _active(self, stage: int) -> FloatArray:
        return np.where(self.stage <= stage, self.precision, 0.0)

    @cached_property
    def _grouping(self) -> tuple[IntArray, IntArray]:
        """Group of each latent value, and the first latent value of each group."""
        by_stage = [self._sums(self._active(int(stage))) for stage in np.unique(self.stage)]
        key = np.column_stack([self.population_of, *by_stage])
        _, first, group = np.unique(key, axis=0, return_index=True, return_inverse=True)
        return group.ravel().astype(np.int64), first.astype(np.int64)

    @property
    def group_population(self) -> IntArray:
        """Population of each group, (n_group,)."""
        return self.population_of[self._grouping[1]]

    def data(self, value: FloatArray, stage: int) -> dict[str, FloatArray]:
        """Give the statistics of each group with later surveys switched off.

        Parameters
        ----------
        value : ndarray, shape (n_row,)
            Readings.
        stage : int
            Number of surveys that count.

        Returns
        -------
        dict of str to ndarray
            By group: ``count`` of places; ``precision`` of a place, by sort; ``mean`` of the
            places' means, by sort; ``square``, sums of products of their differences from it,
            by sort and sort; ``within``, the weighted sum of squares about the places' means.
        """
        active = self._active(stage)
        precision = self._sums(active)
        mean = self._sums(active * value) / np.where(precision > 0.0, precision, 1.0)
        group, first = self._grouping
        count = np.bincount(group, minlength=len(first)).astype(np.float64)
        middle = np.zeros((len(first), self.sorts))
        np.add.at(middle, group, mean)
        middle /= count[:, None]
        off = mean - middle[group]
        square = np.zeros((len(first), self.sorts, self.sorts))
        np.add.at(square, group, off[:, :, None] * off[:, None, :])
        spread = active * (value - mean[self.latent, self.sort]) ** 2
        within = np.bincount(group[self.latent], weights=spread, minlength=len(first))
        found = {
            "count": count,
            "precision": precision[first],
            "mean": middle,
            "square": square,
            "within": within,
        }
        return {f"{self.prefix}_{name}": array for name, array in found.items()}

    def summary(self, value: FloatArray, stage: int, latent: int) -> tuple[FloatArray, FloatArray]:
        """Give precision and mean of the active readings of one latent value, each (sorts,)."""
        here = self.latent == latent
        active = self._active(stage)[here]
        precision = np.bincount(self.sort[here], weights=active, minlength=self.sorts)
        total = np.bincount(self.sort[here], weights=active * value[here], minlength=self.sorts)
        return precision, total / np.where(precision > 0.0, precision, 1.0)


def deviation_square(data: dict[str, Numeric], centre: Numeric, sort: int = 0) -> Numeric:
    r"""Sum of squares of the places' means about a centre, by group.

    Parameters
    ----------
    data : dict of str to array
        From `Places.data`, without the prefix.
    centre : numeric, shape (..., n_group)
        What the means are held against.
    sort : int, default 0
        Of the readings.

    Returns
    -------
    numeric, shape (..., n_group)
        :math:`\sum_j (\bar y_j - c)^2`.
    """
    return data["square"][:, sort, sort] + data["count"] * (data["mean"][:, sort] - centre) ** 2


def normal_log_likelihood(data: dict[str, Numeric], mean: Numeric, variance: Numeric) -> Numeric:
    r"""Log-likelihood of readings of one sort, local values integrated out, by group.

    Parameters
    ----------
    data : dict of str to array
        From `Places.data`, without the prefix.
    mean, variance : numeric, shape (..., n_group)
        Of the population of local values.

    Returns
    -------
    numeric, shape (..., n_group)
        Log-density up to terms of the precisions alone.

    Notes
    -----
    A place of precision P and mean :math:`\bar y` has the density that `nested_log_likelihood`
    gives, :math:`-\tfrac12 [\ln(1 + P s^2) + P (\bar y - m)^2 / (1 + P s^2) + w]` with w its own
    sum of squares about :math:`\bar y`; it is summed over the places of the group.
    """
    precision = data["precision"][:, 0]
    inflation = 1.0 + precision * variance
    return -0.5 * (
        data["count"] * op.log(inflation)
        + precision / inflation * deviation_square(data, mean)
        + data["within"]
    )


def without_prefix(prefix: str, data: Any) -> dict[str, Numeric]:
    """Give the data of one kind by their short names."""
    return {
        name.removeprefix(f"{prefix}_"): array
        for name, array in data.items()
        if name.startswith(f"{prefix}_")
    }
