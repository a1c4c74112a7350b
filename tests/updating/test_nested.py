import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from assess.updating.nested import local_posterior, nested_log_likelihood


def _design(seed: int, count: int):
    rng = np.random.default_rng(seed)
    return rng.normal(10.0, 3.0, count), rng.uniform(0.2, 4.0, count)


def _ours(values, error_sd, mean, sd):
    precision, residual = error_sd**-2.0, values - mean
    return nested_log_likelihood(
        precision.sum(), precision @ residual, precision @ residual**2, sd**2
    )


def _reference(values, error_sd, mean, sd):
    covariance = np.diag(error_sd**2) + sd**2
    return stats.multivariate_normal(np.full(len(values), mean), covariance).logpdf(values)


@given(
    st.integers(0, 10_000),
    st.integers(1, 12),
    st.tuples(st.floats(0, 20), st.floats(0.05, 10)),
    st.tuples(st.floats(0, 20), st.floats(0.05, 10)),
)
def test_likelihood_is_that_of_the_multivariate_normal(seed, count, here, there):
    # Terms of the precisions alone are left out, so only differences compare.
    values, error_sd = _design(seed, count)
    ours = _ours(values, error_sd, *here) - _ours(values, error_sd, *there)
    reference = _reference(values, error_sd, *here) - _reference(values, error_sd, *there)
    assert ours == pytest.approx(reference, rel=1e-8, abs=1e-8)


def test_readings_switched_off_say_nothing():
    assert nested_log_likelihood(0.0, 0.0, 0.0, 4.0) == 0.0
    mean, sd = local_posterior(0.0, 0.0, 7.0, 4.0)
    assert (mean, sd) == (7.0, 2.0)


@given(st.integers(0, 10_000), st.integers(1, 12), st.floats(0, 20), st.floats(0.05, 10))
def test_local_posterior_is_gaussian_conditioning(seed, count, mean, sd):
    # Joint of the local value and its readings, conditioned by the textbook formula.
    values, error_sd = _design(seed, count)
    precision = error_sd**-2.0
    found = local_posterior(precision.sum(), precision @ (values - mean), mean, sd**2)
    gain = np.linalg.solve(np.diag(error_sd**2) + sd**2, np.full(count, sd**2))
    assert found[0] == pytest.approx(mean + gain @ (values - mean), rel=1e-8, abs=1e-8)
    assert found[1] == pytest.approx(np.sqrt(sd**2 - gain @ np.full(count, sd**2)), rel=1e-5)
