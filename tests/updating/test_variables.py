import numpy as np
import pytest
from scipy import stats

from assess.probability.marginals import make_marginal
from assess.updating.variables import JointPrior, LevelGivenScatter, Variable

HEAD = ("words", "$x$", "-", "z", "source")


def _prior(score: float = 0.0) -> JointPrior:
    scatter = make_marginal("scaled inverse chi", parameters={"scale": 0.1, "degrees": 12.0})
    variables = (
        Variable("z.scatter", *HEAD, scatter),
        LevelGivenScatter("z.level", *HEAD, 3.5, 4.0, "z.scatter"),
        Variable("z.load", *HEAD, make_marginal("gumbel", mean=10.0, sd=2.0)),
    )
    correlation = np.eye(3)
    correlation[0, 2] = correlation[2, 0] = score
    return JointPrior(variables, correlation)


def test_values_follow_their_scores():
    prior = _prior(0.5)
    z = np.array([0.3, -1.2, 0.8])
    scatter = np.sqrt(stats.invgamma(6.0, scale=0.06).ppf(stats.norm.cdf(0.3)))
    load_score = 0.5 * 0.3 + np.sqrt(0.75) * 0.8
    beta = 2.0 * np.sqrt(6.0) / np.pi
    load = stats.gumbel_r(10.0 - np.euler_gamma * beta, beta).ppf(stats.norm.cdf(load_score))
    expected = [scatter, np.exp(3.5 + scatter * -1.2 / 2.0), load]
    np.testing.assert_allclose(prior.physical(z), expected, rtol=1e-6)
    assert prior.names == ("z.scatter", "z.level", "z.load")
    assert not prior.independent
    assert _prior().independent


def test_shapes_are_kept():
    z = np.random.default_rng(1).standard_normal((2, 5, 3))
    whole = _prior(0.5).physical(z)
    assert whole.shape == z.shape
    np.testing.assert_allclose(whole[1, 3], _prior(0.5).physical(z[1, 3]))


def test_level_is_that_of_the_normal_gamma_prior():
    # JCSS PMC part 3.0, annex A: marginally ln level is Student with nu degrees of freedom,
    # scale s/sqrt(n).
    draws = _prior().physical(np.random.default_rng(2).standard_normal((20_000, 3)))
    student = (np.log(draws[:, 1]) - 3.5) / (0.1 / np.sqrt(4.0))
    assert stats.kstest(student, stats.t(12.0).cdf).pvalue > 0.01


def test_graph_and_numbers_agree():
    tensor = pytest.importorskip("pytensor.tensor")
    scores = [tensor.dscalar(f"s{i}") for i in range(3)]
    values = _prior().values(scores)
    at = dict(zip(scores, (0.4, -0.7, 1.1), strict=True))
    numbers = _prior().values([np.float64(v) for v in at.values()])
    for name, value in values.items():
        found = value.eval(at, on_unused_input="ignore", mode="FAST_COMPILE")
        assert found == pytest.approx(float(numbers[name]), rel=1e-9)
