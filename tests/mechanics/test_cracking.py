"""Cracks along bars: published formulas, recomputed table, inverses."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from assess.mechanics import cracking

# Recomputed from w = 0.0575 (dAs - dAs0) and x0 = 7.53 + 9.32 c/phi micrometre in another
# program, to the digits shown; the formulas themselves are from memory.
# diameter, cover [mm], x0 [µm], dAs0 [mm²] and dAs at w = 0.5 mm [mm²], for alpha 2, 4, 8
TABLE = [
    (16, 30, 25.005, (1.2549, 2.5059, 4.9961), (9.9506, 11.2016, 13.6918)),
    (16, 48, 35.490, (1.7800, 3.5520, 7.0724), (10.4756, 12.2477, 15.7680)),
    (12, 16, 19.957, (0.7511, 1.4997, 2.9894), (9.4467, 10.1953, 11.6850)),
    (20, 40, 26.170, (1.6422, 3.2800, 6.5428), (10.3378, 11.9757, 15.2385)),
]


@pytest.mark.published(
    source="Alonso et al., Mater. Struct. 31 (1998) 435-441 (from memory)",
    place="x0 = 7.53 + 9.32 c/phi micrometre",
)
@pytest.mark.parametrize(("diameter", "cover", "x0"), [row[:3] for row in TABLE])
def test_loss_that_cracks_the_cover(diameter, cover, x0):
    assert 1e3 * cracking.cracking_penetration(diameter, cover) == pytest.approx(x0, abs=6e-4)


@pytest.mark.published(
    source="Vidal, Castel & Francois, Cem. Concr. Res. 34 (2004) 165-174 (from memory)",
    place="w = 0.0575 (dAs - dAs0), alpha of 2, 4 and 8",
)
@pytest.mark.parametrize(("diameter", "cover", "x0", "first", "half_millimetre"), TABLE)
def test_area_lost_at_cracking_and_at_half_a_millimetre(
    diameter, cover, x0, first, half_millimetre
):
    for concentration, start, later in zip((2.0, 4.0, 8.0), first, half_millimetre, strict=True):
        found = cracking.area_loss(diameter, 1e-3 * x0, concentration)
        assert found == pytest.approx(start, abs=1e-4)
        x = cracking.penetration_from_width(diameter, cover, 0.5, concentration)
        assert cracking.area_loss(diameter, x, concentration) == pytest.approx(later, abs=1e-4)


def test_uniform_attack_takes_a_ring_of_the_bar():
    # A ring: the area of the sound circle less that of the smaller one.
    ring = np.pi / 4 * (16.0**2 - (16.0 - 2 * 0.7) ** 2)
    assert cracking.area_loss(16.0, 0.7, cracking.UNIFORM) == pytest.approx(ring, rel=1e-12)


@given(
    st.floats(6, 40), st.floats(10, 80), st.floats(2, 8), st.floats(0.0, 0.98)
)  # share of the radius that the relation can lose
def test_width_and_loss_are_inverses(diameter, cover, concentration, share):
    first = cracking.cracking_penetration(diameter, cover)
    x = first + share * (diameter / concentration - first)
    width = cracking.crack_width(diameter, cover, x, concentration)
    assert width >= -1e-12
    assert width < cracking.widest_crack(diameter, cover, concentration)
    back = cracking.penetration_from_width(diameter, cover, width, concentration)
    assert back == pytest.approx(x, rel=1e-6)


def test_a_crack_of_no_width_has_the_loss_that_cracks_whatever_the_concentration():
    for concentration in (2.0, 5.0, 8.0):
        x = cracking.penetration_from_width(16.0, 30.0, 0.0, concentration)
        assert x == pytest.approx(cracking.cracking_penetration(16.0, 30.0), rel=1e-9)


def test_formulas_accept_pytensor_variables():
    pt = pytest.importorskip("pytensor.tensor")
    x = pt.dscalar("x")
    width = cracking.crack_width(16.0, 30.0, x, 4.0)
    assert width.eval({x: 0.2}) == pytest.approx(cracking.crack_width(16.0, 30.0, 0.2, 4.0))
