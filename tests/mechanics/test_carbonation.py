"""Carbonation: recomputed examples of the published equations, probabilities in closed form."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.mechanics import carbonation

FIB = "fib Bulletin 34 (2006), equations and parameters from memory"
UNIT = 315.576  # [(mm²/yr)/(kg/m³)] of 1e-11 (m²/s)/(kg/m³), year of 365.25 days


@pytest.mark.published(source=FIB, place="annex B1, k_e")
@pytest.mark.parametrize(
    ("humidity", "factor"),
    [(50, 1.257287), (65, 1.0), (70, 0.859255), (75, 0.691485), (80, 0.504481), (90, 0.146072)],
)
def test_humidity_factor(humidity, factor):
    assert carbonation.humidity_factor(float(humidity)) == pytest.approx(factor, abs=5e-7)


@pytest.mark.published(source=FIB, place="annex B1, k_c")
@pytest.mark.parametrize(
    ("days", "factor"), [(1, 3.014190), (2, 2.034635), (4, 1.373417), (7, 1.0), (14, 0.675019)]
)
def test_curing_factor(days, factor):
    assert carbonation.curing_factor(float(days)) == pytest.approx(factor, abs=5e-7)


@pytest.mark.published(source=FIB, place="annex B1, W(t)")
@pytest.mark.parametrize(
    ("rain", "wetness", "factor"),
    [(0.1, 0.2, 0.567807), (0.5, 0.2, 0.313420), (1.0, 0.2, 0.205871), (0.0, 0.2, 1.0)],
)
def test_weather_function(rain, wetness, factor):
    assert carbonation.weather_function(50.0, rain, wetness) == pytest.approx(factor, abs=5e-7)


@pytest.mark.published(source=FIB, place="annex B1, x_c(t)")
@pytest.mark.parametrize(
    ("humidity", "curing", "resistance", "rain", "depth"),
    [
        (65.0, 7.0, 3.1, 0.0, 11.231441),
        (80.0, 4.0, 9.8, 0.0, 15.412985),
        (75.0, 3.0, 5.2, 0.0, 14.729750),
        (80.0, 4.0, 9.8, 0.1, 8.751602),
    ],
)
def test_recomputed_examples_of_the_full_equation(humidity, curing, resistance, rain, depth):
    rate = carbonation.carbonation_rate(resistance * UNIT, humidity, curing)
    found = carbonation.carbonation_depth(rate, 50.0) * carbonation.weather_function(
        50.0, rain, 0.2
    )
    # 14.729750 was printed with factors rounded to six decimals; 14.7297491 without.
    assert found == pytest.approx(depth, abs=1e-6)


@pytest.mark.published(source="root-time law, recomputed by quadrature", place="P(x_c > c)")
def test_probability_that_the_front_has_passed_the_bar():
    # k lognormal of mean 3 and V 0.3, cover N(35, 8), 50 years: 0.09070991.
    spread = np.sqrt(np.log1p(0.3**2))
    rate = stats.lognorm(spread, scale=3.0 * np.exp(-0.5 * spread**2))
    cover = stats.norm(35.0, 8.0)

    def passed(c):
        least = c / carbonation.carbonation_depth(1.0, 50.0)
        return cover.pdf(c) * (rate.sf(least) if c > 0.0 else 1.0)

    found = integrate.quad(passed, -20.0, 100.0, points=[0.0, 20.0, 40.0])[0]
    assert found == pytest.approx(9.070991e-2, abs=5e-8)


def test_onset_is_when_the_depth_is_the_cover():
    rate, cover = np.array([2.0, 5.0]), np.array([[20.0], [35.0]])
    onset = carbonation.carbonation_onset(cover, rate)
    np.testing.assert_allclose(
        carbonation.carbonation_depth(rate, onset), np.broadcast_to(cover, (2, 2)), rtol=1e-14
    )


def test_graph_and_numbers_agree():
    tensor = pytest.importorskip("pytensor.tensor")
    resistance, age = tensor.dscalar(), tensor.dscalar()
    depth = carbonation.carbonation_depth(carbonation.carbonation_rate(resistance, 70.0), age)
    graph = depth * carbonation.weather_function(age, 0.3, 0.2)
    found = graph.eval({resistance: 1500.0, age: 40.0}, mode="FAST_COMPILE")
    numbers = carbonation.carbonation_depth(carbonation.carbonation_rate(1500.0, 70.0), 40.0)
    assert found == pytest.approx(numbers * carbonation.weather_function(40.0, 0.3, 0.2), rel=1e-12)
