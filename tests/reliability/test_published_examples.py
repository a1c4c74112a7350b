"""Textbook limit states and known hard shapes: the integral against exact probabilities.

Every exact probability is computed here, by SciPy's adaptive quadrature or by the convolution of
densities, with SciPy's distributions; the tool's marginals have no part in it. Printed indices
are those of the first-order method, from memory, and stand beside as plain text only where
curvature sets them apart.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import integrate as quadrature
from scipy import special, stats
from scipy.signal import fftconvolve

from assess.reliability.importance import Problem
from assess.reliability.lifetime import integrate

FloatArray = NDArray[np.float64]

DRAWS = 256  # equal ones: they only add points
SEEDS = 4  # runs, so that the stated errors of all together have 12 degrees of freedom
SHARP = 1e-4  # scale of the load where the book has none, in units of the margin's sd


def lognormal(mean: float, sd: float):
    zeta = np.sqrt(np.log1p((sd / mean) ** 2))
    return stats.lognorm(zeta, scale=mean / np.sqrt(1.0 + (sd / mean) ** 2))


def gumbel(mean: float, sd: float):
    scale = sd * np.sqrt(6.0) / np.pi
    return stats.gumbel_r(mean - np.euler_gamma * scale, scale)


def value(known, z: FloatArray) -> FloatArray:
    """Value of a distribution at a standard normal score, each tail by its own function."""
    return np.where(z < 0.0, known.ppf(special.ndtr(z)), known.isf(special.ndtr(-z)))


def log_hazard_of(load, capacity: FloatArray) -> FloatArray:
    """Give ln(-ln F) of a load; far up, -ln F is the upper tail."""
    tail = np.minimum(load.sf(capacity), 1.0 - 1e-16)
    with np.errstate(divide="ignore"):
        return np.where(tail < 1e-9, load.logsf(capacity), np.log(-np.log1p(-tail)))


def sharp(margin: FloatArray) -> FloatArray:
    """Failure where a margin is negative, as a Gumbel load of hardly any scatter has it."""
    return -margin / SHARP


@dataclass(frozen=True)
class Example:
    """``log_hazard`` maps scores (..., dimension); ``exact`` gives the failure probability."""

    dimension: int
    log_hazard: Callable[[FloatArray], FloatArray]
    exact: Callable[[], float]
    index: float  # recomputed independently, for the list of check values


def single(resistance, load, index: float) -> Example:
    """Resistance against load: one-dimensional quadrature."""

    def exact() -> float:
        low, high = resistance.ppf(1e-16), resistance.isf(1e-16)
        middle = load.ppf([0.5, 0.999])
        cuts = sorted(x for x in (*middle, resistance.median()) if low < x < high)

        def failing(r):
            return resistance.pdf(r) * load.sf(r)

        return quadrature.quad(failing, low, high, points=cuts, limit=500, epsabs=0.0)[0]

    return Example(1, lambda z: log_hazard_of(load, value(resistance, z[..., 0])), exact, index)


def product(first, second, load, index: float) -> Example:
    """Product of two resistances against a load: two-dimensional quadrature over the scores."""

    def failing(b, a):
        capacity = value(first, np.asarray(a)) * value(second, np.asarray(b))
        return np.exp(-0.5 * (a * a + b * b)) / (2.0 * np.pi) * load.sf(capacity)

    def exact() -> float:
        # A fixed rule in the inner variable, adaptive in the outer one.
        node, weight = np.polynomial.legendre.leggauss(160)

        def inner(a):
            return float(8.5 * weight @ failing(8.5 * node, a))

        return quadrature.quad(inner, -8.5, 8.5, points=[-4.0, -2.0, 0.0], epsrel=1e-8, epsabs=0)[0]

    def log_hazard(z):
        return log_hazard_of(load, value(first, z[..., 0]) * value(second, z[..., 1]))

    return Example(2, log_hazard, exact, index)


def _curved() -> Example:
    # Rotated by 45 degrees the margin is 2.5 - u + 0.2 v^2.
    def margin(z):
        return 2.5 - (z[..., 0] + z[..., 1]) / np.sqrt(2.0) + 0.1 * (z[..., 0] - z[..., 1]) ** 2

    def exact() -> float:
        def failing(v):
            return stats.norm.pdf(v) * stats.norm.sf(2.5 + 0.2 * v * v)

        return quadrature.quad(failing, -12.0, 12.0, epsabs=0.0)[0]

    return Example(2, lambda z: sharp(margin(z)), exact, 2.63496)


def _frame() -> Example:
    """Mechanism x1 + 2 x2 + 2 x3 + x4 - 5 x5 - 5 x6; x6 is taken for the load."""
    moment, h, v = lognormal(120.0, 12.0), lognormal(50.0, 15.0), lognormal(40.0, 12.0)

    def log_hazard(z):
        x = [value(moment, z[..., i]) for i in range(4)]
        capacity = x[0] + 2.0 * x[1] + 2.0 * x[2] + x[3] - 5.0 * value(h, z[..., 4])
        # Below zero no load is small enough; just above, failure is certain as well.
        return log_hazard_of(v, np.maximum(capacity / 5.0, 1e-3))

    def exact() -> float:
        step = 0.05
        x = np.arange(0.0, 2500.0, step)  # all of each variable, far into the tails

        def density(known, factor):
            return known.pdf(x / factor) / factor

        plus = density(moment, 1.0)
        for factor in (2.0, 2.0, 1.0):
            plus = fftconvolve(plus, density(moment, factor))[: len(x)] * step
        minus = fftconvolve(density(h, 5.0), density(v, 5.0))[: len(x)] * step
        above = np.cumsum(minus[::-1])[::-1] * step
        return float(np.sum(plus * (above - 0.5 * step * minus)) * step)

    return Example(5, log_hazard, exact, 2.25061)


def _sum(count: int, index: float) -> Example:
    """Rackwitz's sum: n + 0.6 sqrt(n) less n lognormals of mean 1 and V 0.2."""
    one = lognormal(1.0, 0.2)
    bound = count + 0.6 * np.sqrt(count)
    zeta = np.sqrt(np.log1p(0.04))

    def log_hazard(z):
        total = np.exp(zeta * z - 0.5 * zeta**2).sum(axis=-1)
        return sharp(bound - total)

    def exact() -> float:
        step = 0.002
        x = np.arange(0.0, 2.5 * count, step)
        spectrum = np.fft.rfft(one.pdf(x) * step, 2 * len(x))
        total = np.fft.irfft(spectrum**count, 2 * len(x))[: len(x)]
        place = int(np.ceil(bound / step))
        # Half of the cell at the bound, and the part of it that lies above.
        return float(total[place:].sum() + ((place * step - bound) / step - 0.5) * total[place])

    return Example(count, log_hazard, exact, index)


