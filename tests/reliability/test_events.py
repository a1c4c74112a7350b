"""What has happened to sections: conditioning of the lifetime integral."""

import numpy as np
import pytest
from scipy import integrate as quadrature
from scipy import stats

from assess.case.events import LoadTest, PastService
from assess.reliability.importance import Problem
from assess.reliability.index import index_from_probability
from assess.reliability.lifetime import integrate
from assess.reliability.limit_state import Action
from assess.reliability.problem import section_state
from assess.reliability.section import Past, Precision, section_reliability

MODE, SCALE, SPREAD = 4.0, 0.5, 1.0


def problem(mean, log_survival=None, draw_weight=None) -> Problem:
    mean = np.asarray(mean, dtype=float)

    def log_hazard(z, chosen, which):
        resistance = mean[chosen][:, None] + SPREAD * z[..., 0]
        return np.repeat(((MODE - resistance) / SCALE)[..., None], len(which), axis=-1)

    survived = None
    if log_survival is not None:

        def survived(z, chosen):
            return log_survival(mean[chosen][:, None] + SPREAD * z[..., 0])

    return Problem(log_hazard, 1, len(mean), 1, log_survival=survived, draw_weight=draw_weight)


def exact(means, weights, log_survival):
    """Ratio of expectations by quadrature."""

    def both(mean, failing):
        def integrand(r):
            past = np.exp(log_survival(np.array(r)))
            fail = -np.expm1(-np.exp((MODE - r) / SCALE)) if failing else 1.0
            return stats.norm.pdf(r, mean, SPREAD) * past * fail

        return quadrature.quad(integrand, mean - 9, mean + 9, points=[MODE, 6.5], limit=400)[0]

    top = sum(w * both(m, True) for m, w in zip(means, weights, strict=True))
    return top / sum(w * both(m, False) for m, w in zip(means, weights, strict=True))


def proof_load(resistance):
    return stats.norm.logcdf((resistance - 6.5) / 0.2)


def twenty_years(resistance):
    return -20.0 * np.exp((MODE - resistance) / SCALE)


@pytest.mark.parametrize("past", [proof_load, twenty_years])
def test_the_past_conditions_the_integral(past):
    means = [6.5, 7.5, 8.5]
    expected = float(index_from_probability(exact(means, [1, 1, 1], past)))
    without = float(index_from_probability(exact(means, [1, 1, 1], lambda r: 0.0 * r)))
    assert expected > without + 0.1
    found = integrate(
        problem(np.repeat(means, 200), past), chains=4, tolerance=0.003, seed=1
    ).annual
    assert found.index[0] == pytest.approx(expected, abs=0.015)
    # What has happened makes weak draws unlikely.
    weight = found.draw_weight.reshape(3, 200).mean(axis=1)
    assert weight[0] < weight[1] < weight[2]
    assert found.draw_weight.mean() == pytest.approx(1.0)


def test_draws_have_the_weights_that_others_give_them():
    means, weights = np.array([6.5, 7.5, 8.5]), np.array([0.2, 1.0, 3.0])
    expected = exact(means, weights, lambda r: 0.0 * r)
    found = integrate(
        problem(np.repeat(means, 200), draw_weight=np.repeat(weights, 200)),
        chains=4, tolerance=0.003, seed=1,
    ).annual  # fmt: skip
    assert found.index[0] == pytest.approx(float(index_from_probability(expected)), abs=0.012)
    # The weakest third of the draws has 0.2 of 4.2 of the weight, 4.8 %.
    group = index_from_probability(found.conditional[:, 0]).reshape(3, 200)
    assert group[0].min() <= found.index_quantile(0.04)[0] <= group[0].max()
    assert group[1].min() <= found.index_quantile(0.06)[0] <= group[1].max()


PRECISION = Precision(4, 0.01, 11)


@pytest.fixture(scope="module")
def state(example_case, example_spec):
    prior = example_spec.prior
    z = np.random.default_rng(2).standard_normal((600, len(prior.names)))
    values = dict(zip(prior.names, prior.physical(z).T, strict=True))
    return section_state(example_case, example_spec, example_case.spec.sections()["S1"], 2, values)


def test_a_heavier_test_teaches_more(example_case, state):
    found = [
        section_reliability(
            example_case,
            state,
            Action(),
            1,
            PRECISION,
            past=Past(
                (LoadTest(kind="load test", section="S1", year=2026, effect=effect, source="test"),)
            ),
        ).annual.index[0]
        for effect in ("100 kN*m", "500 kN*m", "700 kN*m")
    ]
    before = section_reliability(example_case, state, Action(), 1, PRECISION).annual.index[0]
    assert found[0] == pytest.approx(before, abs=0.03)  # no news
    assert before < found[1] < found[2]


def test_years_served_teach_a_little(example_case, state):
    served = PastService.model_validate(
        {"kind": "past service", "section": "S1", "from": 1996, "to": 2025, "source": "test"}
    )
    before = section_reliability(example_case, state, Action(), 1, PRECISION).annual
    after = section_reliability(
        example_case, state, Action(), 1, PRECISION, past=Past((served,))
    ).annual
    assert np.all(after.index > before.index - 3.0 * after.error)
    assert after.index[0] > before.index[0] + 0.03
    assert np.all(after.index < before.index + 0.5)
