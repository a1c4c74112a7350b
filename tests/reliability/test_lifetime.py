"""The lifetime integral against closed forms, quadrature and its own stated errors."""

import numpy as np
import pytest
from scipy import integrate as quadrature
from scipy import stats

from assess.reliability.importance import Problem, Sample
from assess.reliability.index import index_from_probability
from assess.reliability.lifetime import (
    batch_means_error,
    integrate,
    probabilities,
    windows,
)

RESISTANCE, SPREAD = 10.0, 1.0  # normal resistance
MODE, SCALE = 4.0, 0.5  # Gumbel load of a year


def problem(years=10, draws=64, mean=None, spread=SPREAD, mode=MODE) -> Problem:
    """Normal resistance per draw against the yearly maximum of a Gumbel load."""
    mean = np.full(draws, RESISTANCE) if mean is None else np.asarray(mean)

    def log_hazard(z, chosen, which):
        resistance = mean[chosen][:, None] + spread * z[..., 0]
        return np.broadcast_to(
            ((mode - resistance) / SCALE)[..., None], (*z.shape[:2], len(which))
        ).copy()

    return Problem(log_hazard, 1, len(mean), years)


def exact(years: int, mean: float = RESISTANCE, spread: float = SPREAD, mode=MODE) -> float:
    """1 - E[F^T] by quadrature over the resistance."""

    def failing(r):
        return stats.norm.pdf(r, mean, spread) * -np.expm1(-years * np.exp((mode - r) / SCALE))

    cut = [mode, mean]
    return quadrature.quad(failing, mean - 12 * spread, mean + 8 * spread, points=cut, limit=400)[0]


def test_one_year_and_all_windows_have_the_closed_form():
    found = integrate(problem(), chains=4, tolerance=0.002, seed=1)
    for period in (1, 2, 5, 10):
        first, last = windows(10, period)
        curve = probabilities(found.sample, first, last, 4)
        expected = exact(period)
        assert len(curve.probability) == 11 - period
        np.testing.assert_allclose(curve.index, index_from_probability(expected), atol=0.004)


def test_years_share_the_resistance_and_do_not_add_up():
    found = integrate(problem(years=30, spread=2.5), chains=4, tolerance=0.002, seed=1)
    last = np.arange(30)
    cumulative = probabilities(found.sample, np.zeros_like(last), last, 4).probability
    yearly = found.annual.probability
    assert np.all(np.diff(cumulative) > 0.0)
    assert np.all(cumulative >= np.maximum.accumulate(yearly) - 1e-15)
    assert np.all(cumulative <= np.cumsum(yearly) + 1e-15)
    assert cumulative[-1] < 0.7 * yearly.sum()  # a new bridge each year would have the sum
    assert cumulative[-1] == pytest.approx(exact(30, spread=2.5), rel=0.02)


def test_a_deterministic_resistance_makes_years_independent():
    found = integrate(problem(years=5, spread=0.0, mode=6.0), chains=4, tolerance=0.01, seed=1)
    last = np.arange(5)
    cumulative = probabilities(found.sample, np.zeros_like(last), last, 4).probability
    yearly = found.annual.probability
    # Weights average to one only in the mean; a resistance that is known cannot tell more.
    np.testing.assert_allclose(
        cumulative / cumulative[0], (1.0 - (1.0 - yearly) ** (last + 1)) / yearly, rtol=1e-3
    )


def test_a_constant_capacity_has_the_power_of_the_load():
    # P over T years is 1 - F^T with nothing else uncertain; and directly from its logarithm.
    found = integrate(
        problem(years=20, spread=0.0, mode=6.0, draws=4096), chains=4, tolerance=1e-3, seed=1
    )
    last = np.arange(20)
    cumulative = probabilities(found.sample, np.zeros_like(last), last, 4)
    load = stats.gumbel_r(6.0, SCALE)
    expected = -np.expm1((last + 1) * load.logcdf(RESISTANCE))
    np.testing.assert_allclose(cumulative.index, index_from_probability(expected), atol=4e-3)