EXAMPLES = {
    "Melchers, timber beam": single(stats.norm(10.0, 1.5), stats.norm(3.75, 1.25), 3.200922),
    "lognormal R and S": single(lognormal(200.0, 20.0), lognormal(100.0, 20.0), 3.191869),
    "lognormal R and S, V 0.1 and 0.3": single(
        lognormal(3.0, 0.3), lognormal(1.0, 0.3), 3.666323
    ),
    "lognormal R, Gumbel S": single(lognormal(200.0, 20.0), gumbel(100.0, 20.0), 2.89285),
    "normal R, Gumbel S": single(stats.norm(200.0, 20.0), gumbel(100.0, 20.0), 2.86496),
    "lognormal R, Gumbel S, V 0.35": single(lognormal(2.5, 0.375), gumbel(1.0, 0.35), 2.57379),
    "Ang and Tang, Y Z - M, normal": product(
        stats.norm(40.0, 5.0), stats.norm(50.0, 2.5), stats.norm(1000.0, 200.0), 3.04153
    ),
    "Ang and Tang, Y Z - M, lognormal and Gumbel": product(
        lognormal(40.0, 5.0), lognormal(50.0, 2.5), gumbel(1000.0, 200.0), 2.73630
    ),
    "Ang and Tang, Y Z - M, normal and Gumbel": product(
        stats.norm(40.0, 5.0), stats.norm(50.0, 2.5), gumbel(1000.0, 200.0), 2.67599
    ),
    "Faber, steel rod, normal": product(
        stats.norm(350.0, 35.0), stats.norm(10.0, 1.0), stats.norm(1500.0, 300.0), 3.71638
    ),
    "Faber, steel rod, lognormal and Gumbel": product(
        lognormal(350.0, 35.0), lognormal(10.0, 1.0), gumbel(1500.0, 300.0), 3.22575
    ),
    "curved margin": _curved(),
    "Madsen, Krenk and Lind, frame mechanism": _frame(),
    "Rackwitz, sum of 20 lognormals": _sum(20, 2.8369),
}  # fmt: skip


