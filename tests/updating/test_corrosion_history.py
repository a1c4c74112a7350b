"""Likelihood and local posterior of break-outs against integration done in other ways."""

import itertools

import numpy as np
import pytest
from scipy import integrate, stats

from assess.mechanics.corrosion import penetration_depth
from assess.updating import corrosion_history as history
from assess.updating.corrosion_history import Population
from assess.updating.kind import Rows

NONE = np.nan
# (age [yr], loss of radius [mm] or none, detection limit [mm], V of the measured loss)
DESIGNS = {
    "found": lambda age: [(age, 1.0, 0.1, 0.15)],
    "found, much": lambda age: [(age, 3.0, 0.1, 0.1)],
    "found, little": lambda age: [(age, 0.12, 0.1, 0.15)],
    "none": lambda age: [(age, NONE, 0.1, 0.15)],
    "none, then found": lambda age: [(age - 10, NONE, 0.1, 0.15), (age, 0.6, 0.1, 0.15)],
    "none twice, then found": lambda age: [
        (age - 12, NONE, 0.1, 0.15), (age - 5, NONE, 0.1, 0.15), (age, 0.5, 0.1, 0.15)
    ],
    "none twice, other limits": lambda age: [
        (age - 12, NONE, 0.1, 0.15), (age - 5, NONE, 0.3, 0.15), (age, 0.5, 0.1, 0.15)
    ],
    "found twice, other limits": lambda age: [(age - 7, 0.5, 0.2, 0.15), (age, 0.8, 0.05, 0.2)],
}  # fmt: skip
# Where a later visit with a blunter eye bounds the rate more sharply from some onset on, the
# integrand has a kink within a stretch.
LARGEST_ERROR = dict.fromkeys(DESIGNS, 1e-3) | {"none twice, other limits": 2e-2}


def _rows(visits) -> Rows:
    age, loss, limit, variation = np.array(visits).T
    count = len(visits)
    zero = np.zeros(count, dtype=np.int64)
    return Rows(
        np.log(loss),
        np.arange(1, count + 1),
        zero,
        zero,
        np.zeros(1, dtype=np.int64),
        ("z",),
        ("section S",),
        {"age": age, "limit": np.log(limit), "precision": 1.0 / np.log1p(variation**2)},
    )


def _zone(onset, onset_scatter, current, rate_scatter):
    log_rate = float(np.log(penetration_depth(current, 1.0)))
    return np.log(onset), onset_scatter, log_rate, rate_scatter


def _ours(visits, zone, stage=9) -> float:
    seen = history.places(_rows(visits), stage)
    return float(history.log_likelihood(seen, Population(*(np.array([[p]]) for p in zone)))[0])


def _findings(visits, zone, onset):
    """Probability (density) of the findings for each onset, by conjugate steps one by one."""
    _, _, mean, sd = zone
    mean, variance = np.full_like(onset, mean), np.full_like(onset, sd**2)
    low, high = np.full_like(onset, -np.inf), np.full_like(onset, np.inf)
    log_density = np.zeros_like(onset)
    with np.errstate(divide="ignore", invalid="ignore"):
        for age, loss, limit, variation in visits:
            log_years = np.log(np.maximum(age - onset, 0.0))
            if np.isnan(loss):
                high = np.minimum(high, np.log(limit) - log_years)
                continue
            low = np.maximum(low, np.log(limit) - log_years)
            error = np.log1p(variation**2)
            residual = np.where(np.isfinite(log_years), np.log(loss) - log_years - mean, 1e3)
            log_density += stats.norm.logpdf(residual, 0.0, np.sqrt(variance + error))
            log_density += 0.5 * np.log(2.0 * np.pi * error)  # left out by the tool
            gain = variance / (variance + error)
            mean, variance = mean + gain * residual, variance * (1.0 - gain)
        sd = np.sqrt(variance)
        a, b = (low - mean) / sd, (high - mean) / sd
    window = np.where(
        a > 0.0, stats.norm.sf(a) - stats.norm.sf(b), stats.norm.cdf(b) - stats.norm.cdf(a)
    )
    return np.exp(log_density) * np.maximum(window, 0.0)