def test_simulating_the_years_directly_gives_the_same_index():
    # Resistance falls, the load grows, half of the scatter of the resistance is common.
    years, draws, count = 8, 4096, 1_000_000
    rng = np.random.default_rng(12)
    fall, growth = 0.15 * np.arange(years), 0.05 * np.arange(years)
    common = 7.0 + 0.7 * stats.norm.ppf((rng.permutation(draws) + 0.5) / draws)

    def log_hazard(z, chosen, which):
        resistance = (common[chosen][:, None] + 0.7 * z[..., 0])[..., None] - fall[which]
        return (MODE + growth[which] - resistance) / SCALE

    found = integrate(Problem(log_hazard, 1, draws, years), chains=4, tolerance=0.003, seed=1)
    last = np.arange(years)
    cumulative = probabilities(found.sample, np.zeros_like(last), last, 4)

    resistance = 7.0 + 0.7 * rng.standard_normal(count) + 0.7 * rng.standard_normal(count)
    failed = np.zeros(count, dtype=bool)
    for year in range(years):
        now = rng.gumbel(MODE + growth[year], SCALE, count) > resistance - fall[year]
        failed |= now
        for simulated, curve in ((now, found.annual), (failed, cumulative)):
            share = simulated.mean()
            error = np.sqrt(share * (1.0 - share) / count)
            index = float(index_from_probability(share))
            allowed = 4.0 * np.hypot(error / stats.norm.pdf(index), curve.integration_error[year])
            assert curve.index[year] == pytest.approx(index, abs=allowed)


@pytest.mark.parametrize("years", [1, 2])
def test_short_horizons(years):
    found = integrate(problem(years=years), chains=4, tolerance=0.002, seed=1)
    assert len(found.annual.index) == years
    assert found.annual.index[0] == pytest.approx(index_from_probability(exact(1)), abs=0.004)


@pytest.mark.parametrize("index", [1.0, 2.0, 4.0, 6.0, 8.0])
def test_indices_from_one_to_eight(index):
    # A linear form in three normals: R1 + R2 - R3, the load all but fixed.
    weights = np.array([1.0, 0.6, -0.8])
    mean = index * np.linalg.norm(weights)

    def log_hazard(z, _chosen, which):
        margin = mean + z @ weights
        return np.repeat((-margin / 1e-3)[..., None], len(which), axis=-1)

    found = integrate(Problem(log_hazard, 3, 64, 1), chains=4, tolerance=0.002, seed=3)
    # A Gumbel load of scale 0.001 shifts the margin by no more than some of its scales.
    assert found.annual.index[0] == pytest.approx(index, abs=0.006)
    assert found.annual.integration_error[0] <= 0.002


def test_the_stated_integration_error_is_that_of_repeated_runs():
    expected = float(index_from_probability(exact(1)))
    runs = [
        integrate(problem(years=1, draws=16), chains=4, tolerance=1.0, seed=seed).annual
        for seed in range(200)
    ]
    index = np.array([run.index[0] for run in runs])
    stated = np.array([run.integration_error[0] for run in runs])
    true = index.std(ddof=1)
    # Scatter of 200 runs against 200 times 3 degrees of freedom of the stated errors.
    low, high = stats.f(199, 600).ppf([1e-4, 1.0 - 1e-4])
    assert low < true**2 / np.mean(stated**2) < high
    assert abs(index.mean() - expected) < 4.0 * true / np.sqrt(len(index))


def test_an_integral_that_stops_at_the_tolerance_is_as_good_as_it_says():
    # Directions that weigh by a curve make the weights scatter: several passes are needed.
    rng = np.random.default_rng(0)
    mean = RESISTANCE + 0.8 * rng.standard_normal(60)
    expected = float(index_from_probability(np.mean([exact(1, m, 1.5) for m in mean])))
    base = problem(years=1, mean=mean, spread=1.5)

    def bent(z, chosen, which):
        return base.log_hazard(_rotated(z), chosen, which)

    tolerance = 0.005
    found = [
        integrate(Problem(bent, 4, 60, 1), chains=4, tolerance=tolerance, seed=seed)
        for seed in range(80)
    ]
    off = np.array([run.annual.index[0] for run in found]) - expected
    stated = np.array([run.annual.integration_error[0] for run in found])
    sizes = [len(run.sample.owner) for run in found]
    assert max(sizes) > 2 * min(sizes)
    assert np.all(stated <= tolerance)
    # 80 runs: the root mean square of their deviations is known to 8 %.
    assert np.sqrt(np.mean(off**2)) < 1.25 * tolerance
    assert np.mean(np.abs(off) > 4.0 * stated) < 0.05


