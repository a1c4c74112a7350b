import numpy as np
import pytest
from scipy import stats

from assess.updating.local import Local


def test_normal_without_bounds():
    local = Local(np.array([1.0, 2.0]), np.array([0.5, 0.0]))
    np.testing.assert_allclose(
        local.value(np.array([[2.0, -1.0], [2.0, -1.0]])), [[2, 0.5], [2, 2]]
    )


def test_truncated_values_are_quantiles_of_the_truncated_normal():
    lower, upper = np.array([-1.0, 3.0, -np.inf]), np.array([0.5, 4.0, -2.0])
    local = Local(np.full(3, 2.0), np.full(3, 0.5), lower, upper)
    z = np.linspace(-3.0, 3.0, 7)
    found = local.value(np.tile(z, (3, 1)))
    for row in range(3):
        known = stats.truncnorm(lower[row], upper[row], loc=2.0, scale=0.5)
        np.testing.assert_allclose(found[row], known.ppf(stats.norm.cdf(z)), rtol=1e-9)


@pytest.mark.parametrize("bounds", [True, False])
def test_chosen_draws_and_order(bounds):
    mean, sd = np.arange(4.0), np.ones(4)
    local = Local(mean, sd, *(np.full((2, 4), [[-1.0], [1.0]]) if bounds else ()))
    z = np.full((2, 3), 0.3)
    whole = local.value(np.full((4, 3), 0.3))
    np.testing.assert_array_equal(local.value(z, np.array([3, 1])), whole[[3, 1]])
    np.testing.assert_array_equal(local.value(z, slice(1, 3)), whole[1:3])
    turned = local.take(np.array([3, 2, 1, 0]))
    np.testing.assert_array_equal(turned.value(np.full((4, 3), 0.3)), whole[::-1])
