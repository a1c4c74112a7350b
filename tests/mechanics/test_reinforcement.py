"""Bars: hardness as strength, deviations of size."""

import numpy as np
import pytest

from assess.mechanics.reinforcement import (
    BAR_AREA_VARIATION,
    BAR_DIAMETER_VARIATION,
    vickers_from_brinell,
    yield_strength_from_hardness,
)


@pytest.mark.published(
    source="Pavlina and Van Tyne, J. Mater. Eng. Perform. 17 (2008) 888-893 (from memory)",
    place="yield strength = -90.7 + 2.876 HV",
)
def test_hardness_indicates_yield_strength_over_the_range_of_the_tests():
    # The abstract, which was read, gives yield strengths from 300 to over 1700 MPa.
    assert yield_strength_from_hardness(136.0) == pytest.approx(300.4, abs=0.1)
    assert yield_strength_from_hardness(623.0) == pytest.approx(1701.0, abs=0.1)


@pytest.mark.published(source="ISO 18265:2013 (from memory)", place="table A.1")
@pytest.mark.parametrize(("brinell", "vickers"), [(95.0, 100.0), (152.0, 160.0), (238.0, 250.0)])
def test_brinell_against_the_conversion_table(brinell, vickers):
    # The table gives whole numbers of Brinell.
    assert vickers_from_brinell(brinell) == pytest.approx(vickers, abs=0.6)


def test_a_diameter_varies_half_as_much_as_its_area():
    # JCSS part 3.2: area with a coefficient of variation of 0.02; by draws.
    diameter = 1.0 + BAR_DIAMETER_VARIATION * np.random.default_rng(1).standard_normal(200_000)
    area = diameter**2
    assert area.std() / area.mean() == pytest.approx(BAR_AREA_VARIATION, rel=0.01)
