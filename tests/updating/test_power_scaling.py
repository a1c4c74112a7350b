"""Power scaling on posteriors whose dependence on prior and data is known in closed form."""

import numpy as np
import pytest

from assess.probability.marginals import make_marginal
from assess.updating.power_scaling import power_scaling
from assess.updating.sampling import diagnose
from assess.updating.stages import StageDraws
from assess.updating.variables import JointPrior, Variable

NAMES = ("deck.a", "deck.b")
STANDARD = make_marginal("normal", mean=0.0, sd=1.0)
PRIOR = JointPrior(
    tuple(Variable(name, name, "", "-", "deck", "test", STANDARD) for name in NAMES), np.eye(2)
)


def _stage(measured: float, error: float) -> StageDraws:
    """Posterior of two standard normals of which the first was measured once."""
    rng = np.random.default_rng(1)
    precision = 1.0 + error**-2.0
    first = measured * error**-2.0 / precision + rng.standard_normal((4, 1000)) / np.sqrt(precision)
    draws = np.stack([first, rng.standard_normal((4, 1000))], axis=-1)
    log_likelihood = -0.5 * ((measured - first) / error) ** 2
    judged = diagnose(draws, NAMES, NAMES, 0)
    return StageDraws(
        "after 2020", "2020-01-01", 1, NAMES, draws, draws, log_likelihood, 0, False, judged
    )


def _found(measured: float, error: float):
    return {item.variable: item for item in power_scaling(_stage(measured, error), PRIOR, NAMES)}


def test_data_far_from_the_prior_conflict_with_it():
    found = _found(measured=6.0, error=1.0)
    assert found["deck.a"].conflict
    assert not found["deck.b"].conflict


def test_data_that_say_little_leave_the_prior_to_decide():
    found = _found(measured=0.0, error=20.0)
    assert found["deck.a"].rests_on_prior
    assert found["deck.b"].rests_on_prior


def test_many_exact_data_outweigh_the_prior():
    found = _found(measured=0.5, error=0.02)["deck.a"]
    assert found.data > 0.05 > found.prior


def test_the_sensitivity_is_that_of_the_normal_in_closed_form():
    # Raising the prior N(0, 1) to the power alpha gives precision alpha + 1 and mean
    # m / (alpha + 1): the measure grows with the shift of the mean in standard deviations.
    near, far = _found(1.0, 1.0)["deck.a"], _found(4.0, 1.0)["deck.a"]
    assert far.prior > 2.0 * near.prior


def test_the_prior_itself_has_nothing_to_compare():
    stage = _stage(0.0, 1.0)
    none = StageDraws(
        "prior", "", 0, NAMES, stage.whitened, stage.physical, 0.0 * stage.log_likelihood, 0,
        False, stage.diagnostics,
    )  # fmt: skip
    assert power_scaling(none, PRIOR, NAMES) == ()


def test_only_the_variables_asked_for_are_looked_at():
    found = power_scaling(_stage(1.0, 1.0), PRIOR, ("deck.b",))
    assert [item.variable for item in found] == ["deck.b"]
    assert found[0].data == pytest.approx(0.0, abs=0.03)
