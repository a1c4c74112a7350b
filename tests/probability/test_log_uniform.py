"""Log-uniform distribution against SciPy's."""

import numpy as np
import pytest
from scipy import stats

from assess.probability.log_uniform import LogUniform

OURS = LogUniform(0.02, 5.0)
SCIPY = stats.loguniform(0.02, 5.0)
X = np.array([0.0201, 0.1, 1.0, 4.9])


def test_agrees_with_scipy():
    for name in ("cdf", "sf", "logpdf"):
        np.testing.assert_allclose(getattr(OURS, name)(X), getattr(SCIPY, name)(X), rtol=1e-12)
    p = np.array([1e-9, 0.3, 0.999])
    np.testing.assert_allclose(OURS.ppf(p), SCIPY.ppf(p), rtol=1e-12)
    np.testing.assert_allclose(OURS.isf(p), SCIPY.isf(p), rtol=1e-12)
    assert OURS.mean == pytest.approx(SCIPY.mean(), rel=1e-12)
    assert OURS.sd == pytest.approx(SCIPY.std(), rel=1e-12)


def test_scores_go_there_and_back():
    z = np.linspace(-6.0, 6.0, 13)
    np.testing.assert_allclose(OURS.score(OURS.from_score(z)), z, rtol=1e-6, atol=1e-9)


def test_nothing_lies_outside_the_bounds():
    outside = np.array([-1.0, 0.0, 0.01, 6.0])
    assert np.all(OURS.logpdf(outside) == -np.inf)
    assert OURS.cdf(outside).tolist() == [0.0, 0.0, 0.0, 1.0]
    assert OURS.sf(outside).tolist() == [1.0, 1.0, 1.0, 0.0]
    assert OURS.describe() == "log-uniform, mean 0.9019, V 1.34, from 0.02 to 5"
    assert OURS.support == (0.02, 5.0)
    assert OURS.parameters == {"lower": 0.02, "upper": 5.0}


@pytest.mark.parametrize("bounds", [(0.0, 1.0), (-1.0, 1.0), (2.0, 1.0), (1.0, np.inf)])
def test_bounds_must_be_positive_and_in_order(bounds):
    with pytest.raises(ValueError, match="bound of a log-uniform"):
        LogUniform(*bounds)
