"""Bending as a limit state: load capacity by hand, options, yearly maxima."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.mechanics.corrosion import pitting_factor_distribution
from assess.reliability.bending import Bending
from assess.reliability.limit_state import Action, Surroundings
from tests.verification import cases

BENDING = Bending()
NONE = {
    "resistance_model": {"mean": 1.0, "V": 0.0001, "source": "test"},
    "load_effect_model": {"mean": 1.0, "V": 0.0001, "source": "test"},
}
STRENGTH, YIELD, COVER = 30.0, 460.0, 40.0
AREA = 7 * np.pi * 32.0**2 / 4.0  # mm²
LEVER = 1000.0 - 40.0 - 10.0 - 16.0  # effective depth of the base case [mm]
PERMANENT = 450e6  # N·mm


def case_of(make_case, *, flange=True, corrosion=None, **section):
    raw = cases.base(corrosion=corrosion is not None)
    member = raw["members"][0]
    member |= {"depth_sd": "0 mm", **NONE, **section}
    if not flange:
        del member["flange"]
    if corrosion is not None:
        raw["zones"]["deck"]["corrosion"] = cases.CORROSION | {"attack": corrosion}
    return make_case(raw, {})


def surroundings(entry, *, onset=None, current=3.0, age=(50.0,), action=None, chance=0.0, pits=0.0):
    def one(value):
        return np.array([[[value]]])

    local = {"strength": one(STRENGTH), "cover": one(COVER)}
    if onset is not None:
        local |= {"onset": one(onset), "current": one(current)}
    names = BENDING.chances(entry)
    score = {name: one(pits if name.startswith("pitting") else chance) for name in names}
    common = {"steel.main": one(YIELD)}
    return Surroundings(local, common, score, np.array(age), action or Action())


def capacity(case, here):
    entry = case.spec.sections()["S1"]
    return BENDING.load_capacity(entry, case.spec, here(entry))[0, 0]


def by_hand(area: float, width: float) -> float:
    """Stress block of EN 1992-1-1, 3.1.7, steel yielding: A f (d - a/2), a = A f / (0.85 f_c b)."""
    force = area * YIELD
    block = force / (0.85 * STRENGTH * width)
    return force * (LEVER - 0.5 * block)


def test_a_sound_rectangle_by_hand(make_case):
    case = case_of(make_case, flange=False)
    found = capacity(case, surroundings)
    assert found[0] == pytest.approx(by_hand(AREA, 320.0) - PERMANENT, rel=1e-4)


def test_a_sound_t_section_has_its_block_in_the_flange(make_case):
    found = capacity(case_of(make_case), surroundings)
    assert AREA * YIELD / (0.85 * STRENGTH * 1800.0) < 180.0
    assert found[0] == pytest.approx(by_hand(AREA, 1800.0) - PERMANENT, rel=1e-4)


def test_uniform_loss_leaves_thinner_bars(make_case):
    case = case_of(make_case, corrosion="uniform")
    found = capacity(case, lambda entry: surroundings(entry, onset=30.0, age=(20.0, 30.0, 50.0)))
    # Faraday: 11.6 µm/yr of radius for each µA/cm² (RILEM TC 154-EMC, rounded).
    radius = 0.0116044 * 3.0 * 20.0
    left = 7 * np.pi * (32.0 - 2.0 * radius) ** 2 / 4.0
    sound = by_hand(AREA, 1800.0) - PERMANENT
    assert found[:2] == pytest.approx([sound, sound], rel=1e-4)
    assert found[2] == pytest.approx(by_hand(left, 1800.0) - PERMANENT, rel=1e-4)


def overlap(radius: float, pit: float) -> float:
    """Area of a circle cut out by a circle of radius ``pit`` about a point of its edge."""

    def height(x):
        # Bar about (radius, 0), pit about the origin: half the height of what they share.
        bar = np.sqrt(max(radius**2 - (x - radius) ** 2, 0.0))
        return 2.0 * min(bar, np.sqrt(max(pit**2 - x**2, 0.0)))

    return integrate.quad(height, 0.0, pit, limit=400)[0]


@pytest.mark.parametrize("score", [-1.0, 2.0])
def test_pits_cut_their_circle_out_of_each_bar(make_case, score):
    case = case_of(make_case, corrosion="pitting")
    found = capacity(case, lambda entry: surroundings(entry, onset=30.0, pits=score))[0]
    location, inverse_scale = pitting_factor_distribution(32.0, 1000.0)
    factor = stats.gumbel_r(location, 1.0 / inverse_scale).ppf(stats.norm.cdf(score))
    pit = factor * 0.0116044 * 3.0 * 20.0
    left = AREA - 7 * overlap(16.0, pit)
    assert found == pytest.approx(by_hand(left, 1800.0) - PERMANENT, rel=3e-4)


@pytest.mark.parametrize(("count", "groups"), [(1, 1), (4, 4), (6, 6), (8, 6), (20, 6)])
def test_bars_share_pits_in_at_most_six_groups(make_case, count, groups):
    bars = {"count": count, "diameter": "25 mm", "steel": "main"}
    case = case_of(make_case, corrosion="pitting", bars=bars, width="900 mm")
    entry = case.spec.sections()["S1"]
    names = [name for name in BENDING.chances(entry) if name.startswith("pitting")]
    assert len(names) == groups


def test_an_arrest_between_two_years_stops_the_loss_there(make_case):
    case = case_of(make_case, corrosion="uniform")
    ages = tuple(np.arange(45.0, 56.0))
    left, arrested, slowed = (
        capacity(case, lambda entry, a=action: surroundings(entry, onset=30.0, age=ages, action=a))
        for action in (Action(), Action(50.0, 1.0), Action(50.0, 0.6))
    )
    np.testing.assert_array_equal(left[:6], arrested[:6])  # up to the age of 50
    np.testing.assert_allclose(arrested[5:], arrested[5])
    assert np.all(np.diff(left) < 0.0)
    assert np.all((slowed[6:] < arrested[6:]) & (slowed[6:] > left[6:]))


def test_model_factors_and_permanent_load_enter_as_stated(make_case):
    factor = {"mean": 1.2, "V": 0.15, "source": "test"}
    case = case_of(make_case, resistance_model=factor)
    entry = case.spec.sections()["S1"]
    mean = capacity(case, surroundings)[0]
    median = 1.2 / np.sqrt(1.0 + 0.15**2)  # lognormal at score 0
    assert mean == pytest.approx(median * by_hand(AREA, 1800.0) - PERMANENT, rel=1e-4)
    # One standard deviation more of permanent load, V 0.05 of 450 kNm.
    here = surroundings(entry)
    here.chance["permanent load"][...] = 1.0  # type: ignore[index]
    heavier = BENDING.load_capacity(entry, case.spec, here)[0, 0, 0]
    assert mean - heavier == pytest.approx(0.05 * PERMANENT, rel=1e-6)


def test_yearly_maxima_grow_from_the_year_of_assessment(make_case):
    loads = cases.base()["members"][0]["loads"]
    loads["variable"]["annual_maximum"] = {"mean": "250 kN*m", "V": 0.12, "growth": 0.02}
    case = case_of(make_case, loads=loads)
    years = np.array([2026.0, 2027.0, 2036.0])
    found = BENDING.annual_maximum(case.spec.sections()["S1"], case.spec, years, {})
    scale = 250e6 * 0.12 * np.sqrt(6.0) / np.pi
    mode = 250e6 - 0.5772156649 * scale
    np.testing.assert_allclose(found.scale, scale)
    np.testing.assert_allclose(found.mode, mode * np.array([1.0, 1.02, 1.2]))


def test_assumptions_name_their_sources(make_case):
    case = case_of(make_case, corrosion="pitting")
    said = " ".join(BENDING.assumptions(case.spec.sections()["S1"], case.spec))
    for words in ("EN 1992-1-1", "Stewart 2004", "Val and Melchers 1997", "V 0.0001 (test)"):
        assert words in said
