import numpy as np

from assess.updating import bounds

NAN, INF = np.nan, np.inf


def test_marks_tell_the_side_and_survive_shifts_and_choices():
    value = bounds.marked(
        np.array([2.0, NAN, NAN]), np.array([NAN, 1.0, NAN]), np.array([NAN, NAN, 9.0])
    )
    for moved in (value, bounds.shifted(value, np.array([-5.0, -5.0, -5.0])), value[[0, 1, 2]]):
        assert bounds.is_below(moved).tolist() == [False, True, False]
        assert bounds.is_beyond(moved).tolist() == [False, False, True]
    assert bounds.shifted(value, np.full(3, -5.0))[0] == -3.0


def test_readings_outside_their_limits_become_marks():
    drawn = np.array([[0.5, 3.0, 12.0], [2.0, 0.1, 20.0]])
    value = bounds.bounded(drawn, np.array([1.0, -INF, 1.0]), np.array([10.0, 10.0, INF]))
    assert bounds.is_below(value).tolist() == [[True, False, False], [False, False, False]]
    assert not bounds.is_beyond(value).any()
    assert bounds.is_beyond(bounds.bounded(drawn, np.zeros(3), np.full(3, 11.0))).sum() == 2


def test_rows_share_the_bounds_that_their_table_says():
    value, below = np.array([5.0, NAN, NAN, 1.5]), np.array([NAN, 1.0, 2.0, NAN])
    # The last row was read below the table's largest bound: its own limit was lower.
    np.testing.assert_array_equal(bounds.lower_limits(value, below), [2.0, 1.0, 2.0, -INF])
    np.testing.assert_array_equal(bounds.lower_limits(value, below, 0.5), [0.5, 1.0, 2.0, 0.5])
    none = np.full(4, NAN)
    np.testing.assert_array_equal(bounds.lower_limits(value, none), [-INF] * 4)
    beyond = np.array([NAN, 30.0, 40.0, NAN])
    np.testing.assert_array_equal(bounds.upper_limits(value, beyond), [30.0, 30.0, 40.0, 30.0])
    value[0] = 35.0
    assert bounds.upper_limits(value, beyond)[0] == INF
    np.testing.assert_array_equal(bounds.upper_limits(value, none), [INF] * 4)
