import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from assess.mechanics import loads

variations = st.floats(0.05, 0.8)


@pytest.mark.parametrize(
    ("mean", "sd", "mode", "scale", "fractile"),
    [
        # Recomputed: scale = sd sqrt(6)/pi, mode = mean - 0.5772157 scale, 98 % fractile.
        (100.0, 20.0, 90.998936, 15.593936, 151.8455),
        (40.0, 4.0, 38.199787, 3.118787, 50.3691),
        (30.0, 4.5, 27.974761, 3.508636, 41.6652),
        (100.0, 35.0, 84.248138, 27.289388, 190.7297),
    ],
)
def test_gumbel_from_mean(mean, sd, mode, scale, fractile):
    found = loads.gumbel_from_mean(mean, sd / mean)
    assert [float(v) for v in found] == pytest.approx([mode, scale], abs=6e-7)
    assert float(loads.fractile(0.98, *found)) == pytest.approx(fractile, abs=6e-5)
    frozen = stats.gumbel_r(*found)
    assert (frozen.mean(), frozen.std()) == pytest.approx((mean, sd), rel=1e-12)


@given(st.floats(1.0, 1e6), variations, st.floats(0.9, 0.9999))
def test_from_fractile_undoes_fractile(mean, variation, probability):
    start = loads.gumbel_from_mean(mean, variation)
    value = loads.fractile(probability, *start)
    found = loads.gumbel_from_fractile(value, probability, variation)
    assert [float(v) for v in found] == pytest.approx([float(v) for v in start], rel=1e-11)


def test_from_thousand_year_value():
    # A 1000-year load: exceeded with 1/1000 a year.
    level = loads.probability_from_return_period(1000.0)
    mode, scale = loads.gumbel_from_fractile(600.0, level, 0.075)
    assert stats.gumbel_r(mode, scale).sf(600.0) == pytest.approx(1e-3, rel=1e-9)
    frozen = stats.gumbel_r(mode, scale)
    assert frozen.std() / frozen.mean() == pytest.approx(0.075, rel=1e-12)


@pytest.mark.parametrize(
    ("variation", "mean_ratio", "variation_50", "fractile_ratio"),
    [
        # Recomputed from u + b ln 50, per unit of the yearly mean.
        (0.20, 1.610038, 0.124221, 1.518455),
        (0.35, 2.067567, 0.169281, 1.907297),
        (0.50, 2.525096, 0.198012, 2.296138),
    ],
)
def test_fifty_years(variation, mean_ratio, variation_50, fractile_ratio):
    year = loads.gumbel_from_mean(1.0, variation)
    fifty = loads.shift_to_period(*year, 50.0)
    frozen = stats.gumbel_r(*fifty)
    assert frozen.mean() == pytest.approx(mean_ratio, abs=6e-7)
    assert frozen.std() / frozen.mean() == pytest.approx(variation_50, abs=6e-7)
    yearly = float(loads.fractile(0.98, *year))
    assert yearly == pytest.approx(fractile_ratio, abs=6e-7)
    assert float(np.exp(loads.log_cdf(yearly, *fifty))) == pytest.approx(0.364170, abs=6e-7)


@given(variations, st.integers(1, 200), st.floats(0.2, 8.0))
def test_period_is_the_power_of_one_year(variation, years, value):
    year = loads.gumbel_from_mean(1.0, variation)
    many = loads.shift_to_period(*year, years)
    one, all_years = loads.log_cdf(value, *year), loads.log_cdf(value, *many)
    assert float(all_years) == pytest.approx(years * float(one), rel=1e-9)


def test_log_cdf_keeps_its_digits_in_both_tails():
    for value in (-1.0, 0.5, 3.0, 40.0):
        exact = -mpmath.exp(-(mpmath.mpf(value) - 1) / mpmath.mpf("0.1"))
        assert float(loads.log_cdf(value, 1.0, 0.1)) == pytest.approx(float(exact), rel=1e-12)
    assert np.isfinite(loads.log_cdf(-1e6, 1.0, 0.1))  # no overflow far below the mode


def test_trend_of_the_mode():
    years = np.array([2020, 2026, 2056])
    found = loads.mode_in_year(200.0, years, 2026, 0.005)
    np.testing.assert_allclose(found, [194.0, 200.0, 230.0])


def test_refuses_nonsense():
    with pytest.raises(ValueError, match="coefficient of variation must be positive, got 0"):
        loads.gumbel_from_mean(100.0, 0.0)
    with pytest.raises(ValueError, match=r"probability must be in \(0, 1\), got 0.98 to 1"):
        loads.fractile([0.98, 1.0], 100.0, 20.0)
    with pytest.raises(ValueError, match="above 1 year, got 1"):
        loads.probability_from_return_period(1.0)
    with pytest.raises(ValueError, match="number of years must be positive, got -1"):
        loads.shift_to_period(100.0, 20.0, -1.0)
    with pytest.raises(ValueError, match="give a higher fractile"):
        loads.gumbel_from_fractile(10.0, 0.001, 0.8)
