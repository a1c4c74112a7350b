import numpy as np
import pytest
from scipy import optimize, special

from assess.updating import bounds
from assess.updating.chloride_increments import Increments, summarise

START = np.array([0.0, 10.0, 20.0, 32.0, 0.0, 12.0, 30.0])
END = np.array([10.0, 20.0, 32.0, 50.0, 12.0, 30.0, 60.0])
VISIT = np.array([0, 0, 0, 0, 1, 1, 1])
LOG_AGE = np.log(np.array([30.0, 12.0]))


def increments(variation=0.0, absolute=0.03, limit=-np.inf):
    full = np.full(len(START), 1.0)
    return Increments(
        START, END, LOG_AGE[VISIT], 0.05 * full, variation * full, absolute * full, limit * full
    )


def content(at, row):
    """Mean content by Gauss-Legendre over the profile itself."""
    surface, apparent = np.exp(at)
    node, weight = np.polynomial.legendre.leggauss(30)
    depth = 0.5 * (START[row] + END[row]) + 0.5 * (END[row] - START[row]) * node
    length = 2.0 * np.sqrt(apparent * np.exp(LOG_AGE[VISIT[row]]))
    return 0.05 + (surface - 0.05) * 0.5 * weight @ special.erfc(depth / length)


TRUE = np.array([[np.log(2.2), np.log(9.0)], [np.log(1.4), np.log(25.0)]])
EXACT = np.array([content(TRUE[v], row) for row, v in enumerate(VISIT)])


def test_content_and_slopes_are_those_of_the_profile():
    rows = increments()
    at = TRUE[VISIT]
    value, by_surface, by_apparent = rows.slopes(*at.T)
    np.testing.assert_allclose(value, EXACT, rtol=1e-10)
    np.testing.assert_allclose(rows.content(*at.T), EXACT, rtol=1e-10)
    for k, slope in enumerate((by_surface, by_apparent)):
        step = np.where(np.arange(2) == k, 1e-5, 0.0)
        high = [content(one + step, row) for row, one in enumerate(at)]
        low = [content(one - step, row) for row, one in enumerate(at)]
        np.testing.assert_allclose(slope, np.subtract(high, low) / 2e-5, rtol=1e-6)


def test_error_has_a_relative_and_an_absolute_part():
    content = np.array([0.0, 0.4, 0.4, 0.4, 0.4, 0.4, 4.0])
    sd = increments(0.1, 0.03).sd(content)
    np.testing.assert_allclose(sd, [0.03, 0.05, 0.05, 0.05, 0.05, 0.05, np.sqrt(0.1609)])


def test_summary_is_the_least_squares_fit_with_its_curvature():
    # Constant error: the best values and J'J from SciPy's own least squares.
    value = EXACT + 0.03 * np.array([0.5, -1.0, 0.8, 0.2, -0.6, 1.1, -0.3])
    found = summarise(increments(), value, np.ones(7, dtype=bool), VISIT, 2)
    for visit, here in enumerate(([0, 1, 2, 3], [4, 5, 6])):

        def residual(at, here=here):
            return [(value[row] - content(at, row)) / 0.03 for row in here]

        fit = optimize.least_squares(residual, TRUE[visit], xtol=1e-12, jac="3-point")
        best = np.linalg.solve(found.precision[visit], found.linear[visit])
        np.testing.assert_allclose(best, fit.x, atol=2e-4)
        np.testing.assert_allclose(found.precision[visit], fit.jac.T @ fit.jac, rtol=2e-3)


def test_profile_that_does_not_count_says_nothing():
    active = VISIT == 1
    some, all_rows = (
        summarise(increments(0.1), EXACT, chosen, VISIT, 2)
        for chosen in (active, np.ones(7, dtype=bool))
    )
    assert not some.precision[0].any()
    assert not some.linear[0].any()
    np.testing.assert_allclose(some.precision[1], all_rows.precision[1], rtol=1e-6)


@pytest.mark.parametrize("value", [1e-6, 20.0, bounds.BELOW])
@pytest.mark.parametrize("variation", [0.0, 0.3])
def test_summary_of_what_no_profile_looks_like_is_finite_and_never_negative(value, variation):
    rows = increments(variation, 0.01, 0.05)
    found = summarise(rows, np.full(7, value), np.ones(7, dtype=bool), VISIT, 2)
    assert np.isfinite(found.precision).all()
    assert np.isfinite(found.linear).all()
    assert np.linalg.eigvalsh(found.precision).min() > -1e-6


def test_bounds_pull_the_coefficient_down():
    rows = increments(0.1, 0.02, 0.06)
    value = np.where(np.isin(np.arange(7), [3, 6]), bounds.BELOW, EXACT)
    active = np.ones(7, dtype=bool)
    with_bounds = summarise(rows, value, active, VISIT, 2)
    without = summarise(rows, value, np.isfinite(value), VISIT, 2)
    for visit in (0, 1):
        best, other = (
            np.linalg.solve(one.precision[visit], one.linear[visit])
            for one in (with_bounds, without)
        )
        assert best[1] < other[1] - 0.05
