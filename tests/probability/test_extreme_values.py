"""Extreme-value families: properties that are theirs alone."""

import math

import numpy as np
import pytest

from assess.probability.extreme_values import Gumbel, Weibull, weibull_squared_variation


@pytest.mark.parametrize("n", [10, 50])
def test_largest_of_n_gumbel_values_is_gumbel_shifted_by_scale_ln_n(n):
    one, largest = Gumbel(90.0, 15.0), Gumbel(90.0 + 15.0 * math.log(n), 15.0)
    x = np.linspace(60.0, 250.0, 39)
    np.testing.assert_allclose(largest.cdf(x), one.cdf(x) ** n, rtol=1e-12)


@pytest.mark.parametrize("n", [10, 50])
def test_smallest_of_n_weibull_values_is_weibull(n):
    one, smallest = Weibull(100.0, 5.0), Weibull(100.0 / n**0.2, 5.0)
    x = np.linspace(5.0, 150.0, 30)
    np.testing.assert_allclose(smallest.sf(x), one.sf(x) ** n, rtol=1e-12)


def test_weibull_of_shape_one_is_exponential_and_of_shape_two_rayleigh():
    assert weibull_squared_variation(1.0) == pytest.approx(1.0, rel=1e-14)
    assert weibull_squared_variation(2.0) == pytest.approx(4.0 / math.pi - 1.0, rel=1e-13)


def test_far_values_do_not_overflow():
    assert Gumbel(0.0, 1.0).cdf(-1e6) == 0.0
    assert Gumbel(0.0, 1.0).sf(-1e6) == 1.0
    assert Gumbel(0.0, 1.0).score(-6.0) == pytest.approx(-28.3, abs=0.1)


@pytest.mark.parametrize(
    ("family", "arguments", "message"),
    [
        (Gumbel, (0.0, -1.0), "scale of a gumbel: given -1, allowed a positive number"),
        (Gumbel, (math.nan, 1.0), "mode of a gumbel: given nan"),
        (Weibull, (0.0, 1.0), "scale of a weibull: given 0"),
        (Weibull, (1.0, -1.0), "shape of a weibull: given -1"),
    ],
)
def test_refusals(family, arguments, message):
    with pytest.raises(ValueError, match=message):
        family(*arguments)
