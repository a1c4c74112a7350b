"""Load effects as the case file states them."""

import numpy as np
import pytest
from pydantic import ValidationError

from assess.reliability.loads import AnnualMaximumEffect, Loads, permanent_effect


def maximum(**said) -> AnnualMaximumEffect:
    return AnnualMaximumEffect.model_validate(said)


def test_permanent_effects_add_up_as_independent_normals():
    loads = Loads.model_validate(
        {
            "permanent": [
                {"name": "self weight", "effect": "560 kN*m", "V": 0.05},
                {"name": "surfacing", "effect": "200 kN*m", "V": 0.10},
            ],
            "variable": {"annual_maximum": {"mean": "440 kN*m", "V": 0.1}},
        }
    )
    mean, sd = permanent_effect(loads)
    assert mean == pytest.approx(760e6)
    assert sd == pytest.approx(np.hypot(28e6, 20e6))


def test_permanent_effects_grow_with_what_they_are_proportional_to():
    loads = Loads.model_validate(
        {
            "permanent": [
                {"name": "self weight", "effect": "560 kN*m", "V": 0.05, "proportional_to": ["c"]},
                {"name": "fill", "effect": "200 kN*m", "V": 0.1, "proportional_to": ["c", "t"]},
                {"name": "parapets", "effect": "30 kN*m", "V": 0.02},
            ],
            "variable": {"annual_maximum": {"mean": "440 kN*m", "V": 0.1}},
        }
    )
    density, thickness = np.array([[1.0], [1.1]]), np.array([[1.0], [0.8]])
    mean, sd = permanent_effect(loads, {"c": density, "t": thickness})
    # By hand: 560 + 200 + 30; 560 x 1.1 + 200 x 1.1 x 0.8 + 30, and 5, 10 and 2 % of these.
    np.testing.assert_allclose(mean, [[790e6], [822e6]])
    expected = [np.sqrt(28.0**2 + 20.0**2 + 0.6**2), np.sqrt(30.8**2 + 17.6**2 + 0.6**2)]
    np.testing.assert_allclose(sd[:, 0], 1e6 * np.array(expected))


def test_no_permanent_load_is_nothing():
    loads = Loads.model_validate({"variable": {"annual_maximum": {"mean": "1 kN*m", "V": 0.1}}})
    assert permanent_effect(loads) == (0.0, 0.0)


def test_mean_and_return_period_say_the_same_load():
    # Gumbel, V 0.2, mean 100: 98 % fractile 151.8455, from the formulas of EN 1990 table C3,
    # recomputed independently.
    by_mean = maximum(mean="100 kN*m", V=0.2).gumbel()
    by_value = maximum(value="151.8455 kN*m", return_period="50 yr", V=0.2).gumbel()
    assert by_mean == pytest.approx((90.998936e6, 15.593936e6), rel=1e-6)
    assert by_value == pytest.approx(by_mean, rel=1e-5)


@pytest.mark.parametrize(
    "said",
    [
        {"V": 0.1},
        {"V": 0.1, "value": "3 kN*m"},
        {"V": 0.1, "return_period": "50 yr"},
        {"V": 0.1, "mean": "3 kN*m", "value": "3 kN*m", "return_period": "50 yr"},
    ],
)
def test_exactly_one_way_to_say_a_maximum(said):
    with pytest.raises(ValidationError, match="takes one way to be said"):
        maximum(**said)


@pytest.mark.parametrize("growth", [0.1, -0.1, 3.0])
def test_growth_is_a_small_fraction(growth):
    with pytest.raises(ValidationError, match="growth is out of range"):
        maximum(mean="3 kN*m", V=0.1, growth=growth)


def test_units_other_than_moments_are_refused():
    with pytest.raises(ValidationError, match="does not convert to N"):
        maximum(mean="3 kN", V=0.1)
