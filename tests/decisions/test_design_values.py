from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import integrate, stats

from assess.decisions import design_values as module

FOLDER = Path(__file__).parents[1] / "published"
PRINTED = pd.read_csv(FOLDER / "en1990_table_d.csv", comment="#")
RECOMPUTED = pd.read_csv(FOLDER / "en1990_annex_d_recomputed.csv", comment="#")
SMALL = PRINTED[np.isfinite(PRINTED.tests)]


@pytest.mark.published(source="EN 1990:2002 (from memory)", place="annex D, table D1")
@pytest.mark.parametrize(("column", "known"), [("d1_known", True), ("d1_unknown", False)])
def test_table_d1(column, known):
    # Values from memory. The table mostly cuts off instead of rounding, and prints 2.31 for
    # 2.326 (one test): 0.017 covers the worst entry.
    rows = PRINTED.dropna(subset=[column])
    found = module.annex_d_factor(rows.tests.to_numpy(), 0.05, known)
    np.testing.assert_allclose(found, rows[column], atol=0.017)


@pytest.mark.published(source="EN 1990:2002 (from memory)", place="annex D, table D2")
@pytest.mark.parametrize(("column", "known"), [("d2_known", True), ("d2_unknown", False)])
def test_table_d2(column, known):
    # Values from memory. Finite numbers of tests go with p = 0.001 (worst: 3.64 for 3.668);
    # infinitely many print 3.04, which is 0.8 * 3.8 and belongs to p = 0.00118.
    rows = SMALL.dropna(subset=[column])
    found = module.annex_d_factor(rows.tests.to_numpy(), 0.001, known)
    np.testing.assert_allclose(found, rows[column], atol=0.03)
    endless = module.annex_d_factor(np.inf, float(stats.norm.sf(3.04)), known)
    assert float(endless) == pytest.approx(3.04, abs=1e-9)


@pytest.mark.parametrize(
    ("column", "probability", "known", "tolerance"),
    [
        ("p05_known", 0.05, True, 1e-5),
        ("p05_unknown", 0.05, False, 1e-5),
        ("p001_known", 0.001, True, 1e-5),
        ("p001_unknown", 0.001, False, 1e-5),
    ],
)
def test_annex_d_recomputed(column, probability, known, tolerance):
    found = module.annex_d_factor(RECOMPUTED.tests.to_numpy(), probability, known)
    np.testing.assert_allclose(found, RECOMPUTED[column], rtol=2e-6, atol=tolerance)


@pytest.mark.parametrize(
    ("tests", "probability", "factor"),
    [(15, 0.05, 1.81907), (40, 0.05, 1.70581), (50, 0.05, 1.69323), (100, 0.05, 1.66867),
     (15, 0.001, 3.91160), (40, 0.001, 3.35394), (50, 0.001, 3.29757), (100, 0.001, 3.19044),
     (3, 0.01, 8.04198), (5, 0.01, 4.10458), (10, 0.01, 2.95915), (20, 0.01, 2.60220)],
)  # fmt: skip
def test_annex_d_more_numbers(tests, probability, factor):  # recomputed, unknown V
    assert float(module.annex_d_factor(tests, probability, False)) == pytest.approx(
        factor, abs=1e-5
    )


@pytest.mark.published(source="EN 13791:2019 (from memory)", place="table 6, k_n")
@pytest.mark.parametrize(
    ("tests", "printed"),
    [(8, 2.00), (10, 1.92), (12, 1.87), (15, 1.82), (20, 1.77), (25, 1.74), (30, 1.73)],
)
def test_factors_of_en13791(tests, printed):
    # Values from memory; the same formula, 2.0095 printed as 2.00.
    found = float(module.annex_d_factor(tests, 0.05, False))
    assert found == pytest.approx(printed, abs=0.01)


def test_annex_d_is_the_predictive_fractile():
    # Known V, n = 4: mean ~ N(m, 1/4), next value ~ N(mean, 1); P(next < m - k) by quadrature.
    factor = float(module.annex_d_factor(4, 0.05, True))
    below, _ = integrate.quad(
        lambda mu: stats.norm.pdf(mu, 0.0, 0.5) * stats.norm.cdf(-factor - mu), -6, 6, epsabs=1e-12
    )
    assert below == pytest.approx(0.05, abs=1e-9)


