import numpy as np
import pytest

from assess.mechanics import half_cell


@pytest.mark.published(
    source="Reference electrodes in metal corrosion, Int. J. Corros. 2010, 756950",
    place="table 2, potentials against the standard hydrogen electrode",
)
@pytest.mark.parametrize(
    ("electrode", "volt"),
    [("copper sulfate", 0.316), ("calomel", 0.2410), ("silver chloride, saturated KCl", 0.1970)],
)
def test_reference_potentials(electrode, volt):
    assert half_cell.REFERENCE_POTENTIAL[electrode] == pytest.approx(1e3 * volt, abs=0.5)


def test_an_electrode_below_copper_sulfate_reads_less_negative():
    # -100 mV against an electrode at 241 mV is +141 mV against hydrogen, so -175 mV against 316.
    found = half_cell.against_copper_sulfate([-100.0, 0.0], "calomel")
    np.testing.assert_allclose(found, [-175.0, -75.0])
    np.testing.assert_allclose(half_cell.against_copper_sulfate(-100.0, "copper sulfate"), -100.0)


def test_classes_of_astm_c876():  # limits read in a secondary source
    found = half_cell.potential_class([50.0, -199.9, -200.0, -349.9, -350.0, -350.1, -700.0])
    assert found.tolist() == [0, 0, 1, 1, 1, 2, 2]
    assert [half_cell.CLASSES[k] for k in (0, 2)] == ["above -200 mV", "below -350 mV"]
