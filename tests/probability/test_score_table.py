"""Tables of the score map: accuracy over shapes, and shapes of arrays in graphs."""

import math

import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest
from scipy import special

from assess.probability.marginals import make_marginal
from assess.probability.score_table import ScoreTable, table_scores
from assess.probability.tabulated import Beta, Gamma, ScaledInverseChi

BETWEEN_KNOTS = np.linspace(-8.49, 8.49, 2003)  # falls on all fractions of a knot interval


@pytest.mark.parametrize("shape", [0.05, 0.1, 0.5, 1.0, 5.0, 100.0, 1e4, 1e6])
def test_gamma_table_keeps_eight_digits(shape):
    z = BETWEEN_KNOTS
    exact = np.where(
        z < 0,
        special.gammaincinv(shape, special.ndtr(z)),
        special.gammainccinv(shape, special.ndtr(-z)),
    )
    held = exact > 1e-280
    np.testing.assert_allclose(Gamma(shape, 1.0).from_score(z)[held], exact[held], rtol=1e-8)


@pytest.mark.parametrize(("q", "r"), [(0.05, 0.05), (0.05, 3), (0.5, 0.5), (5.3, 18.6), (2e3, 3e3)])
def test_beta_table_keeps_eight_digits_of_the_distance_to_either_bound(q, r):
    z = BETWEEN_KNOTS[BETWEEN_KNOTS < 0]
    for first, second in ((q, r), (r, q)):
        exact = special.betaincinv(first, second, special.ndtr(z))
        held = exact > 1e-280
        from_lower = Beta(first, second, 0.0, 1.0).from_score(z)
        np.testing.assert_allclose(from_lower[held], exact[held], rtol=1e-8)
        from_upper = -Beta(second, first, -1.0, 0.0).from_score(-z)
        np.testing.assert_allclose(from_upper[held], exact[held], rtol=1e-8)


@pytest.mark.parametrize("degrees", [0.5, 3.0, 10.0, 1000.0])
def test_scaled_inverse_chi_table_keeps_eight_digits(degrees):
    z = BETWEEN_KNOTS
    half = 0.5 * degrees
    chi_square = 2.0 * np.where(
        z > 0,
        special.gammaincinv(half, special.ndtr(-z)),
        special.gammainccinv(half, special.ndtr(z)),
    )
    exact = 0.09 * np.sqrt(degrees / chi_square)
    np.testing.assert_allclose(ScaledInverseChi(0.09, degrees).from_score(z), exact, rtol=1e-8)


def test_quantiles_too_small_for_a_number_keep_a_smooth_table():
    # At score -8 this gamma quantile is about 10^-303: its logarithm continues as a power law.
    table = Gamma(0.05, 1.0)._table
    z = table_scores()
    slopes = np.diff(table(z)) * 128.0
    assert np.all(np.isfinite(slopes))
    assert np.abs(np.diff(slopes)).max() < 1.0


def test_table_reproduces_a_cubic_exactly_and_is_linear_outside():
    z = table_scores()
    table = ScoreTable(z**3, 3.0 * z**2)
    inner = np.linspace(-8.5, 8.5, 997)
    np.testing.assert_allclose(table(inner), inner**3, rtol=1e-10, atol=1e-10)
    assert table(10.0) == pytest.approx(8.5**3 + 1.5 * 3.0 * 8.5**2)
    assert table(-10.0) == pytest.approx(-(8.5**3) - 1.5 * 3.0 * 8.5**2)


def test_graph_takes_scalars_and_matrices_and_goes_beyond_the_table():
    marginal = make_marginal("gamma", mean=3.0, V=0.6)
    scalar, matrix = pt.dscalar("scalar"), pt.dmatrix("matrix")
    one, many = marginal.from_score(scalar), marginal.from_score(matrix)
    run = pytensor.function(
        [scalar, matrix],
        [one, many, pytensor.grad(one, scalar), pytensor.grad(many.sum(), matrix)],
    )
    z = np.array([[-9.5, -8.5, -1.0], [0.3, 8.5, 9.5]])
    value, values, slope, slopes = run(0.3, z)
    assert value == pytest.approx(float(marginal.from_score(0.3)), rel=1e-13)
    np.testing.assert_allclose(values, marginal.from_score(z), rtol=1e-13)
    step = 1e-5
    numbers = (marginal.from_score(z + step) - marginal.from_score(z - step)) / (2.0 * step)
    np.testing.assert_allclose(slopes, numbers, rtol=1e-6)
    assert slope == pytest.approx(slopes[1, 0], rel=1e-13)


def test_scaled_inverse_chi_moments_that_do_not_exist_are_infinite():
    assert math.isinf(ScaledInverseChi(1.0, 1.0).mean)
    assert math.isinf(ScaledInverseChi(1.0, 2.0).sd)
    assert math.isfinite(ScaledInverseChi(1.0, 2.0).mean)
