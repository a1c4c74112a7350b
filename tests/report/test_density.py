import numpy as np
import pytest
from scipy.stats import lognorm, norm

from assess.report import density

RNG = np.random.default_rng(11)
NORMAL = RNG.normal(2.0, 3.0, 20_000)
POSITIVE = RNG.lognormal(0.0, 0.9, 20_000)


def test_density_of_a_normal_sample_is_near_the_true_one() -> None:
    shape = density.curve(NORMAL)
    exact = norm(2.0, 3.0).pdf(shape.x)
    assert np.max(np.abs(shape.y - exact)) < 0.06 * exact.max()
    assert np.trapezoid(shape.y, shape.x) == pytest.approx(1.0, abs=0.005)


def test_positive_draws_put_no_mass_below_zero() -> None:
    shape = density.curve(POSITIVE)
    exact = lognorm(0.9).pdf(shape.x)
    assert shape.x.min() > 0.0
    assert np.max(np.abs(shape.y - exact)) < 0.06 * exact.max()


def test_density_per_logarithm_refuses_negative_draws() -> None:
    with pytest.raises(ValueError, match="positive draws allowed"):
        density.curve(NORMAL, per_log=True)


def test_constant_draws_still_have_a_curve() -> None:
    shape = density.curve(np.full(50, 4.0))
    assert shape.x[np.argmax(shape.y)] == pytest.approx(4.0, rel=0.01)


@pytest.mark.parametrize("positive", [False, True])
def test_regions_hold_their_share_of_the_draws(positive: bool) -> None:
    # Independent of the level search: count the draws in cells denser than the level.
    z = RNG.multivariate_normal([0.0, 0.0], [[1.0, 0.7], [0.7, 1.0]], 20_000)
    x, y = (np.exp(0.5 * z[:, 0]), np.exp(0.5 * z[:, 1])) if positive else (z[:, 0], z[:, 1])
    shape = density.surface(x, y, log_x=False, log_y=False)
    columns = np.clip(np.searchsorted(shape.x, x), 0, len(shape.x) - 1)
    rows = np.clip(np.searchsorted(shape.y, y), 0, len(shape.y) - 1)
    at_draws = shape.z[rows, columns]
    assert np.mean(at_draws >= shape.levels[0]) == pytest.approx(0.9, abs=0.03)
    assert np.mean(at_draws >= shape.levels[1]) == pytest.approx(0.5, abs=0.05)


def test_window_shows_all_data() -> None:
    low, high = density.window([POSITIVE], np.array([0.5, 250.0]))
    assert 0.0 <= low < 0.5
    assert high > 250.0


def test_wide_positive_samples_get_a_logarithmic_axis() -> None:
    assert density.wants_log([POSITIVE, POSITIVE**2])
    assert not density.wants_log([NORMAL])
    assert not density.wants_log([POSITIVE**2], np.array([0.0, 1.0]))
