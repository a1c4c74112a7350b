"""Correlation matrices: whether they are positive definite, and the nearest one that is."""

from collections.abc import Sequence

import numpy as np

from assess.probability.marginal import FloatArray

SMALLEST_EIGENVALUE = 1e-8  # below it a Cholesky factor is noise
EIGENVALUE_FLOOR = 1e-6  # of the matrix that is offered instead


class NotPositiveDefiniteError(ValueError):
    """Correlations that cannot hold together; carries the nearest ones that can.

    Attributes
    ----------
    nearest : ndarray of shape (n, n)
        Nearest correlation matrix.
    """

    def __init__(self, names: Sequence[str], matrix: FloatArray) -> None:
        self.nearest = nearest_correlation(matrix)
        smallest = float(np.linalg.eigvalsh(matrix)[0])
        super().__init__(
            "correlation matrix of standard normal scores is not positive definite: smallest "
            f"eigenvalue given {smallest:.3g}, allowed {SMALLEST_EIGENVALUE:g} or more; the "
            f"nearest correlation matrix is\n{matrix_in_words(names, self.nearest)}"
        )


def matrix_in_words(names: Sequence[str], matrix: FloatArray) -> str:
    """Write a matrix with its names, rounded to three digits, one row a line."""
    width = max(7, *(len(name) for name in names))
    header = " ".join(f"{name:>{width}}" for name in ("", *names))
    rows = [
        " ".join([f"{name:>{width}}", *(f"{value:>{width}.3f}" for value in row)])
        for name, row in zip(names, matrix, strict=True)
    ]
    return "\n".join([header, *rows])


def cholesky_factor(names: Sequence[str], matrix: FloatArray) -> FloatArray:
    """Lower Cholesky factor of a correlation matrix.

    Parameters
    ----------
    names : sequence of str
        Names of its variables, for the error.
    matrix : ndarray of shape (n, n)
        Symmetric with unit diagonal. [-]

    Returns
    -------
    ndarray of shape (n, n)
        Lower triangular factor L, with L Lᵀ the matrix.

    Raises
    ------
    NotPositiveDefiniteError
        When the matrix is not positive definite, or nearly not.
    """
    if float(np.linalg.eigvalsh(matrix)[0]) < SMALLEST_EIGENVALUE:
        raise NotPositiveDefiniteError(names, matrix)
    return np.asarray(np.linalg.cholesky(matrix), dtype=np.float64)


def nearest_correlation(
    matrix: FloatArray, *, floor: float = EIGENVALUE_FLOOR, tolerance: float = 1e-12
) -> FloatArray:
    """Nearest correlation matrix in the Frobenius norm.

    Parameters
    ----------
    matrix : ndarray of shape (n, n)
        Symmetric. [-]
    floor : float, default 1e-6
        Smallest eigenvalue of the result.
    tolerance : float, default 1e-12
        Relative change at which the iteration ends.

    Returns
    -------
    ndarray of shape (n, n)
        Symmetric, unit diagonal, positive definite.

    Notes
    -----
    Alternating projections onto the matrices of unit diagonal and onto the positive
    semi-definite ones, the latter with Dykstra's correction: algorithm 3.3 of [1]_. Departure
    from the paper: eigenvalues are cut off at ``floor`` instead of zero, so that a Cholesky
    factor exists, and the diagonal is scaled to exactly one at the end.

    References
    ----------
    .. [1] N. J. Higham, Computing the nearest correlation matrix: a problem from finance,
       IMA J. Numer. Anal. 22 (2002) 329-343, doi:10.1093/imanum/22.3.329.
    """
    current = 0.5 * (matrix + matrix.T)
    correction = np.zeros_like(current)
    for _ in range(10_000):
        shifted = current - correction
        definite = _raise_eigenvalues(shifted, floor)
        correction = definite - shifted
        previous, current = current, definite.copy()
        np.fill_diagonal(current, 1.0)
        change = max(np.abs(current - previous).max(), np.abs(current - definite).max())
        if change < tolerance:
            break
    definite = _raise_eigenvalues(current, floor)
    scale = 1.0 / np.sqrt(np.diag(definite))
    nearest = np.asarray(definite * np.outer(scale, scale), dtype=np.float64)
    np.fill_diagonal(nearest, 1.0)
    return nearest


def _raise_eigenvalues(matrix: FloatArray, floor: float) -> FloatArray:
    values, vectors = np.linalg.eigh(matrix)
    raised = (vectors * np.maximum(values, floor)) @ vectors.T
    return np.asarray(0.5 * (raised + raised.T), dtype=np.float64)
