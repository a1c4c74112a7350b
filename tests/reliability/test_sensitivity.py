"""Sensitivity factors of linear limit states, whose direction cosines are known."""

from types import SimpleNamespace

import numpy as np
import pytest

import assess.reliability.sensitivity as sensitivity
from assess.reliability.importance import Problem
from assess.reliability.lifetime import integrate
from assess.reliability.sensitivity import VARIABLE_LOAD, sensitivity_factors


def found(monkeypatch, weights, common=None, pull=(), mean=8.0, scale=0.02):
    """Factors for margin ``mean + weights z + pull common`` and a Gumbel load of some scale."""
    weights = np.asarray(weights, dtype=float)
    common = {} if common is None else common
    draws = len(next(iter(common.values()))) if common else 200
    shift = sum((w * c for w, c in zip(pull, common.values(), strict=True)), np.zeros(draws))

    def log_hazard(z, chosen, which):
        margin = mean + z @ weights + shift[chosen][:, None]
        return np.repeat((-margin / scale)[..., None], len(which), axis=-1)

    names = {f"z{i}": f"group {i}" for i in range(len(weights))}
    monkeypatch.setattr(sensitivity, "dimensions", lambda _: names)
    state = SimpleNamespace(common=common)
    sample = integrate(
        Problem(log_hazard, len(weights), draws, 1), chains=4, tolerance=0.005, seed=1
    ).sample
    return sensitivity_factors(state, sample, year=0)


def test_independent_normals_have_their_direction_cosines(monkeypatch):
    weights = np.array([2.0, -1.0, 0.5])
    factors = found(monkeypatch, weights)
    expected = np.abs(weights) / np.linalg.norm(weights)
    for i in range(3):
        assert factors[f"group {i}"] == pytest.approx(expected[i], abs=0.02)
    assert factors[VARIABLE_LOAD] < 0.06  # its scale is hardly any
    assert list(factors) == ["group 0", "group 1", "group 2", VARIABLE_LOAD]


def test_a_load_that_varies_takes_its_share(monkeypatch):
    quiet = found(monkeypatch, [1.0], mean=8.0, scale=0.05)
    lively = found(monkeypatch, [1.0], mean=8.0, scale=1.0)
    assert lively[VARIABLE_LOAD] > 0.8 > quiet[VARIABLE_LOAD]
    assert sum(alpha**2 for alpha in lively.values()) == pytest.approx(1.0)


def test_common_variables_count_by_their_names(monkeypatch):
    rng = np.random.default_rng(1)
    common = {"deck.onset": rng.standard_normal(4000), "deck.current": rng.standard_normal(4000)}
    factors = found(monkeypatch, [1.0], common, pull=(1.0, 0.5), mean=4.5)
    norm = np.sqrt(1.0 + 1.0 + 0.25)
    assert factors["onset of corrosion"] == pytest.approx(1.0 / norm, abs=0.04)
    assert factors["corrosion rate"] == pytest.approx(0.5 / norm, abs=0.04)
    assert factors["group 0"] == pytest.approx(1.0 / norm, abs=0.04)


def test_correlated_common_variables_share_what_they_have_together(monkeypatch):
    # Margin g = a x + b y with correlation r: the share of x is a (a + r b) / var, of y alike.
    rng = np.random.default_rng(1)
    x = rng.standard_normal(4000)
    r = 0.6
    y = r * x + np.sqrt(1.0 - r * r) * rng.standard_normal(4000)
    factors = found(
        monkeypatch, [1.0], {"deck.onset": x, "deck.current": y}, pull=(0.8, 0.4), mean=4.8
    )
    variance = 1.0 + 0.8**2 + 0.4**2 + 2.0 * r * 0.8 * 0.4
    assert factors["onset of corrosion"] ** 2 == pytest.approx(
        0.8 * (0.8 + r * 0.4) / variance, abs=0.05
    )
    assert factors["corrosion rate"] ** 2 == pytest.approx(
        0.4 * (0.4 + r * 0.8) / variance, abs=0.05
    )


def test_constants_have_no_share(monkeypatch):
    rng = np.random.default_rng(1)
    common = {"deck.onset": rng.standard_normal(500), "deck.cover_mean": np.full(500, 40.0)}
    factors = found(monkeypatch, [1.0], common, pull=(1.0, 0.0), mean=4.0)
    assert "cover and depth" not in factors


def test_quantities_and_deviations_count_to_what_they_act_on(monkeypatch):
    rng = np.random.default_rng(1)
    names = {
        "quantity.concrete": "permanent load",
        "deck.depth_deviation": "cover and depth",
        "deck.width_deviation": "dimensions",
        "steel.main.scatter": "steel strength",
    }
    common = {name: rng.standard_normal(4000) for name in names}
    factors = found(monkeypatch, [1.0], common, pull=(0.8, 0.6, 0.4, 0.5), mean=4.5)
    norm = np.sqrt(1.0 + 0.64 + 0.36 + 0.16 + 0.25)
    for group, pull in zip(names.values(), (0.8, 0.6, 0.4, 0.5), strict=True):
        assert factors[group] == pytest.approx(pull / norm, abs=0.05)