def _rotated(z):
    """Bring a standard normal out of four as the resistance's own, along a curve."""
    angle = 0.35 * z[..., 1]
    return (np.cos(angle) * z[..., 0] + np.sin(angle) * z[..., 2])[..., None]


def test_a_few_draws_that_contribute_nearly_everything_are_found():
    # Half of the failure probability comes from some five draws in four thousand.
    rng = np.random.default_rng(5)
    mean = 10.0 - np.minimum(np.exp(1.3 * rng.standard_normal(4000) - 2.0), 9.0)
    shares = stats.norm.sf(mean - MODE)
    assert np.sort(shares)[::-1][:5].sum() > 0.3 * shares.sum()
    z, step = np.linspace(-12.0, 8.0, 2001, retstep=True)
    failing = -np.expm1(-np.exp((MODE - mean[:, None] - z) / SCALE))
    expected = float(np.mean(failing @ stats.norm.pdf(z)) * step)
    found = integrate(problem(years=1, mean=mean), chains=4, tolerance=0.005, seed=1)
    assert found.annual.index[0] == pytest.approx(float(index_from_probability(expected)), abs=0.01)
    assert found.annual.integration_error[0] <= 0.005
    points = found.proposal.points
    worst = np.argsort(mean)[:5]
    assert points[worst].sum() > 0.3 * (points.sum() - len(mean))  # of those shared out


def test_certain_failure_and_impossible_failure():
    certain = integrate(problem(mean=np.full(8, -50.0)), chains=4, tolerance=0.01, seed=1)
    assert np.all(certain.annual.index < -5.0)
    never = integrate(problem(mean=np.full(8, 1e6)), chains=4, tolerance=0.01, seed=1)
    assert np.all(never.annual.probability == 0.0)
    assert np.all(np.isposinf(never.annual.index))
    assert not np.any(np.isnan(never.annual.conditional))
    assert np.all(np.isposinf(never.annual.integration_error))  # no finite sample bounds it
    cumulative = probabilities(certain.sample, np.zeros(10, dtype=int), np.arange(10), 4)
    assert np.all(np.isfinite(cumulative.probability))


def test_same_seed_same_numbers_and_a_proposal_repeats_them():
    first = integrate(problem(), chains=4, tolerance=0.005, seed=9)
    again = integrate(problem(), chains=4, tolerance=0.005, seed=9)
    assert first.annual.probability.tobytes() == again.annual.probability.tobytes()
    assert first.annual.conditional.tobytes() == again.annual.conditional.tobytes()
    repeated = integrate(problem(), chains=4, tolerance=0.005, seed=77, proposal=first.proposal)
    np.testing.assert_array_equal(first.annual.probability, repeated.annual.probability)
    other = integrate(problem(), chains=4, tolerance=0.005, seed=10)
    assert not np.array_equal(first.annual.probability, other.annual.probability)


def test_common_points_make_differences_exact():
    # 1 % more load on the same points: the change is known far better than either index.
    base = integrate(problem(draws=32), chains=4, tolerance=0.05, seed=2)
    more = integrate(
        problem(draws=32, mode=4.04), chains=4, tolerance=0.05, seed=2, proposal=base.proposal
    )
    change = base.annual.index[0] - more.annual.index[0]
    expected = float(index_from_probability(exact(1)) - index_from_probability(exact(1, mode=4.04)))
    assert change == pytest.approx(expected, rel=0.02)


