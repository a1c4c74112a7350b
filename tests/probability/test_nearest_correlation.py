"""Nearest correlation matrix, and what is refused as one."""

import numpy as np
import pytest
from scipy import optimize

from assess.probability.nearest_correlation import (
    NotPositiveDefiniteError,
    cholesky_factor,
    nearest_correlation,
)


@pytest.mark.published(
    source="N. J. Higham, IMA J. Numer. Anal. 22 (2002) 329-343",
    place="tridiagonal example of order 3; values from memory",
)
def test_nearest_matches_the_example_of_the_paper():
    matrix = np.array([[1.0, 1.0, 0.0], [1.0, 1.0, 1.0], [0.0, 1.0, 1.0]])
    # values from memory; the minimisation below does not need them
    expected = [[1.0, 0.7607, 0.1573], [0.7607, 1.0, 0.7607], [0.1573, 0.7607, 1.0]]
    np.testing.assert_allclose(nearest_correlation(matrix), expected, atol=6e-5)


@pytest.mark.parametrize("seed", [2, 3, 4])
def test_nearest_matches_a_direct_minimisation(seed):
    """Minimise the distance over Y Yᵀ with rows of unit length, from the answer and from afar."""
    rng = np.random.default_rng(seed)
    n = 4
    noise = rng.uniform(-1.0, 1.0, (n, n))
    matrix = 0.5 * (noise + noise.T) * 2.4
    np.fill_diagonal(matrix, 1.0)
    assert np.linalg.eigvalsh(matrix)[0] < 0.0

    def distance(flat):
        rows = flat.reshape(n, n)
        rows = rows / np.linalg.norm(rows, axis=1, keepdims=True)
        return np.sum((rows @ rows.T - matrix) ** 2)

    direct = min(
        optimize.minimize(distance, rng.standard_normal(n * n), options={"gtol": 1e-9}).fun
        for _ in range(5)
    )
    nearest = nearest_correlation(matrix)
    assert np.sum((nearest - matrix) ** 2) == pytest.approx(direct, rel=1e-4)
    np.testing.assert_array_equal(np.diag(nearest), 1.0)
    np.testing.assert_array_equal(nearest, nearest.T)
    assert np.linalg.eigvalsh(nearest)[0] > 5e-7
    np.linalg.cholesky(nearest)


def test_correlation_matrix_is_its_own_nearest():
    matrix = np.array([[1.0, 0.4, 0.1], [0.4, 1.0, -0.3], [0.1, -0.3, 1.0]])
    np.testing.assert_allclose(nearest_correlation(matrix), matrix, atol=1e-12)


def test_cholesky_factor_multiplies_back():
    matrix = np.array([[1.0, 0.4], [0.4, 1.0]])
    factor = cholesky_factor(["a", "b"], matrix)
    np.testing.assert_allclose(factor @ factor.T, matrix, atol=1e-15)
    assert factor[0, 1] == 0.0


def test_cholesky_factor_refuses_what_is_nearly_singular():
    matrix = np.array([[1.0, 1.0 - 1e-10], [1.0 - 1e-10, 1.0]])
    with pytest.raises(NotPositiveDefiniteError, match="eigenvalue given 1e-10, allowed 1e-08"):
        cholesky_factor(["a", "b"], matrix)
