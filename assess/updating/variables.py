"""Common variables and their joint prior: independent standard normals to physical values.

The sampler works on ``whitened`` independent standard normals; correlated scores follow through
the Cholesky factor of the score correlation (Gaussian copula) and each variable maps its score
to its physical value. The same map serves the PyMC graph and the draws.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from assess import operations as op
from assess.probability.marginals import Marginal

Numeric = Any  # float, ndarray or PyTensor variable
FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Variable:
    """One common variable: a name, words for people, and the map from its score."""

    name: str  # "<zone>.cover_mean"
    label: str
    symbol: str
    unit: str  # "-" if none
    zone: str  # "" for the structure as a whole
    source: str
    marginal: Marginal
    latent: bool = False  # local to one place and only a step of the calculation

    def value(self, score: Numeric, _known: Mapping[str, Numeric]) -> Numeric:
        """Map a standard normal score to the physical value."""
        return self.marginal.from_score(score)


@dataclass(frozen=True, slots=True)
class LevelGivenScatter:
    """Median of a lognormal population whose log-mean has sd ``scatter / sqrt(tests)``.

    This is the level of a normal-gamma prior [1]_. A dependence named for it is that of its
    score, that is of the level given the scatter.

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.0, annex A.
    """

    name: str
    label: str
    symbol: str
    unit: str
    zone: str
    source: str
    log_mean: float
    tests: float  # number of equivalent tests behind the level
    scatter: str  # name of the variable that holds the log standard deviation

    def value(self, score: Numeric, known: Mapping[str, Numeric]) -> Numeric:
        """Map a standard normal score to the physical value, given the scatter."""
        return op.exp(self.log_mean + known[self.scatter] * score / np.sqrt(self.tests))


@dataclass(frozen=True, slots=True)
class Pooled:
    r"""Variable of one zone that shares a part of its score with those of other zones.

    The score is :math:`\sqrt{1 - w}\, u + \sqrt{w}\, v` with u the score that the zones share,
    v the zone's own and w its share of the variance: standard normal for every w, so that the
    variable keeps its prior, while the zones' values tell w [1]_.

    References
    ----------
    .. [1] A. Gelman et al., Bayesian Data Analysis, 3rd ed., 2013, chapter 5 (exchangeable groups).
    """

    inner: "Variable | LevelGivenScatter"
    shared: str  # name of the variable that is the shared score
    share: str  # name of the variable that is w

    @property
    def name(self) -> str:
        """Name of the variable."""
        return self.inner.name

    @property
    def label(self) -> str:
        """Name in words."""
        return self.inner.label

    @property
    def symbol(self) -> str:
        """Symbol for axes."""
        return self.inner.symbol

    @property
    def unit(self) -> str:
        """Unit, "-" if none."""
        return self.inner.unit

    @property
    def zone(self) -> str:
        """Zone that it belongs to."""
        return self.inner.zone

    @property
    def source(self) -> str:
        """Where its prior comes from."""
        return f"{self.inner.source}; pooled with other zones"

    def value(self, score: Numeric, known: Mapping[str, Numeric]) -> Numeric:
        """Map the zone's own score to the physical value, given the shared one."""
        own = known[self.share]
        mixed = op.sqrt(1.0 - own) * known[self.shared] + op.sqrt(own) * score
        return self.inner.value(mixed, known)


AnyVariable = Variable | LevelGivenScatter | Pooled


@dataclass(frozen=True)
class JointPrior:
    """All common variables of a case with their dependence, in the order of the scores."""

    variables: tuple[AnyVariable, ...]
    correlation: FloatArray  # of the scores, (n_variable, n_variable)

    @property
    def names(self) -> tuple[str, ...]:
        """Names in the order of the scores."""
        return tuple(variable.name for variable in self.variables)

    @cached_property
    def cholesky(self) -> FloatArray:
        """Lower factor of the score correlation."""
        return np.linalg.cholesky(self.correlation)

    @property
    def independent(self) -> bool:
        """Whether no dependence was stated."""
        return bool(np.array_equal(self.correlation, np.eye(len(self.variables))))

    def values(self, scores: Sequence[Numeric]) -> dict[str, Numeric]:
        """Map correlated scores, one per variable in order, to physical values by name."""
        known: dict[str, Numeric] = {}
        for variable, score in zip(self.variables, scores, strict=True):
            known[variable.name] = variable.value(score, known)
        return known

    def physical(self, whitened: FloatArray) -> FloatArray:
        """Map independent standard normals (..., n_variable) to physical values, same shape."""
        correlated = whitened @ self.cholesky.T
        values = self.values([correlated[..., i] for i in range(len(self.variables))])
        return np.stack(
            [np.broadcast_to(values[name], whitened.shape[:-1]) for name in self.names], axis=-1
        )