def test_conditional_probabilities_are_those_of_each_draw():
    mean = np.linspace(8.0, 11.0, 40)
    found = integrate(problem(years=1, mean=mean), chains=4, tolerance=0.002, seed=4)
    expected = np.array([exact(1, m) for m in mean])
    np.testing.assert_allclose(
        index_from_probability(found.annual.conditional[:, 0]),
        index_from_probability(expected),
        atol=0.12,  # a dozen points for each draw
    )
    low, high = found.annual.index_quantile(0.05)[0], found.annual.index_quantile(0.95)[0]
    assert low < found.annual.index[0] < high


def test_batch_means_are_the_error_of_correlated_chains():
    rng = np.random.default_rng(3)
    r, chains, length = 0.8, 4, 1000
    means, stated = [], []
    for _ in range(300):
        noise = rng.standard_normal((chains, length)) * np.sqrt(1.0 - r * r)
        series = np.empty((chains, length))
        series[:, 0] = rng.standard_normal(chains)
        for i in range(1, length):
            series[:, i] = r * series[:, i - 1] + noise[:, i]
        means.append(series.mean())
        stated.append(batch_means_error(series.reshape(-1, 1), chains)[0])
    # Variance of the mean of an AR(1) chain: (1 + r)/(1 - r)/n, textbook.
    known = np.sqrt((1.0 + r) / (1.0 - r) / (chains * length))
    assert np.std(means) == pytest.approx(known, rel=0.12)
    assert np.mean(stated) == pytest.approx(known, rel=0.15)


def test_the_error_of_finite_chains_is_stated():
    rng = np.random.default_rng(8)
    found = integrate(
        problem(years=1, mean=10.0 + 0.5 * rng.standard_normal(2000)),
        chains=4, tolerance=0.001, seed=1,
    )  # fmt: skip
    # Independent draws: the error follows from their scatter.
    conditional = found.annual.conditional[:, 0]
    probability = found.annual.probability[0]
    known = conditional.std() / np.sqrt(2000) / stats.norm.pdf(found.annual.index[0])
    assert probability > 0.0
    assert found.annual.mcmc_error[0] == pytest.approx(known, rel=0.35)


def _known_sample(probability) -> Sample:
    """Sample of one point a draw whose conditional probability is known, in two replicates."""
    count = len(probability)
    hazard = np.broadcast_to(-np.log1p(-probability)[:, None], (2, 1, count, 1))
    weight = np.full((2, 1, count), 1.0 / count)
    z, ones = np.zeros((2, 1, count, 1)), np.ones(count)
    survival = np.ones_like(weight)
    return Sample(np.arange(count), z, weight, hazard, survival, ones, count, count)


def test_the_stated_error_of_correlated_chains_is_that_of_repeated_chains():
    # Known conditional probabilities that follow an autoregressive common variable.
    rng = np.random.default_rng(4)
    r, chains, length, repeats = 0.7, 4, 1000, 300
    state = rng.standard_normal((repeats, chains))
    series = np.empty((repeats, chains, length))
    for i in range(length):
        series[..., i] = state
        state = r * state + np.sqrt(1.0 - r * r) * rng.standard_normal((repeats, chains))
    conditional = stats.norm.sf(3.0 + 0.7 * series).reshape(repeats, -1)
    year = np.zeros(1, dtype=int)
    found = [probabilities(_known_sample(p), year, year, chains) for p in conditional]
    index = np.array([run.index[0] for run in found])
    stated = np.array([run.mcmc_error[0] for run in found])
    assert all(run.integration_error[0] < 1e-12 for run in found)
    # E Phi(-(3 + 0.7 x)) has the index 3 / sqrt(1 + 0.49).
    assert abs(index.mean() - 3.0 / np.sqrt(1.49)) < 4.0 * index.std() / np.sqrt(repeats) + 2e-3
    # Batches of 31 draws miss some of the correlation: 1 - 2 r/((1 - r^2) 31) of the variance,
    # that is about 5 % of the error; the scatter of 300 runs is known to 4 %.
    assert np.sqrt(np.mean(stated**2)) == pytest.approx(index.std(ddof=1), rel=0.2)
