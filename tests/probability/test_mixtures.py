import numpy as np
import pytest
from scipy import stats

from assess.probability.mixtures import predictive_fractile


def test_known_parameters_give_the_lognormal_fractile():
    found = predictive_fractile(np.array([30.0, 30.0]), np.array([0.15, 0.15]), 0.1)
    assert found == pytest.approx(stats.lognorm(0.15, scale=30.0).ppf(0.1), rel=1e-9)


def test_conjugate_draws_give_the_student_fractile():
    # Normal-inverse-gamma posterior of ln f with m = 3.4, s = 0.12, n = 9: the predictive is
    # Student-t with 8 degrees of freedom about m, scale s sqrt(1 + 1/n) (Gelman et al., BDA3, 3.2).
    rng = np.random.default_rng(3)
    n, mean, sd, draws = 9, 3.4, 0.12, 400_000
    scatter = sd * np.sqrt((n - 1) / rng.chisquare(n - 1, draws))
    centre = mean + scatter / np.sqrt(n) * rng.standard_normal(draws)
    exact = np.exp(mean + sd * np.sqrt(1 + 1 / n) * stats.t(n - 1).ppf(0.05))
    assert predictive_fractile(np.exp(centre), scatter, 0.05) == pytest.approx(exact, rel=1e-3)
