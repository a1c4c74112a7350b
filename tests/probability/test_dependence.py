"""Correlation coefficients against published formulas and recomputed values."""

import itertools
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from assess.probability.dependence import (
    NotPositiveDefiniteError,
    PairDependence,
    kendall_to_score,
    score_correlation_matrix,
    score_to_kendall,
    score_to_spearman,
    spearman_to_score,
)
from assess.probability.marginals import make_marginal


def _normal():
    return make_marginal("normal", mean=10.0, sd=2.0)


def _lognormal(V):
    return make_marginal("lognormal", mean=5.0, V=V)


def _gumbel():
    return make_marginal("gumbel", mean=100.0, sd=20.0)


# --- rank correlations; table recomputed for this project from Kruskal's formulas
RANKS = [  # score r, Spearman and Kendall of r, score of Spearman r, score of Kendall r
    (0.1, 0.095533, 0.063769, 0.104672, 0.156434),
    (0.3, 0.287564, 0.193973, 0.312869, 0.453990),
    (0.5, 0.482584, 0.333333, 0.517638, 0.707107),
    (0.7, 0.682911, 0.493633, 0.716736, 0.891007),
    (0.8, 0.785939, 0.590334, 0.813473, 0.951057),
    (0.9, 0.891456, 0.712867, 0.907981, 0.987688),
    (-0.5, -0.482584, -0.333333, -0.517638, -0.707107),
]


@pytest.mark.parametrize(("r", "spearman", "kendall", "from_spearman", "from_kendall"), RANKS)
def test_rank_correlations(r, spearman, kendall, from_spearman, from_kendall):
    assert score_to_spearman(r) == pytest.approx(spearman, abs=5.1e-7)
    assert score_to_kendall(r) == pytest.approx(kendall, abs=5.1e-7)
    assert spearman_to_score(r) == pytest.approx(from_spearman, abs=5.1e-7)
    assert kendall_to_score(r) == pytest.approx(from_kendall, abs=5.1e-7)


@settings(deadline=None, derandomize=True)
@given(st.floats(-0.999, 0.999))
def test_rank_conversions_undo_each_other(r):
    assert score_to_spearman(spearman_to_score(r)) == pytest.approx(r, abs=1e-12)
    assert score_to_kendall(kendall_to_score(r)) == pytest.approx(r, abs=1e-12)


def test_rank_correlations_of_simulated_scores():
    rng = np.random.default_rng(20260901)
    draws = rng.multivariate_normal([0.0, 0.0], [[1.0, 0.6], [0.6, 1.0]], size=20_000)
    draws = np.exp(draws)  # ranks do not mind
    # Standard errors are about 0.005 and 0.004.
    assert stats.spearmanr(*draws.T).statistic == pytest.approx(score_to_spearman(0.6), abs=0.015)
    assert stats.kendalltau(*draws.T).statistic == pytest.approx(score_to_kendall(0.6), abs=0.012)


@pytest.mark.parametrize("value", [1.0, -1.0, 1.5, math.nan])
def test_coefficients_outside_their_range_are_refused(value):
    with pytest.raises(ValueError, match="Spearman correlation: given .*strictly between -1 and 1"):
        spearman_to_score(value)
    with pytest.raises(ValueError, match="Kendall correlation: given .*strictly between -1 and 1"):
        kendall_to_score(value)
    with pytest.raises(ValueError, match="pearson .of 'a' and 'b'. correlation: given"):
        PairDependence("a", "b", value, "pearson")


# --- the matrix
def test_matrix_mixes_kinds():
    marginals = {"strength": _lognormal(0.3), "load": _gumbel()}
    matrix = score_correlation_matrix(
        ["strength", "load", "cover"],
        [
            PairDependence("load", "strength", 0.5, "pearson"),
            PairDependence("strength", "cover", 0.3, "spearman"),
            PairDependence("cover", "load", -0.1, "kendall"),
        ],
        marginals,
    )
    expected = [[1, 0.513318, 0.312869], [0.513318, 1, -0.156434], [0.312869, -0.156434, 1]]
    np.testing.assert_allclose(matrix, expected, atol=5.1e-7)


def test_matrix_that_cannot_be_is_refused_with_the_nearest():
    pairs = [
        PairDependence("a", "b", 0.9),
        PairDependence("a", "strength", 0.9),
        PairDependence("b", "strength", -0.5),
    ]
    names = ["a", "b", "strength"]
    with pytest.raises(NotPositiveDefiniteError, match="not positive definite") as caught:
        score_correlation_matrix(names, pairs)
    nearest = caught.value.nearest
    assert np.linalg.eigvalsh(nearest)[0] > 0.0
    text = str(caught.value)
    assert all(name in text for name in names)
    assert f"{nearest[0, 1]:.3f}" in text
    assert f"{nearest[1, 2]:.3f}" in text
    # What is offered is accepted.
    offered = [
        PairDependence(first, second, score_to_spearman(nearest[i, j]))
        for (i, first), (j, second) in itertools.combinations(enumerate(names), 2)
    ]
    np.testing.assert_allclose(score_correlation_matrix(names, offered), nearest, atol=1e-12)


def test_matrix_refusals():
    names = ["cover", "strength"]
    with pytest.raises(ValueError, match="'cover' with itself"):
        PairDependence("cover", "cover", 0.5)
    with pytest.raises(ValueError, match="given kind 'linear', allowed spearman, kendall, pearson"):
        PairDependence("cover", "strength", 0.5, "linear")
    twice = [PairDependence("cover", "strength", 0.5), PairDependence("strength", "cover", 0.5)]
    with pytest.raises(ValueError, match="'strength' and 'cover': given twice, allowed once"):
        score_correlation_matrix(names, twice)
    with pytest.raises(ValueError, match="given variable 'covr', .*did you mean 'cover'"):
        score_correlation_matrix(names, [PairDependence("covr", "strength", 0.5)])
    with pytest.raises(ValueError, match="given cover, cover, allowed each name once"):
        score_correlation_matrix(["cover", "cover"], [])
    with pytest.raises(ValueError, match="no marginal given for 'strength'"):
        score_correlation_matrix(
            names, [PairDependence("cover", "strength", 0.5, "pearson")], {"cover": _normal()}
        )