def _by_composite_rule(visits, zone) -> float:
    """Integrate over the score of ln onset, panels crowding before every visit."""
    log_onset, scatter = zone[:2]
    visits_at = np.array([(np.log(v[0]) - log_onset) / scatter for v in visits])
    near = (visits_at[:, None] - np.geomspace(1e-7, 2.0, 40)).ravel()
    edges = np.unique(np.clip(np.r_[np.linspace(-12, 12, 121), visits_at, near], -12, 12))
    node, weight = np.polynomial.legendre.leggauss(24)
    half = 0.5 * np.diff(edges)[:, None]
    z = (0.5 * (edges[1:] + edges[:-1])[:, None] + half * node).ravel()
    values = _findings(visits, zone, np.exp(log_onset + scatter * z)) * stats.norm.pdf(z)
    return float(values @ (half * weight).ravel())


# Places that a zone may hold: what has a likelihood below 3e-4 of one that fits is left out.
@pytest.mark.parametrize("name", DESIGNS)
def test_likelihood_against_composite_rule(name):
    worst, compared = (0.0,), 0
    grid = itertools.product(
        (25.0, 50.0, 100.0), (10.0, 25.0, 45.0, 80.0), (0.05, 0.1, 0.2, 0.4, 1.0), (1.0, 4.0),
        (0.1, 0.3, 1.0),
    )  # fmt: skip
    for age, *parameters in grid:
        visits, zone = DESIGNS[name](age), _zone(*parameters)
        reference = _by_composite_rule(visits, zone)
        if reference < 3e-4:
            continue
        compared += 1
        error = abs(np.expm1(_ours(visits, zone) - np.log(reference)))
        worst = max(worst, (float(error), age, *parameters))
    assert compared > 40
    assert worst[0] < LARGEST_ERROR[name], worst


@pytest.mark.parametrize("parameters", [(35.0, 0.3, 3.0, 0.5), (20.0, 0.8, 1.0, 0.2)])
@pytest.mark.parametrize("name", ["found", "none", "found twice, other limits"])
def test_composite_rule_against_adaptive_quadrature(name, parameters):
    visits, zone = DESIGNS[name](50.0), _zone(*parameters)

    def density(z):
        onset = np.array([np.exp(zone[0] + zone[1] * z)])
        return float(_findings(visits, zone, onset)[0] * stats.norm.pdf(z))

    breaks = sorted((np.log(v[0]) - zone[0]) / zone[1] for v in visits)
    pieces = [-9.0, *breaks, 9.0]
    adaptive = sum(
        integrate.quad(density, a, b, epsabs=1e-12, epsrel=1e-8, limit=400)[0]
        for a, b in itertools.pairwise(pieces)
        if b > a
    )
    assert _by_composite_rule(visits, zone) == pytest.approx(adaptive, rel=1e-6)


