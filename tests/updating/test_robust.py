"""Student-t errors about a local value, against adaptive quadrature (SciPy)."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.updating.nested import nested_log_likelihood
from assess.updating.robust import Readings, robust_log_likelihood


def by_quadrature(value, scale, freedom, mean, sd):
    def integrand(u):
        density = stats.norm.pdf(u, mean, sd)
        for y, s, nu in zip(value, scale, freedom, strict=True):
            law = stats.norm if np.isinf(nu) else stats.t(nu)
            density *= law.pdf((y - u) / s) / law.pdf(0.0)
        return density

    ends = sorted({mean, *value, *(mean + k * sd for k in (-12, -4, 4, 12))})
    ends += [ends[-1] + 40.0 * max(scale), ends[0] - 40.0 * max(scale)]
    ends.sort()
    parts = [
        integrate.quad(integrand, a, b, epsabs=0.0, epsrel=1e-9, limit=400)[0]
        for a, b in zip(ends[:-1], ends[1:], strict=True)
        if b > a
    ]
    return np.log(sum(parts))


CASES = [
    ([3.4], [0.05], [4.0], 3.5, 0.17),
    ([1.5], [0.05], [4.0], 3.5, 0.17),  # far out: the reading's tail carries it
    ([3.4, 3.45, 4.4], [0.05, 0.05, 0.05], [4.0, 4.0, 4.0], 3.5, 0.17),
    ([3.4, 2.4], [0.05, 0.08], [4.0, np.inf], 3.5, 0.17),  # a normal error among others
    ([3.4, 3.6], [0.1, 0.1], [3.0, 3.0], 3.5, 0.004),  # a zone that hardly scatters
    ([3.4], [0.02], [10.0], 3.5, 0.6),
]


@pytest.mark.parametrize(("value", "scale", "freedom", "mean", "sd"), CASES)
def test_likelihood_of_a_place_is_the_integral(value, scale, freedom, mean, sd):
    readings = Readings(
        np.array([value]), 1.0 / np.array([scale]) ** 2, np.array([freedom], dtype=float)
    )
    found = robust_log_likelihood(readings, np.array([mean]), np.array([sd**2]))
    exact = by_quadrature(value, scale, freedom, mean, sd)
    np.testing.assert_allclose(found, [exact], atol=2e-6)


def test_normal_errors_have_the_closed_form():
    value, precision = np.array([[3.2, 3.5, 3.6]]), np.full((1, 3), 400.0)
    mean, variance = np.array([3.4]), np.array([0.03])
    residual = value - mean[:, None]
    closed = nested_log_likelihood(
        precision.sum(-1),
        (precision * residual).sum(-1),
        (precision * residual**2).sum(-1),
        variance,
    )
    readings = Readings(value, precision, np.full((1, 3), np.inf))
    np.testing.assert_allclose(robust_log_likelihood(readings, mean, variance), closed, atol=1e-9)


def test_what_does_not_count_says_nothing():
    freedom = np.full((2, 2), 4.0)
    mean, variance = np.array([3.5, 3.4]), np.array([0.03, 0.04])
    some = Readings(np.array([[3.2, 9.0], [0.0, 0.0]]), np.array([[400.0, 0.0], [0, 0]]), freedom)
    alone = Readings(np.array([[3.2]]), np.array([[400.0]]), freedom[:1, :1])
    found = robust_log_likelihood(some, mean, variance)
    expected = robust_log_likelihood(alone, mean[:1], variance[:1])[0]
    np.testing.assert_allclose(found, [expected, 0.0], atol=1e-7)
