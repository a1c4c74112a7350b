"""Verdicts on curves whose crossing is known by construction."""

import numpy as np
import pytest
from scipy.stats import norm

from assess.decisions.results import IndexCurve, Standing, Target
from assess.decisions.verdicts import LEAST_LOAD_FACTOR, crossing, verdict

YEARS = np.arange(2026, 2056)
TARGET = Target(3.7, 1, "test", "class", "test")


def curve(index, years=YEARS, period=1) -> IndexCurve:
    index = np.broadcast_to(np.asarray(index, dtype=float), years.shape).copy()
    zero = np.zeros(len(years))
    return IndexCurve(
        years, np.full(len(years), period), index, index, index, zero, zero, norm.sf(index)
    )


def given_draws(indices) -> np.ndarray:
    """Failure probabilities given draws whose index declines in a line: (n_draw, n_year)."""
    return norm.sf(np.asarray(indices, dtype=float))


def falling(start: float, slope: float) -> np.ndarray:
    return start - slope * np.arange(len(YEARS))


def test_a_curve_above_the_target_throughout_meets_it():
    found = verdict(curve(falling(4.5, 0.01)), given_draws([falling(4.5, 0.01)]), TARGET, 1.4, "x")
    assert found.standing is Standing.MEETS
    assert (found.crossing_year, found.crossing_low, found.crossing_high) == (None, None, None)
    assert found.probability_below == 0.0
    assert found.governing == "x"


def test_the_crossing_year_is_the_first_one_below():
    # 4.0 - 0.05 k < 3.7 for k > 6, that is from 2033 on.
    found = verdict(
        curve(falling(4.0, 0.05) + 1e-9), given_draws([falling(4.0, 0.05)]), TARGET, 1.1, "x"
    )
    assert found.standing is Standing.MEETS_UNTIL
    assert found.crossing_year == 2033


def test_an_index_equal_to_the_target_meets_it():
    found = verdict(curve(3.7), given_draws([np.full(30, 3.7)]), TARGET, 1.0, "x")
    assert found.standing is Standing.MEETS


@pytest.mark.parametrize(
    ("factor", "standing"),
    [
        (0.8, Standing.BELOW_LIMITABLE),
        (LEAST_LOAD_FACTOR, Standing.BELOW_LIMITABLE),
        (0.5 * LEAST_LOAD_FACTOR, Standing.BELOW),  # a closure is no load limit
        (None, Standing.BELOW),
    ],
)
def test_below_now_is_limitable_where_a_load_can_be_carried(factor, standing):
    found = verdict(curve(3.2), given_draws([np.full(30, 3.2)]), TARGET, factor, "x")
    assert found.standing is standing
    assert found.crossing_year == 2026
    assert found.load_factor == factor


def test_a_dip_counts_from_its_first_year_though_the_index_recovers():
    index = np.full(30, 4.0)
    index[12] = 3.6
    assert crossing(curve(index), given_draws([index]), TARGET)[0] == 2038


def test_the_interval_of_the_crossing_year_is_that_of_the_draws():
    # Draw d falls below the target in year 2026 + d; 20 draws: 5 % and 95 % by counting.
    draws = np.full((20, 30), 5.0)
    for d in range(20):
        draws[d, d:] = 3.0
    year, low, high = crossing(curve(falling(4.0, 0.05)), given_draws(draws), TARGET)
    assert (low, high) == (2026, 2044)
    assert year == 2033


def test_draws_that_never_cross_leave_the_interval_open():
    draws = np.full((100, 30), 5.0)
    draws[:10, 4:] = 3.0
    _, low, high = crossing(curve(5.0), given_draws(draws), TARGET)
    assert low == 2030
    assert high is None


def test_the_share_of_draws_below_is_that_of_the_last_year():
    draws = np.full((8, 30), 4.0)
    draws[:2, :5] = 3.0  # recovered by the end
    draws[:3, -1] = 3.0
    assert verdict(curve(4.0), given_draws(draws), TARGET, None, "x").probability_below == 3 / 8


def test_windows_of_several_years_are_named_by_their_last_year():
    years = np.arange(2040, 2056)  # 15-year windows of a 30-year horizon
    index = 3.41 - 0.05 * np.arange(len(years))
    wanted = Target(3.1, 15, "test", "class", "test")
    found = verdict(curve(index, years, 15), given_draws([index]), wanted, 1.1, "x")
    assert found.standing is Standing.MEETS_UNTIL
    assert found.crossing_year == 2047  # 3.41 - 0.05 * 7 < 3.1, in the window that ends in 2047


def test_a_horizon_of_one_year_and_one_draw():
    years = np.array([2026])
    assert verdict(curve(4.0, years), given_draws([[4.0]]), TARGET, 1.2, "x").standing is (
        Standing.MEETS
    )
    below = verdict(curve(3.0, years), given_draws([[3.0]]), TARGET, 0.5, "x")
    assert (below.crossing_year, below.crossing_low, below.crossing_high) == (2026, 2026, 2026)


def test_infinite_indices_meet_any_target_and_certain_failure_none():
    index = np.full(30, np.inf)
    assert verdict(curve(index), given_draws([index]), TARGET, None, "").standing is Standing.MEETS
    never = np.full(30, -np.inf)
    assert verdict(curve(never), given_draws([never]), TARGET, None, "").standing is Standing.BELOW
