"""Between physical variables and independent standard normal ones."""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import NamedTuple

import numpy as np
from scipy import linalg, special, stats

from assess.operations import Numeric, stack_last
from assess.probability.marginal import FloatArray, Marginal
from assess.probability.nearest_correlation import cholesky_factor

SYMMETRY_TOLERANCE = 1e-10


@dataclass(frozen=True, eq=False)
class GaussianCopula:
    """Joint distribution: marginals, and the correlation of their standard normal scores.

    Parameters
    ----------
    marginals : tuple of Marginal
        One for each of n variables.
    correlation : ndarray of shape (n, n)
        Correlation of the scores (not of the variables). [-]

    Raises
    ------
    ValueError
        When the matrix does not fit the marginals or is not a correlation matrix.
    NotPositiveDefiniteError
        When the matrix is not positive definite; it carries the nearest that is.

    References
    ----------
    .. [1] P.-L. Liu, A. Der Kiureghian, Structural reliability under incomplete probability
       information, J. Eng. Mech. 112 (1986) 85-104, doi:10.1061/(ASCE)0733-9399(1986)112:1(85).

    Examples
    --------
    >>> from assess.probability.marginals import make_marginal
    >>> strength = make_marginal("lognormal", mean=35.0, V=0.15)
    >>> cover = make_marginal("normal", mean=40.0, sd=8.0)
    >>> copula = GaussianCopula((strength, cover), np.array([[1.0, 0.4], [0.4, 1.0]]))
    >>> copula.from_independent(np.zeros(2)).round(3).tolist()
    [34.613, 40.0]
    """

    marginals: tuple[Marginal, ...]
    correlation: FloatArray

    def __post_init__(self) -> None:
        matrix = np.array(self.correlation, dtype=np.float64)
        n = len(self.marginals)
        if matrix.shape != (n, n):
            raise ValueError(
                f"correlation matrix of {n} variables: given shape {matrix.shape}, allowed {(n, n)}"
            )
        asymmetry = float(np.abs(matrix - matrix.T).max(initial=0.0))
        off_one = float(np.abs(np.diag(matrix) - 1.0).max(initial=0.0))
        if not max(asymmetry, off_one) < SYMMETRY_TOLERANCE:
            raise ValueError(
                f"correlation matrix: given asymmetry {asymmetry:.3g} and a diagonal off one by "
                f"{off_one:.3g}, allowed {SYMMETRY_TOLERANCE:g}"
            )
        matrix.setflags(write=False)
        object.__setattr__(self, "correlation", matrix)
        _ = self.cholesky  # refuses what is not positive definite at once

    @cached_property
    def cholesky(self) -> FloatArray:
        """Lower Cholesky factor of the correlation matrix, shape (n, n)."""
        names = [f"variable {i + 1}" for i in range(len(self.marginals))]
        return cholesky_factor(names, self.correlation)

    def from_independent(self, u: Numeric) -> Numeric:
        """Map independent standard normal values to the variables.

        Parameters
        ----------
        u : ndarray or PyTensor variable of shape (..., n)
            Independent standard normal values. [-]

        Returns
        -------
        ndarray or PyTensor variable of shape (..., n)
            Variables, each in its unit.
        """
        z = u @ self.cholesky.T
        return stack_last([m.from_score(z[..., i]) for i, m in enumerate(self.marginals)])

    def to_independent(self, x: FloatArray) -> FloatArray:
        """Map variables to independent standard normal values.

        Parameters
        ----------
        x : ndarray of shape (..., n)
            Variables, each in its unit.

        Returns
        -------
        ndarray of shape (..., n)
            Independent standard normal values. [-]
        """
        values = np.asarray(x, dtype=np.float64)
        z = stack_last([m.score(values[..., i]) for i, m in enumerate(self.marginals)])
        flat = z.reshape(-1, len(self.marginals))
        u = linalg.solve_triangular(self.cholesky, flat.T, lower=True, check_finite=False).T
        return np.asarray(u.reshape(z.shape), dtype=np.float64)


def normal_scores(draws: FloatArray) -> FloatArray:
    r"""Give the standard normal scores of draws by their ranks.

    Parameters
    ----------
    draws : ndarray of shape (n_draw, n_variable)
        Draws, each variable in its unit; equal draws share their mean rank.

    Returns
    -------
    ndarray of shape (n_draw, n_variable)
        Scores :math:`\Phi^{-1}((r - 3/8) / (n + 1/4))` of the ranks r. [-]

    Raises
    ------
    ValueError
        When there are fewer than two draws, or one is not finite.

    References
    ----------
    .. [1] G. Blom, Statistical Estimates and Transformed Beta-Variables, Wiley 1958.
    """
    values = np.asarray(draws, dtype=np.float64)
    if values.ndim != 2 or values.shape[0] < 2:
        raise ValueError(
            f"draws: given shape {values.shape}, allowed (n_draw, n_variable) with two or more"
        )
    if not np.all(np.isfinite(values)):
        n_bad = int(np.count_nonzero(~np.isfinite(values)))
        raise ValueError(f"draws: given {n_bad} that are not finite, allowed finite numbers")
    ranks = np.asarray(stats.rankdata(values, axis=0), dtype=np.float64)
    return np.asarray(special.ndtri((ranks - 0.375) / (len(values) + 0.25)), dtype=np.float64)


class ScoreDependence(NamedTuple):
    """Dependence of draws in the space of their normal scores; both of shape (n, n)."""

    correlation: FloatArray
    cholesky: FloatArray


def nataf_from_draws(draws: FloatArray, names: Sequence[str] | None = None) -> ScoreDependence:
    """Correlation of the normal scores of joint draws, and its Cholesky factor.

    Parameters
    ----------
    draws : ndarray of shape (n_draw, n_variable)
        Joint draws, each variable in its unit.
    names : sequence of str, optional
        Names of the variables, for errors.

    Returns
    -------
    ScoreDependence
        ``correlation`` and lower ``cholesky`` factor. [-]

    Raises
    ------
    ValueError
        When a variable does not vary, or the draws are unusable.
    NotPositiveDefiniteError
        When variables determine each other (or there are too few draws).

    Notes
    -----
    The Nataf model of the draws [1]_: exact where they come from a Gaussian copula, whatever
    their marginals; else it keeps the rank correlations and loses what goes beyond them.

    References
    ----------
    .. [1] P.-L. Liu, A. Der Kiureghian, Structural reliability under incomplete probability
       information, J. Eng. Mech. 112 (1986) 85-104, doi:10.1061/(ASCE)0733-9399(1986)112:1(85).
    """
    scores = normal_scores(draws)
    n = scores.shape[1]
    labels = list(names) if names is not None else [f"variable {i + 1}" for i in range(n)]
    constant = [
        label for label, column in zip(labels, scores.T, strict=True) if np.ptp(column) == 0
    ]
    if constant:
        raise ValueError(f"draws: given no variation of {', '.join(constant)}, allowed some")
    correlation = np.atleast_2d(np.corrcoef(scores, rowvar=False))
    return ScoreDependence(correlation, cholesky_factor(labels, correlation))
