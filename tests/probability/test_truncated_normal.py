"""Truncated normal: the series close to a bound, and its place among known distributions."""

import math

import mpmath
import numpy as np
import pytest
from scipy import stats

from assess.probability.truncated_normal import (
    SERIES_LIMIT,
    TruncatedNormal,
    normal_mass,
    truncated_moments,
)

BOUNDS = [-8.0, -3.0, -1.0, 0.0, 0.7, 2.0, 6.0]  # standard bound, with the bound itself at zero


def _exact_mass(bound: float, distance: float) -> mpmath.mpf:
    """Probability just above a standard bound, to many digits."""
    low = mpmath.mpf(bound)
    return (mpmath.ncdf(low + mpmath.mpf(distance)) - mpmath.ncdf(low)) / mpmath.ncdf(-low)


@pytest.mark.parametrize("bound", BOUNDS)
@pytest.mark.parametrize("share", [0.99, 0.3, 1e-4])
def test_probability_close_to_a_bound_by_series(bound, share):
    distance = share * SERIES_LIMIT / (1.0 + abs(bound))
    with mpmath.workdps(60):
        exact = float(_exact_mass(bound, distance))
    # The series leaves (1e-4)^4; a missing or wrong term of it would leave 1e-13 to 1e-5.
    assert TruncatedNormal(-bound, 1.0, lower=0.0).cdf(distance) == pytest.approx(
        exact, rel=1e-14, abs=0.0
    )
    above = TruncatedNormal(bound, 1.0, upper=0.0)
    assert above.sf(-distance) == pytest.approx(exact, rel=1e-14, abs=0.0)


@pytest.mark.parametrize("bound", BOUNDS)
@pytest.mark.parametrize("share", [0.99, 0.3, 1e-4])
def test_value_close_to_a_bound_by_series(bound, share):
    with mpmath.workdps(60):
        density = mpmath.npdf(bound) / mpmath.ncdf(-mpmath.mpf(bound))
        below = float(share * SERIES_LIMIT / (1.0 + abs(bound)) * density)
        x = float(TruncatedNormal(-bound, 1.0, lower=0.0).ppf(below))
        error = float(_exact_mass(bound, x) / below - 1)
        mirrored = float(TruncatedNormal(bound, 1.0, upper=0.0).isf(below))
    assert abs(error) < 3e-14
    assert mirrored == pytest.approx(-x, rel=1e-15, abs=0.0)


def test_cut_at_the_mean_is_half_normal():
    half, reference = TruncatedNormal(0.0, 2.0, lower=0.0), stats.halfnorm(scale=2.0)
    assert (half.mean, half.sd) == pytest.approx(
        (reference.mean(), reference.std()), rel=1e-13, abs=0.0
    )
    x = np.array([0.01, 0.5, 3.0, 12.0])
    np.testing.assert_allclose(half.sf(x), reference.sf(x), rtol=1e-12)


def test_far_bounds_cut_nothing():
    wide = TruncatedNormal(3.0, 1.5, lower=-60.0, upper=66.0)
    z = np.linspace(-8.2, 8.2, 83)
    np.testing.assert_allclose(wide.from_score(z), 3.0 + 1.5 * z, rtol=1e-11, atol=1e-11)
    assert truncated_moments(3.0, 1.5, -math.inf, math.inf) == (3.0, 1.5)


def test_mass_keeps_its_digits_in_the_upper_tail():
    with mpmath.workdps(60):
        exact = float(mpmath.ncdf(mpmath.mpf(-10)) - mpmath.ncdf(mpmath.mpf(-11)))
    assert normal_mass(10.0, 11.0) == pytest.approx(exact, rel=1e-13, abs=0.0)
    assert normal_mass(-11.0, -10.0) == pytest.approx(exact, rel=1e-13, abs=0.0)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((math.nan, 1.0, 0.0), "location: given nan, allowed a finite number"),
        ((0.0, 0.0, 0.0), "scale: given 0, allowed a positive number"),
        (
            (0.0, 1.0, 1.0, 1.0),
            "upper bound of a truncated normal: given 1, allowed a number above",
        ),
        ((50.0, 1.0, -math.inf, 0.0), "upper bound: given 0, allowed within 37 scales"),
    ],
)
def test_refusals(arguments, message):
    with pytest.raises(ValueError, match=message):
        TruncatedNormal(*arguments)
