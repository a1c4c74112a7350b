"""From draws and a section to the integral's problem: what is conditioned, what is torn apart."""

import numpy as np
import pytest
from scipy import stats

from assess.reliability.limit_state import Action
from assess.reliability.problem import (
    ages,
    build_problem,
    calendar_years,
    common_names,
    dimensions,
    section_state,
    without_dependence,
)

COUNT = 6000


@pytest.fixture(scope="module")
def values(example_spec):
    """Draws of the example's prior, onset and current tied together as by a survey."""
    prior = example_spec.prior
    z = np.random.default_rng(2).standard_normal((COUNT, len(prior.names)))
    return dict(zip(prior.names, prior.physical(z).T, strict=True))


def state(example_case, example_spec, values, section, stage=2):
    entry = example_case.spec.sections()[section]
    return section_state(example_case, example_spec, entry, stage, values)


def local_values(found, seed=3):
    """Draw the section's local variables, one point for each draw."""
    rng = np.random.default_rng(seed)
    drawn = {}
    for model in found.locals:
        z = rng.standard_normal((COUNT, 1, len(model.normals)))
        drawn |= {k: v[:, 0] for k, v in model.values(z, np.arange(COUNT)).items()}
    return drawn


def test_a_section_measured_itself_knows_more_than_its_zone(example_case, example_spec, values):
    measured, other = (state(example_case, example_spec, values, s) for s in ("S1", "S2"))
    assert measured.measured == {"cores", "cover", "section_loss"}
    assert other.measured == frozenset()
    here, zone = local_values(measured), local_values(other)
    assert set(here) == set(zone) == {"strength", "cover", "onset", "current"}
    assert here["cover"].std() < 0.6 * zone["cover"].std()
    # Loss was found at S1 in 2010, 39 years after 1971: no onset later than that.
    assert here["onset"].max() < 39.5
    assert zone["onset"].max() > 39.5


def test_before_the_survey_the_section_is_its_zone(example_case, example_spec, values):
    before = state(example_case, example_spec, values, "S1", stage=0)
    assert before.measured == frozenset()
    a, b = local_values(before), local_values(state(example_case, example_spec, values, "S2", 0))
    for name in a:
        np.testing.assert_array_equal(a[name], b[name])


@pytest.mark.parametrize("section", ["S1", "S2"])
def test_dropping_the_dependence_keeps_every_marginal(example_case, example_spec, values, section):
    kept = state(example_case, example_spec, values, section)
    dropped = without_dependence(kept, seed=5)
    for name, draws in kept.common.items():
        assert np.array_equal(np.sort(draws), np.sort(dropped.common[name]))
    before, after = local_values(kept), local_values(dropped, seed=4)
    for name in ("strength", "cover", "onset", "current"):
        assert stats.ks_2samp(before[name], after[name]).pvalue > 1e-3, name


def test_dropping_the_dependence_drops_it(example_case, example_spec, values):
    kept = state(example_case, example_spec, values, "S1")
    dropped = without_dependence(kept, seed=5)
    pair = ("deck.onset", "deck.current")
    assert abs(stats.spearmanr(*(kept.common[n] for n in pair)).statistic) > 0.2
    assert abs(stats.spearmanr(*(dropped.common[n] for n in pair)).statistic) < 0.05
    before, after = local_values(kept), local_values(dropped, seed=4)
    assert stats.spearmanr(before["onset"], before["current"]).statistic > 0.4
    assert abs(stats.spearmanr(after["onset"], after["current"]).statistic) < 0.05


def test_the_same_seed_drops_the_same_way(example_case, example_spec, values):
    kept = state(example_case, example_spec, values, "S1")
    first, again = (local_values(without_dependence(kept, 5)) for _ in range(2))
    for name in first:
        np.testing.assert_array_equal(first[name], again[name])


def test_normals_are_named_in_the_order_in_which_they_are_used(example_case, example_spec, values):
    found = state(example_case, example_spec, values, "S2")
    names = list(dimensions(found))
    assert names[:4] == ["strength", "cover", "onset", "current"]
    problem = build_problem(example_case, found, Action())
    assert problem.dimension == len(names)
    draws, years = np.arange(3), np.array([0])
    base = problem.log_hazard(np.zeros((3, 1, len(names))), draws, years)
    for name, sign in (("yield strength", -1), ("permanent load", 1), ("resistance model", -1)):
        z = np.zeros((3, 1, len(names)))
        z[..., names.index(name)] = 1.0
        change = problem.log_hazard(z, draws, years) - base
        assert np.all(np.sign(change) == sign), name


def test_ages_and_years_count_from_construction_and_assessment(example_case):
    structure = example_case.spec.structure
    years = calendar_years(example_case)
    assert years.tolist() == list(range(2026, 2036))
    # Built at the start of 1971: at the end of 2026 it is 56 years old.
    assert ages(example_case)[0] == pytest.approx(56.0, abs=0.01)
    assert len(years) == structure.horizon


def test_a_load_factor_scales_mode_and_scale(example_case, example_spec, values):
    found = state(example_case, example_spec, values, "S2")
    whole, half = (build_problem(example_case, found, Action(load_factor=f)) for f in (1.0, 0.5))
    np.testing.assert_allclose(whole.load_ratio, half.load_ratio)
    z = np.random.default_rng(1).standard_normal((4, 2, whole.dimension))
    draws, years = np.arange(4), np.arange(2)
    ratio = whole.load_ratio[years]
    # ln Lambda = u/b - q/b; with f times the load u/b stays and q/b is divided by f.
    spare = ratio - whole.log_hazard(z, draws, years)
    np.testing.assert_allclose(half.log_hazard(z, draws, years), ratio - spare / 0.5, rtol=1e-9)


def test_used_variables_are_those_of_zone_and_steel(example_case):
    entry = example_case.spec.sections()["S1"]
    names = common_names(example_case.spec, entry)
    assert "steel.main" in names
    assert "deck.onset_scatter" in names
    assert not any(name.startswith("cover_meter") for name in names)
