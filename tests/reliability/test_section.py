"""One section under options: load factors, common points, reference periods."""

from types import SimpleNamespace

import numpy as np
import pytest

from assess.reliability.importance import Problem
from assess.reliability.index import index_from_probability, probability_from_index
from assess.reliability.lifetime import integrate
from assess.reliability.limit_state import Action
from assess.reliability.problem import section_state
from assess.reliability.section import (
    Precision,
    load_factor,
    section_reliability,
    section_sensitivities,
    solve_load_factor,
)

DRAWS = 800
PRECISION = Precision(4, 0.01, 11)
SAME_POINTS = Precision(4, 1.0, 11)  # no pass beyond that of the proposal given


@pytest.fixture(scope="module")
def state(example_case, example_spec):
    prior = example_spec.prior
    z = np.random.default_rng(2).standard_normal((DRAWS, len(prior.names)))
    values = dict(zip(prior.names, prior.physical(z).T, strict=True))
    return section_state(example_case, example_spec, example_case.spec.sections()["S1"], 2, values)


@pytest.fixture(scope="module")
def left(example_case, state):
    return section_reliability(example_case, state, Action(), 1, PRECISION)


def test_curves_have_their_years_and_periods(example_case, left):
    years = list(range(2026, 2036))
    for curve in (left.annual, left.cumulative, left.reference):
        assert curve.year.tolist() == years
        assert np.all(curve.low <= curve.high)
    assert left.cumulative.period.tolist() == list(range(1, 11))
    np.testing.assert_array_equal(left.annual.index, left.reference.index)
    assert np.all(np.diff(left.cumulative.index) < 0.0)
    np.testing.assert_allclose(
        left.annual.index, index_from_probability(left.annual.failure_probability)
    )
    np.testing.assert_allclose(
        left.annual.error, np.hypot(left.annual.integration_error, left.annual.mcmc_error)
    )


def test_a_longer_reference_period_covers_windows_of_years(example_case, state, left):
    five = section_reliability(example_case, state, Action(), 5, PRECISION).reference
    assert five.year.tolist() == list(range(2030, 2036))
    assert np.all(five.period == 5)
    # The first window is the first five years of the cumulative curve.
    assert five.index[0] == pytest.approx(left.cumulative.index[4], abs=1e-12)


def test_an_option_without_effect_changes_nothing_at_all(example_case, state, left):
    same = section_reliability(
        example_case, state, Action(np.inf, 0.5, 1.0), 1, PRECISION, left.proposal
    )
    np.testing.assert_array_equal(same.annual.index, left.annual.index)
    np.testing.assert_array_equal(same.conditional, left.conditional)


def test_options_act_from_their_year(example_case, state, left):
    factors = np.where(np.arange(10) >= 4, 0.7, 1.0)
    limited = section_reliability(
        example_case, state, Action(load_factor=factors), 1, PRECISION, left.proposal
    )
    np.testing.assert_array_equal(limited.annual.index[:4], left.annual.index[:4])
    assert np.all(limited.annual.index[4:] > left.annual.index[4:] + 0.1)
    arrested = section_reliability(
        example_case, state, Action(56.0, 1.0), 1, PRECISION, left.proposal
    )
    assert np.all(arrested.annual.index[1:] > left.annual.index[1:])
    assert np.ptp(arrested.annual.index[1:]) < 1e-9  # nothing changes any more


@pytest.mark.parametrize("difference", [-0.5, 0.3])
def test_the_load_factor_meets_the_target_when_it_is_applied(example_case, state, left, difference):
    wanted = float(left.annual.index[0]) + difference
    factor = load_factor(left, float(probability_from_index(wanted)), 1)
    assert (factor < 1.0) == (difference > 0.0)
    # On the same points: a tolerance of one asks for no further pass.
    again = section_reliability(
        example_case, state, Action(load_factor=factor), 1, SAME_POINTS, left.proposal
    )
    assert again.annual.index[0] == pytest.approx(wanted, abs=1e-6)
    # And on points of its own, within the errors.
    fresh = section_reliability(example_case, state, Action(load_factor=factor), 1, PRECISION)
    assert fresh.annual.index[0] == pytest.approx(wanted, abs=0.05)


