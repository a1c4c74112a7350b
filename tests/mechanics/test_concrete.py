from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import integrate, stats

from assess.mechanics import concrete
from assess.mechanics.concrete import StrengthPrior

TABLE = pd.read_csv(
    Path(__file__).parents[1] / "published" / "jcss_strength_priors.csv", comment="#"
)
CORES = [28.0, 33.0, 35.0, 31.0, 38.0, 29.5]
VAGUE = StrengthPrior(0.0, 0.0, 0.0, 0.0)


@pytest.mark.published(
    source="JCSS Probabilistic Model Code", place="part 3.1, prior parameters for the strength"
)
def test_prior_table():
    for row in TABLE.itertuples():
        prior = concrete.strength_prior(row.grade, row.production)
        assert prior == StrengthPrior(row.m, row.n, row.s, row.nu)
    listed = {(production, grade) for production, names in concrete.GRADES.items()
              for grade in names}  # fmt: skip
    assert listed == set(zip(TABLE.production, TABLE.grade, strict=True))


def test_prior_quantiles():
    # Recomputed: exp(m + t_(p,nu) s sqrt(1 + 1/n)), printed to three decimals.
    for row in TABLE.itertuples():
        prior = concrete.strength_prior(row.grade, row.production)
        found = concrete.predictive_quantile(prior, [0.5, 0.05, 0.01, 0.001])
        np.testing.assert_allclose(found, [row.median, row.p05, row.p01, row.p001], atol=6e-4)


def test_probability_of_low_strength():
    # Recomputed for ready-mixed C35: P(f < 30) = 7.58219e-4, P(f < 35) = 8.84535e-3.
    prior = concrete.strength_prior("C35")
    found = concrete.predictive_quantile(prior, [7.58219e-4, 8.84535e-3])
    np.testing.assert_allclose(found, [30.0, 35.0], atol=2e-5)


def test_unknown_grade_and_production_name_the_known():
    with pytest.raises(ValueError, match="grade 'C55', ready-mixed; known: C15, C25, C35, C45"):
        concrete.strength_prior("C55")
    with pytest.raises(ValueError, match="production 'mixed'; known: ready-mixed, precast"):
        concrete.strength_prior("C25", "mixed")


def test_update_with_six_cores():
    # Recomputed by the formulas of JCSS PMC 3.0 annex A at high precision; leaving out delta
    # would give nu = 15, s = 0.168991.
    after = concrete.update(concrete.strength_prior("C35"), CORES)
    assert (after.tests, after.degrees) == (9.0, 16.0)
    assert after.log_mean == pytest.approx(3.598892, abs=5e-7)
    assert after.log_sd == pytest.approx(0.163625, abs=5e-7)
    found = concrete.predictive_quantile(after, [0.5, 0.05, 0.001])
    np.testing.assert_allclose(found, [36.5577, 27.0522, 19.3583], atol=6e-5)


def test_update_of_a_vague_prior_is_en1990():
    after = concrete.update(VAGUE, CORES)
    assert (after.tests, after.degrees) == (6.0, 5.0)
    assert after.log_mean == pytest.approx(3.473337, abs=5e-7)
    assert after.log_sd == pytest.approx(0.112800, abs=5e-7)
    assert float(concrete.predictive_quantile(after, 0.05)) == pytest.approx(25.2248, abs=6e-5)


@pytest.mark.published(source="EN 1990:2002 (from memory)", place="table D1, k_6 = 2.18")
def test_vague_update_against_the_printed_factor():
    after = concrete.update(VAGUE, CORES)
    by_table = np.exp(after.log_mean - 2.18 * after.log_sd)  # value from memory
    assert by_table == pytest.approx(25.2149, abs=6e-5)
    assert float(concrete.predictive_quantile(after, 0.05)) == pytest.approx(by_table, rel=5e-4)


