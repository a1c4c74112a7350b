"""Mode search, allocation and sampling: where the points go and what they weigh."""

import numpy as np
import pytest
from scipy import integrate as quadrature
from scipy import stats

from assess.reliability.importance import (
    Problem,
    Proposal,
    allocate,
    draw_sample,
    find_modes,
    log_failure,
    normal_points,
)
from assess.reliability.index import index_from_probability
from assess.reliability.lifetime import first_proposal, integrate


def linear(weights, mean, scale=1e-3, draws=8) -> Problem:
    """Margin ``mean + weights z`` against a load of a tiny scale."""
    weights = np.asarray(weights, dtype=float)

    def log_hazard(z, _chosen, which):
        return np.repeat((-(mean + z @ weights) / scale)[..., None], len(which), axis=-1)

    return Problem(log_hazard, len(weights), draws, 1)


def test_the_mode_of_a_linear_margin_is_its_design_point():
    weights = np.array([1.0, -2.0, 0.5])
    found = find_modes(linear(weights, 8.0), 0)
    (mode,), peak = found.centres, found.heights
    norm = np.linalg.norm(weights)
    np.testing.assert_allclose(mode, np.tile(-weights / norm * 8.0 / norm, (8, 1)), atol=0.02)
    np.testing.assert_allclose(peak, -0.5 * (8.0 / norm) ** 2, atol=0.05)
    assert found.evaluations > 0


def test_a_soft_margin_has_the_mode_of_its_closed_form():
    # ln Lambda = a z - 6: the maximum of ln(1 - exp(-e^(a z - 6))) - z^2/2, by a fine grid.
    slope = 1.7

    def log_hazard(z, _chosen, which):
        return np.repeat((slope * z[..., 0] - 6.0)[..., None], len(which), axis=-1)

    grid = np.linspace(0.0, 6.0, 600_001)
    best = grid[np.argmax(log_failure(slope * grid - 6.0) - 0.5 * grid**2)]
    (mode,) = find_modes(Problem(log_hazard, 1, 3, 1), 0).centres
    np.testing.assert_allclose(mode[:, 0], best, atol=1e-3)


def _onset(draws=32) -> Problem:
    """Fails only where onset is early: nothing depends on it at the origin."""

    def log_hazard(z, _chosen, which):
        onset = np.exp(3.9 + 0.4 * z[..., 0])  # median 49 yr
        years = np.maximum(20.0 - onset, 0.0)
        capacity = 12.0 - 0.9 * years + 0.8 * z[..., 1]
        return np.repeat(((4.0 - capacity) / 0.5)[..., None], len(which), axis=-1)

    return Problem(log_hazard, 2, draws, 1)


def _onset_exact() -> float:
    def failing(z1, z0):
        years = max(20.0 - np.exp(3.9 + 0.4 * z0), 0.0)
        hazard = np.exp((4.0 - (12.0 - 0.9 * years + 0.8 * z1)) / 0.5)
        return stats.norm.pdf(z0) * stats.norm.pdf(z1) * -np.expm1(-hazard)

    edge = (np.log(20.0) - 3.9) / 0.4
    return sum(
        quadrature.dblquad(failing, a, b, -8.0, 8.0, epsabs=1e-12, epsrel=1e-6)[0]
        for a, b in ((-8.0, edge), (edge, 8.0))
    )


def test_failure_behind_a_plateau_is_found():
    mode = find_modes(_onset(), 0).centres[0]
    assert np.all(mode[:, 0] < -2.0)  # early onset, though the gradient at the origin ignores it
    found = integrate(_onset(), chains=4, tolerance=0.003, seed=1).annual
    expected = float(index_from_probability(_onset_exact()))
    assert found.index[0] == pytest.approx(expected, abs=0.012)


def test_two_modes_are_both_covered():
    # Failure for a large deviation either way: twice the tail.
    def log_hazard(z, _chosen, which):
        return np.repeat(((np.abs(z[..., 0]) - 3.5) / 1e-3)[..., None], len(which), axis=-1)

    problem = Problem(log_hazard, 2, 256, 1)
    assert len(find_modes(problem, 0).centres) == 2
    found = integrate(problem, chains=4, tolerance=0.002, seed=1).annual
    expected = float(index_from_probability(2.0 * stats.norm.sf(3.5)))
    assert found.index[0] == pytest.approx(expected, abs=0.005)


