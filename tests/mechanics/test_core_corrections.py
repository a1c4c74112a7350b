import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from assess.mechanics.core_corrections import MOISTURES, correction

ACI = {"source": "ACI 214.4R-10 (from memory)", "place": "table 9.1"}


@pytest.mark.published(**ACI)
@pytest.mark.parametrize(
    ("moisture", "ratio", "length_factor"),
    [
        ("as received", 1.0, 0.8829),
        ("as received", 1.25, 0.9341),
        ("as received", 1.5, 0.9707),
        ("as received", 1.75, 0.9927),
        ("as received", 2.0, 1.0),
        ("soaked", 1.0, 0.8959),
        ("air dried", 1.0, 0.8689),
    ],
)
def test_length_factor(moisture, ratio, length_factor):  # coefficients from memory
    moisture_factor = {"as received": 1.00, "soaked": 1.09, "air dried": 0.96}[moisture]
    core = correction(30.0, 100.0, 100.0 * ratio, moisture, drilling_damage=False)
    assert float(core.factor) == pytest.approx(length_factor * moisture_factor, abs=6e-5)
    assert float(core.V_length) == pytest.approx(0.025 * (2 - ratio) ** 2, abs=1e-12)


@pytest.mark.published(**ACI)
@pytest.mark.parametrize(
    ("diameter", "factor", "variation"),
    [(50.0, 1.06, 0.118), (100.0, 1.00, 0.0), (150.0, 0.98, 0.018)],
)
def test_diameter_factor(diameter, factor, variation):  # values from memory
    core = correction(30.0, diameter, 2 * diameter, "as received", drilling_damage=False)
    assert float(core.factor) == pytest.approx(factor, abs=1e-12)
    assert float(core.V_diameter) == pytest.approx(variation, abs=1e-12)


def test_diameter_factor_between_is_linear():
    core = correction(30.0, 75.0, 150.0, "as received", drilling_damage=False)
    assert float(core.factor) == pytest.approx(1.03)
    assert float(core.V_diameter) == pytest.approx(0.059)


@pytest.mark.published(**ACI)
@pytest.mark.parametrize(
    ("moisture", "factor"), [("as received", 1.00), ("soaked", 1.09), ("air dried", 0.96)]
)
def test_moisture_and_damage(moisture, factor):  # values from memory
    sound = correction(30.0, 100.0, 200.0, moisture, drilling_damage=False)
    damaged = correction(30.0, 100.0, 200.0, moisture)
    assert float(sound.factor) == pytest.approx(factor)
    assert float(damaged.factor) == pytest.approx(1.06 * factor)
    assert (float(damaged.V_moisture), float(damaged.V_damage)) == (0.025, 0.025)
    assert float(sound.V_damage) == 0.0


def test_worked_example():
    # 30 * 0.973975 * 1.00 * 1.09 * 1.06 = 33.7599 MPa; sqrt(0.625² + 2.5² + 2.5²) = 3.5904 %.
    core = correction(30.0, 100.0, 150.0, "soaked")
    assert float(30.0 * core.factor) == pytest.approx(33.7599, abs=6e-5)
    assert float(core.V_total) == pytest.approx(0.035904, abs=6e-7)


@pytest.mark.published(source="ASTM C42 (from memory)", place="length correction factors")
@pytest.mark.parametrize(
    ("ratio", "factor"), [(1.75, 0.98), (1.50, 0.96), (1.25, 0.93), (1.00, 0.87)]
)
def test_length_factor_is_near_that_of_astm(ratio, factor):
    # Another document's rule for the same effect, values from memory: agreement within 0.015.
    core = correction(30.0, 100.0, 100.0 * ratio, "as received", drilling_damage=False)
    assert float(core.factor) == pytest.approx(factor, abs=0.015)


def test_arrays_of_mixed_moisture():
    core = correction([20.0, 40.0, np.nan], 100.0, [100.0, 150.0, 150.0], list(MOISTURES))
    alone = correction(40.0, 100.0, 150.0, "soaked")
    assert core.factor.shape == core.V_damage.shape == (3,)
    assert core.factor[1] == pytest.approx(float(alone.factor))
    assert np.isnan(core.factor[2])


@given(st.floats(5.0, 80.0), st.floats(50.0, 150.0), st.sampled_from(MOISTURES))
def test_length_just_above_two_counts_as_two(strength, diameter, moisture):
    two = correction(strength, diameter, 2.0 * diameter, moisture)
    more = correction(strength, diameter, 2.09 * diameter, moisture)
    assert float(more.factor) == pytest.approx(float(two.factor), rel=1e-12)
    assert float(more.V_length) == pytest.approx(0.0, abs=1e-15)


def test_refuses_what_the_table_does_not_cover():
    with pytest.raises(ValueError, match="length over diameter must be from 1 to 2.1, got 0.9"):
        correction(30.0, 100.0, 90.0, "soaked")
    with pytest.raises(ValueError, match="length over diameter must be from 1 to 2.1, got 2.5"):
        correction(30.0, 100.0, [150.0, 250.0], "soaked")
    with pytest.raises(
        ValueError, match=r"core diameter \[mm\] must be from 47.5 to 157.5, got 25"
    ):
        correction(30.0, 25.0, 50.0, "soaked")
    with pytest.raises(ValueError, match="'wet'; known: as received, soaked, air dried"):
        correction(30.0, 100.0, 150.0, "wet")