def test_a_load_factor_for_several_years_meets_the_target_of_the_first_of_them(
    example_case, state, left
):
    five = section_reliability(example_case, state, Action(), 5, SAME_POINTS, left.proposal)
    wanted = float(five.reference.index[0]) + 0.4
    factor = load_factor(five, float(probability_from_index(wanted)), 5)
    again = section_reliability(
        example_case, state, Action(load_factor=factor), 5, SAME_POINTS, left.proposal
    )
    assert again.reference.index[0] == pytest.approx(wanted, abs=1e-6)
    assert again.annual.index[0] > wanted + 0.1  # one year of the five would allow more


def _factor_and_index(target, lives, variation):
    """Give a load factor for a target, and the index that a fresh integral finds under it.

    A lognormal resistance against a Gumbel load of mean 4; ``lives`` tells which draws could
    carry any load at all.
    """
    scale = 4.0 * variation * np.sqrt(6.0) / np.pi
    mode = 4.0 - np.euler_gamma * scale
    common = 0.1 * np.random.default_rng(1).standard_normal(len(lives))

    def problem(factor):
        def log_hazard(z, chosen, which):
            resistance = 4.6 * np.exp(0.15 * z[..., 0] + common[chosen][:, None])
            capacity = np.where(lives[chosen][:, None], resistance - 0.8, -4.0)
            return np.repeat(
                ((factor * mode - capacity) / (factor * scale))[..., None], len(which), axis=-1
            )

        return Problem(log_hazard, 1, len(lives), 1, np.array([mode / scale]))

    def run(factor):
        return integrate(problem(factor), chains=4, tolerance=0.005, seed=3)

    def at(factor):
        return SimpleNamespace(
            sample=run(factor).sample, load_ratio=problem(1.0).load_ratio, load_shape=0.0
        )

    factor = solve_load_factor(at(1.0), at, float(probability_from_index(target)), 1)
    return factor, None if factor is None else run(factor).annual.index[0]


@pytest.mark.parametrize("target", [1.0, 3.3, 4.7])
def test_the_load_factor_holds_far_from_the_load_of_today(target):
    _, index = _factor_and_index(target, np.ones(1000, dtype=bool), 0.12)
    assert index == pytest.approx(target, abs=0.03)


@pytest.mark.parametrize("variation", [0.12, 0.01])
def test_no_factor_helps_where_no_load_could_be_carried(variation):
    # One draw in two hundred fails under the permanent load alone: 0.5 % is left at any factor.
    factor, _ = _factor_and_index(3.1, np.arange(1000) % 200 > 0, variation)
    assert factor is None


def test_no_load_factor_where_none_would_do(left):
    assert load_factor(left, float(probability_from_index(12.0)), 1) is None
    assert load_factor(left, 0.999999, 1) is None


def test_sensitivities_are_direction_cosines_by_group(example_case, state, left):
    found = section_sensitivities(state, left)
    assert sum(alpha**2 for alpha in found.values()) == pytest.approx(1.0)
    assert list(found.values()) == sorted(found.values(), reverse=True)
    assert "variable load" in found
    assert "resistance model" in found


def test_draws_that_are_known_better_give_a_higher_index(example_case, example_spec, state, left):
    prior = example_spec.prior
    z = 0.1 * np.random.default_rng(2).standard_normal((DRAWS, len(prior.names)))
    values = dict(zip(prior.names, prior.physical(z).T, strict=True))
    entry = example_case.spec.sections()["S1"]
    known = section_state(example_case, example_spec, entry, 2, values)
    found = section_reliability(example_case, known, Action(), 1, PRECISION)
    assert found.annual.index[-1] > left.annual.index[-1]
    assert np.ptp(found.conditional[:, -1]) < np.ptp(left.conditional[:, -1])
