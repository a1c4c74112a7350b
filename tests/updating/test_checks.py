"""Predictive checks: drawn bit by bit, the same as all at once."""

from dataclasses import replace

import numpy as np
import pytest

from assess.updating import checks
from assess.updating.checks import data_sets, surprises
from assess.updating.model import specify
from assess.updating.sampling import Settings
from assess.updating.stages import prior_draws
from tests.verification import cases

METER = {"name": "A", "bias": 0, "scatter": "2 mm"}


@pytest.fixture
def known(make_case):
    table = "cover [mm]\n" + "".join(f"{30 + 0.5 * k:.1f}\n" for k in range(40)) + ">60\n"
    entry = {"table": "cover.csv", "zone": "deck", "meter": METER}
    case = make_case(
        cases.base(surveys=[{"date": "2020-01-01", "cover": entry}]), {"cover.csv": table}
    )
    spec = specify(case)
    # The prior stands for both states: what is checked is how the sets are drawn and compared.
    stages = [prior_draws(spec, Settings(2, 500, 10, 0.9, seed), ()) for seed in (1, 2)]
    return case, spec, stages


def test_p_values_are_shares_of_simulated_sets(known):
    case, spec, stages = known
    (found,) = data_sets(case, spec, stages[:1], seed=3)
    values = stages[0].values()
    rng = np.random.default_rng(9)
    mean, scatter = values["deck.cover_mean"], values["deck.cover_scatter"]
    sets = mean[:, None] + np.hypot(scatter, 2.0)[:, None] * rng.standard_normal((1000, 41))
    sets[sets > 60.0] = np.nan
    measured = np.array([30 + 0.5 * k for k in range(40)])
    expected = np.mean(np.nanmean(sets, axis=1) > measured.mean())
    assert found.p_values["prior"]["mean"] == pytest.approx(expected, abs=0.08)
    expected = np.mean(np.nanstd(sets, axis=1) > measured.std())
    assert found.p_values["prior"]["scatter"] == pytest.approx(expected, abs=0.08)
    assert (found.count, found.missing) == (41, 1)
    assert len(found.predictive["prior"]) == checks.SHOWN


def test_memory_bounds_how_many_sets_are_held_not_what_they_say(known, monkeypatch):
    case, spec, stages = known
    (whole,) = data_sets(case, spec, stages[:1], seed=3)
    shapes = []
    simulate = type(whole.kind).simulate

    def watched(self, rows, values, rng):
        found = simulate(self, rows, values, rng)
        shapes.append(found.shape)
        return found

    monkeypatch.setattr(type(whole.kind), "simulate", watched)
    monkeypatch.setattr(checks, "ELEMENTS", 41 * 30)
    monkeypatch.setattr(checks, "MOST_ELEMENTS", 41 * 150)
    (parts,) = data_sets(case, spec, stages[:1], seed=3)
    assert max(shape[0] for shape in shapes) <= 30
    assert sum(shape[0] for shape in shapes) == 150
    for name, value in whole.p_values["prior"].items():
        assert parts.p_values["prior"][name] == pytest.approx(value, abs=0.12)


def test_a_surprise_says_which_way_and_how_rare(known):
    case, spec, stages = known
    (found,) = data_sets(case, spec, stages[:1], seed=3)
    told = replace(
        found,
        stage=1,
        p_values={
            "prior": {"mean": 1.0 - 1 / 130, "scatter": 0.4},
            "after": {"mean": 0.5, "minimum": 0.0},
        },
    )
    (first, second) = surprises([told], ["prior", "after"])
    assert first[0] == "Cover readings, deck, after"
    assert "mean is lower than was to be expected" in first[1]
    assert "1 in 130 simulated surveys had one as low." in first[1]
    assert "minimum is higher than the model gives" in second[1]
    assert "none of 400 simulated surveys had one as high." in second[1]
