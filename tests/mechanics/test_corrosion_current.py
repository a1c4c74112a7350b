import numpy as np
import pytest

from assess.mechanics.corrosion_current import temperature_factor


@pytest.mark.published(
    source="DuraCrete BE95-1347/R9 (2000), from memory", place="i(T) = i(20) [1 + K (T - 20)]"
)
@pytest.mark.parametrize(
    ("temperature", "factor"), [(0.0, 0.5), (10.0, 0.75), (20.0, 1.0), (30.0, 1.73)]
)
def test_temperature_factor(temperature, factor):
    # By hand: K = 0.025 below 20 °C, 0.073 above, both from memory.
    assert temperature_factor(temperature) == pytest.approx(factor, rel=1e-12)


def test_warmer_concrete_corrodes_faster():
    assert np.all(np.diff(temperature_factor(np.linspace(-10.0, 50.0, 61))) > 0.0)
