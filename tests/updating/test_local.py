"""Maps from standard normals to local values against SciPy's distributions."""

import numpy as np
import pytest
from scipy import stats

from assess.updating.local import (
    SCORES,
    Local,
    TabulatedLocal,
    look_up,
    quantile_table,
    scores_of_density,
    take,
    truncated_score,
)

ALL = np.arange


def test_a_normal_local_is_mean_plus_sd_times_score():
    local = Local("cover", np.array([1.0, 2.0]), np.array([0.5, 0.0]))
    z = np.array([[[2.0], [-1.0]], [[2.0], [-1.0]]])
    np.testing.assert_allclose(local.values(z, ALL(2))["cover"], [[2.0, 0.5], [2.0, 2.0]])
    assert local.names == local.normals == ("cover",)


def test_a_logarithmic_local_is_lognormal():
    local = Local("current", np.log([2.0]), np.array([0.3]), logarithm=True)
    z = np.linspace(-4.0, 4.0, 9)[None, :, None]
    known = stats.lognorm(0.3, scale=2.0).ppf(stats.norm.cdf(z[..., 0]))
    np.testing.assert_allclose(local.values(z, ALL(1))["current"], known, rtol=1e-9)


def test_chosen_draws_take_their_own_rows():
    local = Local("cover", np.arange(4.0), np.ones(4))
    z = np.zeros((2, 3, 1))
    assert local.values(z, np.array([3, 1]))["cover"][:, 0].tolist() == [3.0, 1.0]
    table = TabulatedLocal("cover", np.arange(4.0)[:, None] + np.zeros(len(SCORES)))
    assert table.values(z, np.array([3, 1]))["cover"][:, 0].tolist() == [3.0, 1.0]


def test_reordering_moves_every_array_of_a_record():
    turned = take(Local("x", np.arange(3.0), np.arange(3.0) + 10.0, True), np.array([2, 0, 1]))
    assert turned.mean.tolist() == [2.0, 0.0, 1.0]
    assert turned.sd.tolist() == [12.0, 10.0, 11.0]
    assert turned.logarithm


def test_without_dependence_a_local_keeps_its_draws_in_another_order():
    local = Local("x", np.arange(50.0), np.ones(50))
    dropped = local.without_dependence(np.random.default_rng(1))
    assert sorted(dropped.mean) == local.mean.tolist()
    assert not np.array_equal(dropped.mean, local.mean)


# Bounds on both sides, far out in either tail, and one-sided.
@pytest.mark.parametrize(
    ("low", "high"),
    [(-1.0, 0.5), (3.0, 4.0), (-np.inf, -2.0), (8.0, np.inf), (-30.0, -9.0), (-np.inf, np.inf)],
)
def test_truncated_scores_are_quantiles_of_the_truncated_normal(low, high):
    z = np.linspace(-4.0, 4.0, 17)
    known = stats.truncnorm(low, high)
    found = truncated_score(z, np.float64(low), np.float64(high))
    np.testing.assert_allclose(known.cdf(found), stats.norm.cdf(z), rtol=1e-6, atol=1e-12)
    assert np.all((found >= low) & (found <= high))


def test_a_tabulated_density_gives_the_quantiles_of_its_distribution():
    # Gamma distribution, shape 3, by SciPy: skewed, with a lower end.
    known = stats.gamma(3.0)
    grid = np.geomspace(1e-6, 80.0, 6001)
    scores, beyond = scores_of_density(grid, known.logpdf(grid)[None, :])
    table = quantile_table(grid, scores)
    inside = np.abs(SCORES) < 6.0
    expected = np.where(
        SCORES < 0, known.ppf(stats.norm.cdf(SCORES)), known.isf(stats.norm.sf(SCORES))
    )
    np.testing.assert_allclose(table[0, inside], expected[inside], rtol=2e-3, atol=2e-3)
    assert beyond[0] == 0.0
    # Between the nodes of the table.
    z = np.linspace(-3.0, 3.0, 61)[None, :]
    np.testing.assert_allclose(
        look_up(table, z, ALL(1))[0], known.ppf(stats.norm.cdf(z[0])), rtol=2e-3
    )


def test_mass_beyond_the_grid_shifts_the_scores():
    # A standard exponential, tabulated up to 1, with the rest beyond: its score at 1 is known.
    grid = np.linspace(0.0, 1.0, 2001)
    scores, beyond = scores_of_density(grid, -grid[None, :], np.array([-1.0]))
    assert beyond[0] == pytest.approx(np.exp(-1.0), rel=1e-6)
    assert scores[0, -1] == pytest.approx(stats.norm.isf(np.exp(-1.0)), rel=1e-6)
    assert scores[0, 0] == -np.inf


def test_scores_beyond_the_table_hold_its_ends():
    table = SCORES[None, :]
    found = look_up(table, np.array([[-50.0, 50.0, SCORES[-1]]]), ALL(1))
    assert found.tolist() == [[SCORES[0], SCORES[-1], SCORES[-1]]]
