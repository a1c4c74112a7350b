"""What a kind of evidence taught: the weights that leave it out, in a conjugate case."""

from dataclasses import replace

import numpy as np
import pytest

from assess.reliability import teaching
from assess.reliability.teaching import kind_weights, taught
from assess.updating.model import specify
from assess.updating.sampling import Settings
from assess.updating.stages import prior_draws
from tests.verification import cases

METER = {"name": "A", "bias": 0, "scatter": "6 mm"}


@pytest.fixture
def known(make_case):
    """A case with one cover reading, and draws of its posterior with the scatter known."""
    entry = {"table": "c.csv", "zone": "deck", "meter": METER}
    case = make_case(
        cases.base(surveys=[{"date": "2020-01-01", "cover": entry}]), {"c.csv": "cover [mm]\n46\n"}
    )
    spec = specify(case)
    draws = prior_draws(spec, Settings(4, 1000, 10, 0.9, 1), ())
    # Prior N(40, 5²), reading N(mean, 8² + 6²): the posterior is normal.
    precision = 1.0 / 25.0 + 1.0 / 100.0
    mean = (40.0 / 25.0 + 46.0 / 100.0) / precision
    physical = draws.physical.copy()
    normal = np.random.default_rng(2).standard_normal(physical.shape[:2])
    physical[..., draws.names.index("deck.cover_mean")] = mean + normal / np.sqrt(precision)
    physical[..., draws.names.index("deck.cover_scatter")] = 8.0
    return spec, replace(draws, physical=physical, number=1)


def test_weights_without_a_kind_lead_back_to_the_prior(known):
    spec, draws = known
    chosen, weights = kind_weights(spec, draws)
    weight = weights["cover"] / weights["cover"].sum()
    cover = draws.values()["deck.cover_mean"][chosen]
    mean = float(weight @ cover)
    assert mean == pytest.approx(40.0, abs=0.6)
    assert np.sqrt(weight @ (cover - mean) ** 2) == pytest.approx(5.0, rel=0.08)
    assert cover.mean() == pytest.approx(41.2, abs=0.4)  # with the reading


def test_a_kind_that_taught_too_much_is_not_reweighted(known, monkeypatch):
    spec, draws = known
    monkeypatch.setattr(teaching, "WORST_SHAPE", -5.0)
    assert kind_weights(spec, draws)[1] == {"cover": None}


def test_what_was_taught_is_the_divergence_of_two_normals():
    # N(1, 0.5²) after N(0, 1): ln 2 + (0.25 + 1)/2 - 1/2 nats (Kullback and Leibler 1951).
    rng = np.random.default_rng(4)
    found = taught("x", rng.standard_normal(40_000), 1.0 + 0.5 * rng.standard_normal(40_000), None)
    assert found.nats == pytest.approx(np.log(2.0) + 0.625 - 0.5, abs=0.03)
    assert found.variance_explained == pytest.approx(0.75, abs=0.02)
