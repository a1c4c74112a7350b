"""Generalised extreme value distribution against SciPy's, and a published fit."""

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from scipy import optimize, stats

from assess.probability.generalised_extreme import (
    log_density,
    log_hazard,
    reduced_variate,
    standard_value,
)

PORT_PIRIE = pd.read_csv(
    Path(__file__).parents[1] / "published" / "annual_maxima_port_pirie.csv", comment="#"
)["level"].to_numpy()
X = np.linspace(-1.0, 4.0, 11)


@pytest.mark.parametrize("shape", [-0.3, -0.05, -1e-4, -1e-9, 0.0, 1e-9, 1e-4, 0.05, 0.4])
def test_density_and_hazard_agree_with_scipy(shape):
    known = stats.genextreme(-shape, loc=1.0, scale=0.7)  # its shape has the other sign
    inside = known.pdf(X) > 1e-12
    np.testing.assert_allclose(
        log_density(X[inside], 1.0, 0.7, shape), known.logpdf(X[inside]), rtol=1e-7, atol=1e-9
    )
    hazard = np.exp(log_hazard(X[inside], 1.0, 0.7, shape))
    np.testing.assert_allclose(np.exp(-hazard), known.cdf(X[inside]), rtol=1e-7)


@pytest.mark.parametrize("shape", [-0.2, 0.0, 0.2])
def test_largest_value_of_several_years_is_the_power_of_the_yearly_one(shape):
    known = stats.genextreme(-shape, loc=1.0, scale=0.7)
    x = np.linspace(1.0, 3.0, 7)
    years = 12.0
    by_definition = np.log(years * known.pdf(x) * known.cdf(x) ** (years - 1.0))
    np.testing.assert_allclose(log_density(x, 1.0, 0.7, shape, years), by_definition, rtol=1e-9)


def test_beyond_a_bound_nothing_is_possible_yet_finite():
    beyond = log_density(np.array([5.0]), 0.0, 1.0, -0.5)  # bounded above at 2
    assert np.isfinite(beyond[0])
    assert beyond[0] < -15.0
    assert log_density(np.array([6.0]), 0.0, 1.0, -0.5)[0] < beyond[0]  # a way back for a sampler
    below = log_density(np.array([-5.0]), 0.0, 1.0, 0.5)  # bounded below at -2
    assert np.isfinite(below[0])
    assert below[0] < -1e10


@pytest.mark.published(source="Coles 2001 (from memory)", place="section 3.4.1, Port Pirie")
def test_maximum_likelihood_of_a_public_series_is_the_published_one():
    def minus(parameters):
        location, log_scale, shape = parameters
        return -log_density(PORT_PIRIE, location, np.exp(log_scale), shape).sum()

    best = optimize.minimize(
        minus, (3.9, np.log(0.2), 0.01), method="Nelder-Mead",
        options={"xatol": 1e-7, "fatol": 1e-9, "maxiter": 4000},
    )  # fmt: skip
    location, scale, shape = best.x[0], np.exp(best.x[1]), best.x[2]
    assert (location, scale, shape) == pytest.approx((3.87, 0.198, -0.050), abs=6e-3)
    assert -best.fun == pytest.approx(4.34, abs=5e-3)
    # And to more digits, recomputed independently.
    assert (location, scale, shape) == pytest.approx((3.87475, 0.19804, -0.05011), abs=2e-4)


@pytest.mark.parametrize("shape", [-0.2, 0.0, 1e-5, 0.3])
def test_graph_and_numbers_agree_and_gradients_are_finite(shape):
    pytensor = pytest.importorskip("pytensor")
    tensor = pytest.importorskip("pytensor.tensor")
    symbols = [tensor.dscalar() for _ in range(3)]
    graph = log_density(X, *symbols).sum()
    function = pytensor.function(
        symbols, [graph, *pytensor.grad(graph, symbols)], mode="FAST_COMPILE"
    )
    value, *slopes = function(1.0, 0.7, shape)
    assert value == pytest.approx(log_density(X, 1.0, 0.7, shape).sum(), rel=1e-9)
    assert np.isfinite(slopes).all()


def test_small_shapes_join_smoothly():
    s = 3.0
    around = np.array([0.999e-3, 1.001e-3]) / s
    values = reduced_variate(s, around)
    exact = np.log1p(around * s) / around
    np.testing.assert_allclose(values, exact, rtol=1e-12)


@pytest.mark.parametrize("shape", [-0.3, -1e-10, 0.0, 1e-4, 0.2])
def test_values_come_back_from_their_reduced_variates(shape):
    s = np.linspace(-2.0, 30.0, 33)  # beyond the bound of a negative shape, too
    np.testing.assert_allclose(
        standard_value(reduced_variate(s, shape), np.float64(shape)), s, rtol=1e-6, atol=1e-9
    )
