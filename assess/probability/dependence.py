"""Dependence between two variables: rank, Pearson and score coefficients, and their matrix.

Variables depend on each other through correlated standard normal scores (a Gaussian copula). The
*score* correlation is the coefficient of those scores.
"""

import difflib
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal, get_args

import numpy as np

from assess.probability.marginal import FloatArray, Marginal
from assess.probability.nearest_correlation import (
    NotPositiveDefiniteError,
    cholesky_factor,
    nearest_correlation,
)
from assess.probability.pearson import attainable_pearson, pearson_to_score, score_to_pearson

__all__ = [
    "NotPositiveDefiniteError",
    "PairDependence",
    "attainable_pearson",
    "kendall_to_score",
    "nearest_correlation",
    "pearson_to_score",
    "score_correlation_matrix",
    "score_to_kendall",
    "score_to_pearson",
    "score_to_spearman",
    "spearman_to_score",
]

Kind = Literal["spearman", "kendall", "pearson"]


def spearman_to_score(spearman: float) -> float:
    r"""Score correlation that gives a Spearman rank correlation, :math:`2\sin(\pi\rho_S/6)`.

    Parameters
    ----------
    spearman : float
        Rank correlation, strictly between -1 and 1. [-]

    Returns
    -------
    float
        Correlation of the standard normal scores. [-]

    Raises
    ------
    ValueError
        When it is not strictly between -1 and 1.

    References
    ----------
    .. [1] W. H. Kruskal, Ordinal measures of association, J. Am. Stat. Assoc. 53 (1958) 814-861,
       doi:10.1080/01621459.1958.10501481.

    Examples
    --------
    >>> round(spearman_to_score(0.5), 6)
    0.517638
    """
    return 2.0 * math.sin(math.pi * _coefficient(spearman, "Spearman") / 6.0)


def score_to_spearman(score: float) -> float:
    """Inverse of `spearman_to_score`."""
    return 6.0 / math.pi * math.asin(0.5 * _coefficient(score, "score"))


def kendall_to_score(kendall: float) -> float:
    r"""Score correlation that gives a Kendall rank correlation, :math:`\sin(\pi\tau/2)`.

    Parameters
    ----------
    kendall : float
        Rank correlation tau, strictly between -1 and 1. [-]

    Returns
    -------
    float
        Correlation of the standard normal scores. [-]

    Raises
    ------
    ValueError
        When it is not strictly between -1 and 1.

    References
    ----------
    .. [1] W. H. Kruskal, Ordinal measures of association, J. Am. Stat. Assoc. 53 (1958) 814-861,
       doi:10.1080/01621459.1958.10501481.
    """
    return math.sin(0.5 * math.pi * _coefficient(kendall, "Kendall"))


def score_to_kendall(score: float) -> float:
    """Inverse of `kendall_to_score`."""
    return 2.0 / math.pi * math.asin(_coefficient(score, "score"))


def _coefficient(value: float, kind: str) -> float:
    if not -1.0 < value < 1.0:
        raise ValueError(f"{kind} correlation: given {value:g}, allowed strictly between -1 and 1")
    return float(value)


@dataclass(frozen=True, slots=True)
class PairDependence:
    """Dependence stated between two named variables.

    Parameters
    ----------
    first, second : str
        Names of the variables.
    coefficient : float
        Strictly between -1 and 1. [-]
    kind : {"spearman", "kendall", "pearson"}
        Which coefficient it is.

    Raises
    ------
    ValueError
        When a variable is paired with itself, or a value is not allowed.
    """

    first: str
    second: str
    coefficient: float
    kind: Kind = "spearman"

    def __post_init__(self) -> None:
        if self.first == self.second:
            raise ValueError(f"dependence: given {self.first!r} with itself, allowed two variables")
        if self.kind not in get_args(Kind):
            raise ValueError(
                f"dependence of {self.first!r} and {self.second!r}: given kind {self.kind!r}, "
                f"allowed {', '.join(get_args(Kind))}"
            )
        _coefficient(self.coefficient, f"{self.kind} (of {self.first!r} and {self.second!r})")

    def score(self, marginals: Mapping[str, Marginal]) -> float:
        """Correlation of the standard normal scores; marginals matter for ``pearson`` only."""
        if self.kind == "spearman":
            return spearman_to_score(self.coefficient)
        if self.kind == "kendall":
            return kendall_to_score(self.coefficient)
        missing = [name for name in (self.first, self.second) if name not in marginals]
        if missing:
            raise ValueError(
                f"Pearson correlation of {self.first!r} and {self.second!r}: no marginal given "
                f"for {', '.join(map(repr, missing))}; allowed without: spearman, kendall"
            )
        return pearson_to_score(self.coefficient, marginals[self.first], marginals[self.second])


def score_correlation_matrix(
    names: Sequence[str],
    pairs: Sequence[PairDependence],
    marginals: Mapping[str, Marginal] | None = None,
) -> FloatArray:
    """Correlation matrix of the standard normal scores of named variables.

    Parameters
    ----------
    names : sequence of str
        All variables, in the order of rows and columns.
    pairs : sequence of PairDependence
        Stated dependences; what is not stated is independent.
    marginals : mapping of str to Marginal, optional
        Marginals by name; needed for Pearson coefficients only.

    Returns
    -------
    ndarray of shape (n, n)
        Positive definite. [-]

    Raises
    ------
    ValueError
        When a name is unknown or repeated, a pair is stated twice, or a coefficient is not
        attainable.
    NotPositiveDefiniteError
        When the coefficients cannot hold together; it carries the nearest matrix.
    """
    position = {name: index for index, name in enumerate(names)}
    if len(position) != len(names):
        raise ValueError(f"variables: given {', '.join(names)}, allowed each name once")
    matrix = np.eye(len(names))
    stated: set[frozenset[str]] = set()
    for pair in pairs:
        for name in (pair.first, pair.second):
            _require_known(name, names)
        both = frozenset((pair.first, pair.second))
        if both in stated:
            raise ValueError(
                f"dependence of {pair.first!r} and {pair.second!r}: given twice, allowed once"
            )
        stated.add(both)
        i, j = position[pair.first], position[pair.second]
        matrix[i, j] = matrix[j, i] = pair.score(marginals or {})
    cholesky_factor(names, matrix)  # refuses what is not positive definite
    return matrix


def _require_known(name: str, names: Sequence[str]) -> None:
    if name in names:
        return
    near = difflib.get_close_matches(name, names, n=1)
    hint = f" (did you mean {near[0]!r}?)" if near else ""
    raise ValueError(f"dependence: given variable {name!r}, allowed {', '.join(names)}{hint}")
