import numpy as np
import pytest
from scipy import stats

from assess.updating.profile_locals import (
    Population,
    ProfileData,
    local_values,
    score_names,
    scores_of,
)

# Two places; the first has two profiles, the second one.
BY_PLACE = np.array([[1.0, 0.0], [1.0, 0.0], [0.0, 1.0]])
PRECISION = np.array([[[60.0, 25.0], [25.0, 30.0]], [[20.0, 8.0], [8.0, 45.0]],
                      [[5.0, -1.0], [-1.0, 2.0]]])  # fmt: skip
BEST = np.array([[0.9, 2.0], [0.7, 1.5], [1.4, 3.0]])
OFFSET = (np.array([0.1, 0.0, -0.05]), np.array([-1.2, -1.6, -1.4]))
ZONE = Population(
    np.array([0.7, 0.7]), np.array([3.4, 3.4]), np.array([0.3, 0.3]), np.array([0.5, 0.5])
)


def data(weight=1.0):
    linear = np.einsum("vij,vj->vi", PRECISION, BEST)
    parts = np.stack([PRECISION[:, 0, 0], PRECISION[:, 0, 1], PRECISION[:, 1, 1]])
    return ProfileData(weight * parts, weight * linear.T, BY_PLACE)


def test_with_normal_profiles_scores_drop_out_and_the_marginal_likelihood_is_left():
    # Profiles that are exactly normal: N(best; x + offset, 1 / precision), x integrated out by
    # the joint covariance of all profiles of a place.
    rng = np.random.default_rng(1)
    for scores in rng.standard_normal((4, 2, 2)):
        found = local_values(data(), ZONE, (scores[0], scores[1]), OFFSET)
        for place, visits in enumerate(([0, 1], [2])):
            x = np.array([found.log_surface[place], found.log_diffusion[place]])
            total = found.log_weight[place]
            for v in visits:
                shift = np.array([OFFSET[0][v], OFFSET[1][v]])
                known = stats.multivariate_normal(x + shift, np.linalg.inv(PRECISION[v]))
                total += known.logpdf(BEST[v])
            count = len(visits)
            mean = np.concatenate([[0.7, 3.4] + np.array([OFFSET[0][v], OFFSET[1][v]])
                                   for v in visits])  # fmt: skip
            covariance = np.kron(np.ones((count, count)), np.diag([0.09, 0.25]))
            for k, v in enumerate(visits):
                covariance[2 * k : 2 * k + 2, 2 * k : 2 * k + 2] += np.linalg.inv(PRECISION[v])
            joint = stats.multivariate_normal(mean, covariance)
            assert total == pytest.approx(joint.logpdf(BEST[visits].ravel()), rel=1e-10)


def test_standard_normal_scores_give_the_posterior_of_a_normal_model():
    scores = np.random.default_rng(2).standard_normal((2, 100_000, 2))
    zone = Population(*(np.broadcast_to(part, (100_000, 2)) for part in ZONE))
    found = local_values(data(), zone, (scores[0], scores[1]), OFFSET)
    prior = np.diag([1.0 / 0.09, 1.0 / 0.25])
    shift = np.array([OFFSET[0][2], OFFSET[1][2]])
    covariance = np.linalg.inv(prior + PRECISION[2])
    mean = covariance @ (prior @ [0.7, 3.4] + PRECISION[2] @ (BEST[2] - shift))
    drawn = np.stack([found.log_surface[:, 1], found.log_diffusion[:, 1]])
    np.testing.assert_allclose(drawn.mean(axis=1), mean, atol=5e-3)
    np.testing.assert_allclose(np.cov(drawn), covariance, rtol=0.02, atol=1e-3)


def test_without_profiles_scores_are_those_of_the_zone():
    scores = (np.array([0.3, -2.0]), np.array([1.1, 0.4]))
    found = local_values(data(0.0), ZONE, scores, OFFSET)
    np.testing.assert_allclose(found.log_surface, 0.7 + 0.3 * scores[0], rtol=1e-14)
    np.testing.assert_allclose(found.log_diffusion, 3.4 + 0.5 * scores[1], rtol=1e-14)
    assert not found.log_weight.any()


def test_scores_are_stacked_in_the_order_of_places():
    names = [score_names("kind", place) for place in ("a", "b")]
    values = {name: np.array([float(k)]) for k, name in enumerate(sum(names, ()))}
    surface, diffusion = scores_of("kind", ("a", "b"), values)
    np.testing.assert_array_equal(surface, [[0.0, 2.0]])
    np.testing.assert_array_equal(diffusion, [[1.0, 3.0]])