def test_points_go_where_failure_comes_from():
    contribution = np.array([[1.0, 0.0], [0.0, 1.0], [0.0, 0.0], [1.0, 3.0]])
    points = allocate(contribution, 100)
    assert points.min() == 1
    assert points.sum() <= 100
    # Largest share in any year: 1/2, 1/4, 0 and 3/4 of 96 points that are left.
    np.testing.assert_array_equal(points, 1 + np.floor(96.0 * np.array([2, 1, 0, 3]) / 6.0))
    np.testing.assert_array_equal(allocate(np.zeros((5, 2)), 12), np.full(5, 2))
    np.testing.assert_array_equal(allocate(np.ones((5, 1)), 5), np.ones(5))


def test_weights_add_up_to_one_whatever_the_proposal():
    rng = np.random.default_rng(1)
    problem = linear([1.0, 1.0], 4.0, draws=50)
    centres = (np.zeros((50, 2)), rng.standard_normal((50, 2)), np.full((50, 2), 2.5))
    points = rng.integers(1, 6, 50)
    sums, per_draw = [], []
    for seed in range(30):
        sample = draw_sample(problem, Proposal(centres, points, seed), 2)
        sums += sample.weight.sum(axis=(1, 2)).tolist()
        per_draw.append(sample.per_draw(sample.weight[0]))
        assert len(sample.owner) == points.sum()
    assert np.mean(sums) == pytest.approx(1.0, abs=4.0 * np.std(sums) / np.sqrt(60))
    average = np.mean(per_draw, axis=0)
    np.testing.assert_allclose(average * 50, 1.0, atol=0.35)


def test_sums_per_draw_keep_to_their_points():
    problem = linear([1.0], 4.0, draws=3)
    sample = draw_sample(problem, Proposal((np.zeros((3, 1)),), np.array([2, 1, 4]), 1), 1)
    value = np.arange(7.0)[None, :]
    assert sample.per_draw(value).tolist() == [0.0 + 1.0, 2.0, 3.0 + 4.0 + 5.0 + 6.0]


def test_neighbours_lend_their_modes():
    rng = np.random.default_rng(2)
    common = rng.standard_normal((2400, 2))

    def log_hazard(z, chosen, which):
        margin = 7.0 + common[chosen] @ np.array([1.0, 0.5])
        return np.repeat(
            (-(margin[:, None] + z @ np.array([1.0, 1.0])) / 0.3)[..., None], len(which), axis=-1
        )

    alone, lent = (Problem(log_hazard, 2, 2400, 1, features=f) for f in (None, common))
    full, cheap = find_modes(alone, 0), find_modes(lent, 0)
    np.testing.assert_allclose(cheap.heights, full.heights, atol=0.05)
    assert cheap.evaluations < 0.8 * full.evaluations
    a, b = (integrate(p, chains=4, tolerance=0.005, seed=1).annual for p in (alone, lent))
    assert a.index[0] == pytest.approx(b.index[0], abs=0.01)


def test_the_first_proposal_serves_every_draw():
    proposal, _ = first_proposal(_onset(40), 3)
    assert len(proposal.centres) == 2  # the standard normal, and one year's modes
    assert np.all(proposal.centres[0] == 0.0)
    assert proposal.points.min() >= 1


def test_log_failure_keeps_its_digits():
    log_hazard = np.array([-500.0, -30.0, -20.0, -1.0, 2.0, 40.0])
    hazard = np.exp(log_hazard)
    np.testing.assert_allclose(
        log_failure(log_hazard)[1:], np.log(-np.expm1(-hazard))[1:], rtol=1e-9, atol=1e-300
    )
    assert log_failure(log_hazard)[0] == -500.0


def test_points_are_standard_normal_and_repeatable():
    points = normal_points(3, 4096, seed=1, replicates=2)
    assert points.shape == (2, 4096, 3)
    assert np.all(np.isfinite(points))
    assert abs(points.mean()) < 1e-3
    assert points.std() == pytest.approx(1.0, abs=2e-3)
    np.testing.assert_array_equal(points, normal_points(3, 4096, seed=1, replicates=2))
    assert not np.array_equal(points[0], points[1])