def test_annex_d_refuses_too_few_tests():
    with pytest.raises(ValueError, match="unknown coefficient .*at least 2 tests .*got 1"):
        module.annex_d_factor([5, 1], 0.05, False)
    with pytest.raises(ValueError, match="known coefficient .*at least 1 tests .*got 0"):
        module.annex_d_factor(0, 0.05, True)
    with pytest.raises(ValueError, match=r"in \(0, 0.5\], got 0.95"):
        module.annex_d_factor(5, 0.95, True)


def test_design_values_recomputed():
    # EN 1990 table C3 with alpha beta = 3.04 (resistance) and -2.66 (action), recomputed.
    resistance = (30.0, 0.15, 3.8, 0.8)
    action = (100.0, 0.35, 3.8, -0.7)
    assert float(module.design_value_normal(*resistance)) == pytest.approx(16.3200, abs=5e-5)
    assert float(module.design_value_lognormal(*resistance)) == pytest.approx(18.8518, abs=5e-5)
    approximate = module.design_value_lognormal_approximate(*resistance)
    assert float(approximate) == pytest.approx(19.0144, abs=5e-5)
    assert float(module.design_value_gumbel(*action)) == pytest.approx(235.5138, abs=5e-5)
    assert float(module.design_value_normal(*action)) == pytest.approx(193.1000, abs=5e-5)
    accompanying = module.ACTION_SENSITIVITY * module.ACCOMPANYING_FACTOR
    found = module.design_value_normal(100.0, 0.35, 3.8, accompanying)
    assert float(found) == pytest.approx(137.2400, abs=5e-5)


@given(st.floats(0.02, 0.6), st.floats(1.0, 5.0), st.floats(-1.0, 1.0))
def test_design_values_are_fractiles(variation, index, sensitivity):
    # P(X < x_d) = Phi(-alpha beta), through independent distribution functions.
    level = stats.norm.cdf(-sensitivity * index)
    normal = stats.norm(50.0, 50.0 * variation)
    log_sd = np.sqrt(np.log1p(variation**2))
    lognormal = stats.lognorm(log_sd, scale=50.0 / np.sqrt(1 + variation**2))
    scale = 50.0 * variation * np.sqrt(6) / np.pi
    gumbel = stats.gumbel_r(50.0 - np.euler_gamma * scale, scale)
    arguments = (50.0, variation, index, sensitivity)
    assert normal.cdf(module.design_value_normal(*arguments)) == pytest.approx(level, rel=1e-7)
    found = module.design_value_lognormal(*arguments)
    assert lognormal.cdf(found) == pytest.approx(level, rel=1e-7)
    assert gumbel.cdf(module.design_value_gumbel(*arguments)) == pytest.approx(level, rel=1e-7)


@pytest.mark.published(source="EN 1990:2002 (from memory)", place="C7(3)")
@pytest.mark.parametrize(
    ("ratio", "resistance", "action"),
    [(0.1, 1.0, -0.4), (0.2, 0.8, -0.7), (1.0, 0.8, -0.7), (7.0, 0.8, -0.7), (8.0, 0.4, -1.0)],
)
def test_standard_sensitivities(ratio, resistance, action):  # values from memory
    found = module.standard_sensitivities(ratio, 1.0)
    assert [float(value) for value in found] == [resistance, action]


@pytest.mark.parametrize(
    ("ratio", "reached"), [(0.1600001, 0.90055), (1.0, 1.06066), (7.5999999, 0.79838)]
)
def test_index_that_the_standard_sensitivities_reach(ratio, reached):
    # Linear normal margin designed with them: (0.8 + 0.7 r)/sqrt(1 + r²) of the target, so at
    # worst a fifth is lost at the ends of their range.
    resistance, action = (float(v) for v in module.standard_sensitivities(ratio, 1.0))
    margin = resistance - action * ratio
    assert margin / np.hypot(1.0, ratio) == pytest.approx(reached, abs=6e-6)


def test_refuses_nonsense():
    with pytest.raises(ValueError, match="must be positive, got 0"):
        module.standard_sensitivities(0.0, 1.0)
    with pytest.raises(ValueError, match="below 0.2, got 0.25; use the exact one"):
        module.design_value_lognormal_approximate(30.0, 0.25, 3.8, 0.8)
