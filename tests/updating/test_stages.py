import numpy as np
import pytest

from assess.errors import NotConvergedError
from assess.updating import stages
from assess.updating.sampling import Chains, Settings
from assess.updating.stages import posterior_draws, prior_draws, stage_list

USED = ("deck.concrete_mean", "deck.cover_mean", "deck.onset")
SETTINGS = Settings(4, 500, 400, 0.9, 20)


class _Scripted:
    """A sampler that gives what it is told, and keeps what it was asked."""

    name = "scripted"

    def __init__(self, variables, divergences):
        self.variables, self.divergences, self.asked = variables, list(divergences), []

    def sample(self, stage, settings, progress):
        self.asked.append((stage, settings))
        shape = (settings.chains, settings.draws, self.variables)
        whitened = np.random.default_rng(settings.seed).standard_normal(shape)
        return Chains(whitened, np.zeros(shape[:2]), self.divergences.pop(0))


def _run(monkeypatch, case, spec, divergences, **options):
    scripted = _Scripted(len(spec.prior.names), divergences)
    monkeypatch.setattr(stages, "compile_sampler", lambda *_: scripted)
    told = []
    done = list(
        posterior_draws(case, spec, SETTINGS, USED, lambda *said: told.append(said), **options)
    )
    return scripted, done, told


def test_stages_in_order(example_case):
    assert stage_list(example_case) == [
        ("prior", ""),
        ("first", "2010-06-01"),
        ("second", "2020-06-01"),
    ]


def test_prior_draws_are_drawn_directly(example_spec):
    draws = prior_draws(example_spec, SETTINGS, USED)
    assert draws.chains == 4
    assert draws.physical.shape == (4, 500, len(example_spec.prior.names))
    assert draws.diagnostics.passed
    again = prior_draws(example_spec, SETTINGS, USED)
    np.testing.assert_array_equal(draws.physical, again.physical)
    values = draws.values()
    np.testing.assert_array_equal(
        values["deck.onset"].reshape(4, 500),
        draws.physical[..., example_spec.prior.names.index("deck.onset")],
    )


def test_good_chains_are_taken_at_once(monkeypatch, example_case, example_spec):
    scripted, done, told = _run(monkeypatch, example_case, example_spec, [0, 0])
    assert [stage for stage, _ in scripted.asked] == [1, 2]
    assert [(d.name, d.date, d.number, d.retried) for d in done] == [
        ("first", "2010-06-01", 1, False),
        ("second", "2020-06-01", 2, False),
    ]
    assert scripted.asked[0][1].seed != scripted.asked[1][1].seed
    assert told[0] == ("compiling the model", 0.0)
    assert told[-1] == ("sampling second", 1.0)


def test_a_failed_stage_is_sampled_once_more_and_harder(monkeypatch, example_case, example_spec):
    scripted, done, _ = _run(monkeypatch, example_case, example_spec, [3, 0, 0])
    (_, first), (_, second) = scripted.asked[:2]
    assert second.target_accept == 0.99
    assert second.tune == 2 * first.tune
    assert second.seed != first.seed
    assert [d.retried for d in done] == [True, False]
    assert done[0].diagnostics.passed


def test_a_stage_that_fails_twice_stops_the_run(monkeypatch, example_case, example_spec):
    with pytest.raises(NotConvergedError, match="2 divergent transitions"):
        _run(monkeypatch, example_case, example_spec, [3, 2])


def test_unless_that_is_accepted(monkeypatch, example_case, example_spec):
    _, done, _ = _run(monkeypatch, example_case, example_spec, [3, 2, 0], accept_unconverged=True)
    assert [d.diagnostics.passed for d in done] == [False, True]
    assert done[0].divergences == 2


def test_without_surveys_nothing_is_compiled(monkeypatch, make_case):
    from assess.updating.model import specify
    from tests.verification import cases

    case = make_case(cases.base())
    _, done, told = _run(monkeypatch, case, specify(case), [])
    assert done == []
    assert told == []


def test_surveys_sharpen_what_they_measure(
    monkeypatch, example_case, example_spec, example_sampler
):
    monkeypatch.setattr(stages, "compile_sampler", lambda *_: example_sampler)
    found = [
        prior_draws(example_spec, SETTINGS, USED),
        *posterior_draws(example_case, example_spec, SETTINGS, USED, lambda *_: None),
    ]
    assert [d.name for d in found] == ["prior", "first", "second"]
    assert all(d.diagnostics.passed for d in found)
    for name in ("deck.concrete_mean", "deck.cover_mean"):
        prior, first, second = (d.values()[name].std() for d in found)
        assert first < 0.9 * prior
        assert second < 1.1 * first
    assert found[2].log_likelihood.std() > 0.0
    # Cover and onset depend on each other in the prior, and do after the surveys.
    values = found[2].values()
    assert np.corrcoef(values["deck.onset"], values["deck.cover_mean"])[0, 1] > 0.1