def test_posterior_by_quadrature():
    # Prior density of the class times the likelihood of the six cores, integrated numerically;
    # E[sigma] = 0.171829, E[sigma²] = 0.0305977, sd(mu) = 0.0583074.
    prior = concrete.strength_prior("C35")
    logs = np.log(CORES)
    mu, sigma = np.linspace(3.0, 4.2, 801)[:, None], np.geomspace(0.04, 1.5, 801)[None, :]
    log_density = -(prior.degrees + 2.0) * np.log(sigma) - (
        prior.degrees * prior.log_sd**2 + prior.tests * (mu - prior.log_mean) ** 2
    ) / (2 * sigma**2)
    for value in logs:
        log_density = log_density + stats.norm.logpdf(value, mu, sigma)
    density = np.exp(log_density - log_density.max())

    def integral(integrand):
        return integrate.trapezoid(
            integrate.trapezoid(integrand * sigma, np.log(sigma[0]), axis=1), mu[:, 0]
        )

    total = integral(density)
    mean_mu = integral(density * mu) / total
    sd_mu = np.sqrt(integral(density * (mu - mean_mu) ** 2) / total)
    mean_variance = integral(density * sigma**2) / total
    after = concrete.update(prior, CORES)
    assert mean_mu == pytest.approx(after.log_mean, abs=1e-6)
    assert sd_mu == pytest.approx(0.0583074, rel=1e-5)
    assert integral(density * sigma) / total == pytest.approx(0.171829, rel=1e-5)
    assert mean_variance == pytest.approx(0.0305977, rel=1e-5)
    # The same from the gamma distribution of the precision.
    assert after.precision_rate / (after.precision_shape - 1) == pytest.approx(mean_variance, 1e-5)


@given(st.lists(st.floats(15.0, 70.0), min_size=2, max_size=12), st.integers(1, 11))
def test_updating_in_two_steps_moves_the_mean_as_in_one(values, cut):
    # Means and test numbers add up exactly. Degrees do too: each step's own mean costs one and
    # delta gives one back.
    cut = min(cut, len(values) - 1)
    prior = concrete.strength_prior("C25")
    once = concrete.update(prior, values)
    twice = concrete.update(concrete.update(prior, values[:cut]), values[cut:])
    assert twice.log_mean == pytest.approx(once.log_mean, rel=1e-12)
    assert (twice.tests, twice.degrees) == (once.tests, once.degrees)
    assert twice.log_sd == pytest.approx(once.log_sd, rel=1e-9)


def test_single_core_updates():
    after = concrete.update(concrete.strength_prior("C25"), [30.0])
    assert (after.tests, after.degrees) == (4.0, 11.0)
    assert after.log_mean == pytest.approx((3 * 3.65 + np.log(30.0)) / 4)


def test_update_and_prediction_refuse_nonsense():
    with pytest.raises(ValueError, match="give at least one"):
        concrete.update(VAGUE, [])
    with pytest.raises(ValueError, match="positive and finite .*got -3"):
        concrete.update(VAGUE, [30.0, -3.0])
    with pytest.raises(ValueError, match="got tests=0, degrees=0"):
        concrete.predictive_quantile(VAGUE, 0.05)
    with pytest.raises(ValueError, match=r"in \(0, 1\), got 0"):
        concrete.predictive_quantile(concrete.strength_prior("C25"), 0.0)


@pytest.mark.published(source="JCSS Probabilistic Model Code", place="part 3.1, 0.6 + 0.12 ln t")
@pytest.mark.parametrize(
    ("days", "factor"),
    [(28, 0.999865), (365, 1.307988), (3650, 1.584298), (18262, 1.777509)],
)
def test_age_factor(days, factor):  # formula published, values recomputed from it
    assert float(concrete.age_factor(days)) == pytest.approx(factor, abs=6e-7)


def test_age_factor_refuses_fresh_concrete():
    with pytest.raises(ValueError, match="1 day or more, got 0.5"):
        concrete.age_factor(0.5)


def test_in_situ_strength():
    # 30^0.96 = 26.1840, recomputed.
    assert float(concrete.in_situ_strength(30.0)) == pytest.approx(26.1840, abs=5e-5)
    assert float(concrete.in_situ_strength(30.0, 0.8)) == pytest.approx(0.8 * 26.1840, abs=5e-5)
