"""Gaussian copula and normal scores of draws."""

import math

import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp
from scipy import stats

from assess.probability.dependence import score_to_pearson, score_to_spearman
from assess.probability.marginals import make_marginal
from assess.probability.nearest_correlation import NotPositiveDefiniteError
from assess.probability.normal_space import GaussianCopula, nataf_from_draws, normal_scores

CORRELATION = np.array([[1.0, 0.5, -0.3], [0.5, 1.0, 0.2], [-0.3, 0.2, 1.0]])
MARGINALS = (
    make_marginal("lognormal", mean=35.0, V=0.3),
    make_marginal("gumbel", mean=100.0, sd=20.0),
    make_marginal("gamma", mean=2.0, V=0.8),
)


def _copula():
    return GaussianCopula(MARGINALS, CORRELATION)


@settings(deadline=None, derandomize=True, max_examples=60)
@given(u=hnp.arrays(float, (2, 3), elements=st.floats(-4.5, 4.5)))
def test_copula_round_trip(u):
    copula = _copula()
    np.testing.assert_allclose(copula.to_independent(copula.from_independent(u)), u, atol=1e-8)


def test_two_variables_against_the_bivariate_normal_distribution():
    copula = GaussianCopula(MARGINALS[:2], CORRELATION[:2, :2])
    # P(X1 <= a, X2 <= b) is the bivariate normal probability of the scores.
    limits = np.array([30.0, 115.0])
    z = [float(m.score(x)) for m, x in zip(MARGINALS, limits, strict=False)]
    exact = stats.multivariate_normal([0, 0], CORRELATION[:2, :2]).cdf(z)
    rng = np.random.default_rng(20260901)
    x = copula.from_independent(rng.standard_normal((200_000, 2)))
    share = np.mean(np.all(x <= limits, axis=1))
    assert share == pytest.approx(exact, abs=4.0 * math.sqrt(exact * (1.0 - exact) / 200_000))


def test_draws_have_the_marginals_and_both_correlations():
    rng = np.random.default_rng(7)
    x = _copula().from_independent(rng.standard_normal((4, 20_000, 3)))
    assert x.shape == (4, 20_000, 3)
    flat = x.reshape(-1, 3)
    assert flat.mean(axis=0) == pytest.approx([35.0, 100.0, 2.0], rel=0.01)
    assert flat.std(axis=0) == pytest.approx([10.5, 20.0, 1.6], rel=0.02)
    pearson = np.corrcoef(flat, rowvar=False)[0, 1]
    assert pearson == pytest.approx(score_to_pearson(0.5, *MARGINALS[:2]), abs=0.015)
    spearman = stats.spearmanr(flat).statistic[0, 1]
    assert spearman == pytest.approx(score_to_spearman(0.5), abs=0.012)


def test_graph_gives_the_values_of_numbers_and_the_right_gradient():
    copula = _copula()
    u = pt.dmatrix("u")
    x = copula.from_independent(u)
    run = pytensor.function([u], [x, pytensor.grad(x.sum(), u)])
    at = np.array([[0.3, -1.0, 2.0], [-2.0, 0.5, 0.0]])
    values, gradient = run(at)
    np.testing.assert_allclose(values, copula.from_independent(at), rtol=1e-12)
    step = 1e-5
    for column in range(3):
        shift = np.zeros(3)
        shift[column] = step
        rise = copula.from_independent(at + shift) - copula.from_independent(at - shift)
        np.testing.assert_allclose(gradient[:, column], rise.sum(axis=1) / (2 * step), rtol=1e-6)


def test_copula_refusals():
    with pytest.raises(ValueError, match=r"of 3 variables: given shape .2, 2., allowed .3, 3."):
        GaussianCopula(MARGINALS, np.eye(2))
    with pytest.raises(ValueError, match="a diagonal off one by 1, allowed"):
        GaussianCopula(MARGINALS, 2.0 * np.eye(3))
    with pytest.raises(ValueError, match="given asymmetry 0.5"):
        GaussianCopula(MARGINALS[:2], np.array([[1.0, 0.5], [0.0, 1.0]]))
    with pytest.raises(NotPositiveDefiniteError, match="variable 1"):
        GaussianCopula(MARGINALS[:2], np.ones((2, 2)))


def test_copula_keeps_its_own_matrix():
    matrix = np.eye(3)
    copula = GaussianCopula(MARGINALS, matrix)
    matrix[0, 1] = 0.9
    assert copula.correlation[0, 1] == 0.0
    with pytest.raises(ValueError, match="read-only"):
        copula.correlation[0, 1] = 0.5


def test_normal_scores_are_blom_s():
    draws = np.array([[3.0, 1.0], [1.0, 1.0], [2.0, 5.0]])
    # Ranks 3, 1, 2 and, with a tie, 1.5, 1.5, 3; n = 3.
    positions = (np.array([[3.0, 1.5], [1.0, 1.5], [2.0, 3.0]]) - 0.375) / 3.25
    np.testing.assert_allclose(normal_scores(draws), stats.norm.ppf(positions), rtol=1e-13)


@settings(deadline=None, derandomize=True, max_examples=30)
@given(hnp.arrays(float, (20, 2), elements=st.floats(-3, 3).map(lambda v: round(v, 3))))
def test_normal_scores_do_not_mind_a_rising_transformation(draws):
    np.testing.assert_allclose(normal_scores(np.exp(draws)), normal_scores(draws))


def test_nataf_from_draws_finds_the_copula():
    rng = np.random.default_rng(11)
    draws = _copula().from_independent(rng.standard_normal((40_000, 3)))
    found = nataf_from_draws(draws)
    # The standard error of a coefficient is (1 - rho²)/200 at most 0.005.
    np.testing.assert_allclose(found.correlation, CORRELATION, atol=0.02)
    np.testing.assert_allclose(found.cholesky @ found.cholesky.T, found.correlation, atol=1e-12)
    assert np.all(np.triu(found.cholesky, 1) == 0.0)


def test_nataf_from_draws_refusals():
    rng = np.random.default_rng(3)
    one = rng.standard_normal(50)
    with pytest.raises(ValueError, match="given no variation of cover, allowed some"):
        nataf_from_draws(np.column_stack([one, np.ones(50)]), ["strength", "cover"])
    with pytest.raises(NotPositiveDefiniteError, match="strength"):
        nataf_from_draws(np.column_stack([one, 2.0 * one]), ["strength", "cover"])
    with pytest.raises(ValueError, match="given 1 that are not finite"):
        nataf_from_draws(np.column_stack([one, np.r_[np.nan, one[1:]]]))
    with pytest.raises(ValueError, match="given shape .50,., allowed"):
        nataf_from_draws(one)
