"""Operations: one answer for numbers and for PyTensor graphs, right values, right gradients."""

import subprocess
import sys

import mpmath
import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest

from assess import operations as op

GRID = np.array([-37.0, -20.0, -8.2, -5.0, -1.0, -0.1, 0.0, 0.3, 1.0, 3.0, 8.2])
PROBABILITIES = np.array([1e-300, 1e-16, 1e-5, 0.1, 0.5, 0.7, 0.999])
ON_GRID = {
    "exp": op.exp,
    "expm1": op.expm1,
    "erf": op.erf,
    "erfc": op.erfc,
    "normal_cdf": op.normal_cdf,
    "log_normal_cdf": op.log_normal_cdf,
    "normal_logpdf": op.normal_logpdf,
    "where": lambda x: op.where(x > 0.2, x * x, 1.0),
    "maximum": lambda x: op.maximum(x, 0.2),
    "minimum": lambda x: op.minimum(x, 0.2),
}
ON_PROBABILITIES = {
    "log": op.log,
    "log1p": op.log1p,
    "sqrt": op.sqrt,
    "normal_ppf": op.normal_ppf,
    "gammaln": op.gammaln,
}


@pytest.fixture(scope="module")
def from_graph() -> dict[str, tuple[np.ndarray, np.ndarray]]:
    """Value and gradient of every operation, from one compiled function."""
    z, p = pt.dvector("z"), pt.dvector("p")
    outputs = []
    for functions, variable in ((ON_GRID, z), (ON_PROBABILITIES, p)):
        for function in functions.values():
            value = function(variable)
            outputs += [value, pytensor.grad(value.sum(), variable)]
    results = pytensor.function([z, p], outputs)(GRID, PROBABILITIES)
    names = [*ON_GRID, *ON_PROBABILITIES]
    return {name: (results[2 * i], results[2 * i + 1]) for i, name in enumerate(names)}


@pytest.mark.parametrize("name", [*ON_GRID, *ON_PROBABILITIES])
def test_graph_gives_the_value_of_numbers(name, from_graph):
    function = (ON_GRID | ON_PROBABILITIES)[name]
    expected = function(GRID if name in ON_GRID else PROBABILITIES)
    np.testing.assert_allclose(from_graph[name][0], expected, rtol=2e-12, atol=1e-300)


@pytest.mark.parametrize(
    ("name", "derivative"),
    [
        ("exp", np.exp),
        ("erf", lambda x: 2.0 / np.sqrt(np.pi) * np.exp(-(x**2))),
        ("erfc", lambda x: -2.0 / np.sqrt(np.pi) * np.exp(-(x**2))),
        ("normal_cdf", lambda x: np.exp(-0.5 * x**2) / np.sqrt(2.0 * np.pi)),
        ("normal_logpdf", lambda x: -x),
        ("where", lambda x: np.where(x > 0.2, 2.0 * x, 0.0)),
        ("maximum", lambda x: np.where(x > 0.2, 1.0, 0.0)),
        ("minimum", lambda x: np.where(x > 0.2, 0.0, 1.0)),
    ],
)
def test_gradients_match_the_derivative(name, derivative, from_graph):
    np.testing.assert_allclose(from_graph[name][1], derivative(GRID), rtol=1e-12, atol=1e-300)


def test_gradient_of_normal_ppf_is_one_over_the_density(from_graph):
    with mpmath.workdps(30):
        exact = []
        for p in PROBABILITIES:
            start = float(op.normal_ppf(p))
            z = mpmath.findroot(lambda t, p=p: mpmath.log(mpmath.ncdf(t)) - mpmath.log(p), start)
            exact.append(float(1 / mpmath.npdf(z)))
    np.testing.assert_allclose(from_graph["normal_ppf"][1], exact, rtol=1e-11)


def _exact_log_cdf(z: float) -> tuple[float, float]:
    """Logarithm of Phi and its derivative, to thirty digits."""
    with mpmath.workdps(40):
        below = mpmath.erfc(-mpmath.mpf(z) / mpmath.sqrt(2)) / 2
        value = mpmath.log(below) if z < 0 else mpmath.log1p(-mpmath.erfc(z / mpmath.sqrt(2)) / 2)
        return float(value), float(mpmath.npdf(z) / below)


def test_log_normal_cdf_and_its_gradient_far_into_both_tails(from_graph):
    exact, slope = np.array([_exact_log_cdf(z) for z in GRID]).T
    np.testing.assert_allclose(op.log_normal_cdf(GRID), exact, rtol=1e-13)
    value, gradient = from_graph["log_normal_cdf"]
    np.testing.assert_allclose(value, exact, rtol=1e-13)
    np.testing.assert_allclose(gradient, slope, rtol=1e-12)


def test_normal_cdf_and_its_inverse_against_mpmath():
    exact = [float(mpmath.ncdf(z)) for z in GRID]
    np.testing.assert_allclose(op.normal_cdf(GRID), exact, rtol=1e-12)
    lower = GRID[GRID <= 0.0]
    np.testing.assert_allclose(op.normal_ppf(op.normal_cdf(lower)), lower, rtol=1e-13)


def test_stack_last_adds_an_axis_for_numbers_and_graphs():
    assert op.stack_last([np.zeros(3), np.ones(3)]).shape == (3, 2)
    joined = op.stack_last([pt.zeros(3), pt.ones(3)]).eval(mode="FAST_COMPILE")
    np.testing.assert_array_equal(joined, [[0.0, 1.0]] * 3)


def test_scalars_stay_scalars():
    assert np.ndim(op.where(True, 1.0, 2.0)) == 0
    assert op.where(np.float64(3.0) > 2.0, 1.0, 2.0) == 1.0


def test_pytensor_is_recognised_and_nothing_else():
    assert op.is_symbolic(1.0, pt.dscalar())
    assert op.is_symbolic(pytensor.shared(1.0))
    assert not op.is_symbolic(1.0, np.zeros(2), "text", None)


def test_probability_does_not_import_pytensor():
    code = (
        "import sys; import assess.operations as op; import assess.probability.normal_space; "
        "import assess.probability.dependence; from assess.probability.marginals import "
        "make_marginal; make_marginal('gamma', mean=1.0, sd=1.0).from_score(0.5); "
        "op.log_normal_cdf(1.0); sys.exit('pytensor' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