@pytest.mark.parametrize("name", ["found", "none, then found", "found twice, other limits"])
def test_likelihood_by_brute_force_over_onset_and_rate(name):
    # Nothing conjugate: density of each reading at given onset and rate, limits by limits.
    visits, zone = DESIGNS[name](50.0), _zone(30.0, 0.4, 3.0, 0.5)
    last = min(age for age, loss, *_ in visits if np.isfinite(loss))
    bottom, top = zone[2] - 8 * zone[3], zone[2] + 8 * zone[3]

    def lower(t):
        bounds = [np.log(lim / (a - t)) for a, loss, lim, _ in visits if np.isfinite(loss)]
        return max([bottom, *bounds])

    def upper(t):
        bounds = [np.log(lim / (a - t)) for a, loss, lim, _ in visits if np.isnan(loss) and a > t]
        return max(min([top, *bounds]), lower(t))

    def density(log_rate, t):
        found = 1.0
        for age, loss, _, variation in visits:
            if np.isfinite(loss):
                error = np.sqrt(np.log1p(variation**2))
                z = (np.log(loss) - log_rate - np.log(age - t)) / error
                found *= np.exp(-0.5 * z * z)
        onset = np.exp(-0.5 * ((np.log(t) - zone[0]) / zone[1]) ** 2)
        rate = np.exp(-0.5 * ((log_rate - zone[2]) / zone[3]) ** 2)
        return found * onset * rate / (t * zone[1] * zone[3] * 2.0 * np.pi)

    cuts = sorted({1.0, *(a for a, loss, *_ in visits if np.isnan(loss)), last - 1e-6})
    total = sum(
        integrate.dblquad(density, a, b, lower, upper, epsabs=1e-9, epsrel=1e-5)[0]
        for a, b in itertools.pairwise(cuts)
    )
    assert np.exp(_ours(visits, zone)) == pytest.approx(total, rel=1e-3)


def test_visits_of_later_surveys_are_switched_off():
    visits, zone = DESIGNS["none, then found"](50.0), _zone(35.0, 0.3, 3.0, 0.5)
    assert _ours(visits, zone, stage=0) == 0.0
    assert _ours(visits, zone, stage=1) == pytest.approx(_ours(visits[:1], zone), abs=1e-6)


def test_what_cannot_be_is_nearly_impossible():
    zone = _zone(35.0, 0.3, 3.0, 0.5)
    assert _ours([(40.0, 1.0, 0.1, 0.1), (45.0, NONE, 0.1, 0.1)], zone) < -500.0


@pytest.mark.parametrize(
    ("visits", "healed"),
    [
        ([(40.0, 1.0, 0.1, 0.1), (45.0, NONE, 0.1, 0.1)], True),
        ([(40.0, 1.0, 0.1, 0.1), (40.0, NONE, 0.1, 0.1)], True),
        ([(40.0, 0.2, 0.1, 0.1), (45.0, NONE, 0.5, 0.1)], False),  # a blunter eye
        ([(40.0, NONE, 0.1, 0.1), (45.0, 0.3, 0.1, 0.1)], False),
    ],
)
def test_healed_places(visits, healed):
    assert history.healed_places(_rows(visits)) == (["section S"] if healed else [])


@pytest.mark.parametrize("name", ["found", "none twice, then found"])
def test_graph_and_numbers_agree_and_gradient_is_finite(name):
    pytensor = pytest.importorskip("pytensor")
    tensor = pytest.importorskip("pytensor.tensor")
    visits = DESIGNS[name](50.0)
    symbols = [tensor.dscalar() for _ in range(4)]
    zone = Population(*(symbol.reshape((1, 1)) for symbol in symbols))
    graph = history.log_likelihood(history.places(_rows(visits), 9), zone).sum()
    function = pytensor.function(
        symbols, [graph, *pytensor.grad(graph, symbols)], mode="FAST_COMPILE"
    )
    for parameters in ((35.0, 0.3, 3.0, 0.5), (20.0, 0.8, 1.0, 0.2)):
        value, *slopes = function(*_zone(*parameters))
        assert value == pytest.approx(_ours(visits, _zone(*parameters)), rel=1e-9)
        step = 1e-5
        for k, slope in enumerate(slopes):
            ends = [list(_zone(*parameters)) for _ in range(2)]
            ends[0][k] -= step
            ends[1][k] += step
            difference = (_ours(visits, ends[1]) - _ours(visits, ends[0])) / (2.0 * step)
            assert slope == pytest.approx(difference, rel=1e-4, abs=1e-5)
    # Where the findings are all but impossible the sampler still needs a way back.
    for parameters in ((400.0, 0.05, 0.01, 0.1), (2.0, 0.05, 50.0, 0.1)):
        assert np.isfinite(function(*_zone(*parameters))).all()