def runs(example: Example, draws: int = DRAWS, tolerance: float = 0.002) -> tuple[float, float]:
    """Mean index over some seeds, and the root mean square of the stated errors."""

    def log_hazard(z, _chosen, which):
        return np.repeat(example.log_hazard(z)[..., None], len(which), axis=-1)

    problem = Problem(log_hazard, example.dimension, draws, 1)
    found = [
        integrate(problem, chains=4, tolerance=tolerance, seed=seed).annual for seed in range(SEEDS)
    ]
    index = np.array([run.index[0] for run in found])
    stated = np.array([run.integration_error[0] for run in found])
    return float(index.mean()), float(np.sqrt(np.mean(stated**2)))


@pytest.mark.parametrize("name", EXAMPLES)
def test_the_integral_has_the_exact_index(name):
    example = EXAMPLES[name]
    exact = float(-special.ndtri(example.exact()))
    assert exact == pytest.approx(example.index, abs=1e-4)  # the quadrature itself
    index, stated = runs(example)
    assert abs(index - exact) < min(4.0 * stated / np.sqrt(SEEDS) + 2e-5, 0.01)
    assert stated <= 0.002


@pytest.mark.parametrize("mean", [150.0, 190.0, 240.0, 330.0, 430.0, 560.0, 760.0, 1050.0])
def test_indices_from_one_to_eight_with_a_load_that_varies(mean):
    example = single(lognormal(mean, 0.12 * mean), lognormal(100.0, 25.0), 0.0)
    exact = float(-special.ndtri(example.exact()))
    assert 1.0 < exact < 9.0
    index, stated = runs(example)
    assert abs(index - exact) < min(4.0 * stated / np.sqrt(SEEDS) + 2e-5, 0.01)


def _any_of(count: int) -> Example:
    """One of some alike elements fails: a mode on every axis."""

    def exact() -> float:
        return -np.expm1(count * stats.norm.logcdf(4.0))

    return Example(count, lambda z: sharp(4.0 - z.max(axis=-1)), exact, 0.0)


def _steep_product() -> Example:
    # x1 x2 - 146.14: failure all along an arc about the origin, some eight units long.
    first, second = stats.norm(78064.4, 11709.7), stats.norm(0.0104, 0.00156)

    def exact() -> float:
        def failing(x):
            return first.pdf(x) * second.cdf(146.14 / x)

        low, high = 78064.4 - 6.6 * 11709.7, 78064.4 + 8.0 * 11709.7
        whole = quadrature.quad(failing, low, high, limit=500, epsabs=0.0, points=[2e4, 4e4])[0]
        return whole + first.cdf(low)

    def margin(z):
        return (78064.4 + 11709.7 * z[..., 0]) * (0.0104 + 0.00156 * z[..., 1]) - 146.14

    # The list of check values has 5.13078; two ways of integrating here agree on 5.12950.
    return Example(2, lambda z: sharp(margin(z) / 172.0), exact, 5.12950)


def _four_branches() -> Example:
    """Series system after Waarts: two curved branches and two straight ones."""

    def margin(a, b):
        bent = 3.0 + 0.1 * (a - b) ** 2
        across, along = (a - b), (a + b) / np.sqrt(2.0)
        far = 6.0 / np.sqrt(2.0)
        return np.minimum(bent - np.abs(along), far - np.abs(across))

    def exact() -> float:
        # With u along and v across the diagonal: |u| > 3 + 0.2 v^2, or |v| > 3.
        def safe(v):
            return stats.norm.pdf(v) * 2.0 * stats.norm.sf(3.0 + 0.2 * v * v)

        return quadrature.quad(safe, -3.0, 3.0, epsabs=0.0)[0] + 2.0 * stats.norm.sf(3.0)

    return Example(2, lambda z: sharp(margin(z[..., 0], z[..., 1])), exact, 2.61531)


MODES = [
    pytest.param(_any_of(2), id="two elements"),
    pytest.param(_any_of(4), id="four elements"),
    pytest.param(_any_of(6), id="six elements"),
    pytest.param(_steep_product(), id="product far out"),
    pytest.param(_four_branches(), id="four branches"),
]


@pytest.mark.parametrize("example", MODES)
def test_failure_from_many_sides_is_found(example):
    exact = float(-special.ndtri(example.exact()))
    if example.index:
        assert exact == pytest.approx(example.index, abs=1e-4)
    index, stated = runs(example, draws=64, tolerance=0.01)
    assert abs(index - exact) < min(4.0 * stated / np.sqrt(SEEDS) + 2e-4, 0.01)
