import numpy as np
import pytest

from assess.updating.model import build_model
from assess.updating.sampling import NutpieSampler, PymcSampler, Settings, diagnose

NAMES = ("deck.a", "deck.b", "deck.constant")
SETTINGS = Settings(2, 150, 150, 0.9, 11)


def _good(draws=1000):
    chains = np.random.default_rng(1).standard_normal((4, draws, 3))
    chains[..., 2] = 0.15
    return chains


def test_independent_draws_pass():
    found = diagnose(_good(), NAMES, NAMES, 0)
    assert found.passed
    assert found.rhat_max < 1.01
    assert found.ess_bulk_min > 3000.0


def test_a_chain_elsewhere_is_named():
    chains = _good()
    chains[1, :, 1] += 1.0
    found = diagnose(chains, NAMES, NAMES, 0)
    assert found.worst == "deck.b"
    assert len(found.failures) == 1
    assert found.failures[0].startswith("deck.b: R-hat")
    assert found.without_judgement().passed


def test_stuck_chains_fail():
    chains = _good()
    chains[..., 0] = chains[:, :1, 0]  # every chain stays where it began
    assert not diagnose(chains, NAMES, NAMES, 0).passed


def test_slow_chains_fail_by_their_effective_size():
    chains = _good()
    for i in range(1, chains.shape[1]):
        chains[:, i, 0] = 0.99 * chains[:, i - 1, 0] + np.sqrt(1 - 0.99**2) * chains[:, i, 0]
    assert any("bulk ESS" in words for words in diagnose(chains, NAMES, NAMES, 0).failures)


def test_few_draws_fail():
    found = diagnose(_good(80), NAMES, NAMES, 0)
    assert any("below 400" in words for words in found.failures)


def test_divergences_fail():
    assert diagnose(_good(), NAMES, NAMES, 3).failures == ("3 divergent transitions",)


def test_constants_alone_have_nothing_to_converge():
    found = diagnose(_good(), NAMES, ("deck.constant",), 0)
    assert found.passed
    assert found.ess_bulk_min == 4000.0
    assert diagnose(_good(), NAMES, (), 2).failures == ("2 divergent transitions",)


def test_variables_that_no_limit_state_uses_are_not_judged():
    chains = _good()
    chains[1, :, 1] += 5.0
    assert diagnose(chains, NAMES, ("deck.a",), 0).passed


def test_same_seed_same_draws(example_sampler):
    first = example_sampler.sample(1, SETTINGS, lambda _: None)
    again = example_sampler.sample(1, SETTINGS, lambda _: None)
    np.testing.assert_array_equal(first.whitened, again.whitened)
    np.testing.assert_array_equal(first.log_likelihood, again.log_likelihood)
    other = example_sampler.sample(1, Settings(2, 150, 150, 0.9, 12), lambda _: None)
    assert not np.array_equal(first.whitened, other.whitened)


def test_prior_stage_of_the_compiled_model_is_standard_normal(example_sampler):
    # With all surveys switched off the chains sample independent standard normals.
    settings = Settings(2, 500, 300, 0.8, 3)
    chains = example_sampler.sample(0, settings, lambda _: None)
    assert chains.whitened.mean(axis=(0, 1)) == pytest.approx(0.0, abs=0.2)
    assert chains.whitened.std(axis=(0, 1)) == pytest.approx(1.0, abs=0.15)
    np.testing.assert_allclose(chains.log_likelihood, 0.0, atol=1e-8)


def test_log_likelihood_goes_with_the_draws(example_sampler, example_spec):
    from assess.updating.kinds import KINDS

    chains = example_sampler.sample(2, SETTINGS, lambda _: None)
    data = example_spec.data(2)
    for draw in (0, 77):
        physical = example_spec.prior.physical(chains.whitened[1, draw])
        values = dict(zip(example_spec.prior.names, physical, strict=True))
        expected = sum(
            KINDS[key].log_likelihood(rows, values, data) for key, rows in example_spec.rows.items()
        )
        assert chains.log_likelihood[1, draw] == pytest.approx(expected, abs=1e-6)


def test_progress_ends_at_the_whole(example_sampler):
    seen = []
    example_sampler.sample(1, SETTINGS, seen.append)
    assert all(0.0 <= share <= 1.0 for share in seen)
    assert isinstance(example_sampler, NutpieSampler)
    assert "nutpie" in example_sampler.name


@pytest.mark.verify
def test_pymc_alone_agrees(example_spec, example_sampler):
    settings = Settings(2, 400, 400, 0.9, 5)
    slow = PymcSampler(example_spec, build_model(example_spec, 2))
    seen = []
    found = slow.sample(2, settings, seen.append)
    fast = example_sampler.sample(2, Settings(4, 1000, 600, 0.9, 5), lambda _: None)
    assert found.whitened.shape == (2, 400, len(example_spec.prior.names))
    assert seen
    difference = found.whitened.mean(axis=(0, 1)) - fast.whitened.mean(axis=(0, 1))
    assert np.abs(difference).max() < 0.3
    assert found.log_likelihood.mean() == pytest.approx(fast.log_likelihood.mean(), abs=1.0)


def test_an_interrupted_sampling_is_not_taken_for_a_whole_one(example_sampler, monkeypatch):
    import nutpie

    real = nutpie.sample

    def interrupted(*arguments, **settings):
        return real(*arguments, **{**settings, "draws": settings["draws"] // 2})

    monkeypatch.setattr(nutpie, "sample", interrupted)
    with pytest.raises(KeyboardInterrupt):
        example_sampler.sample(1, SETTINGS, lambda _: None)
