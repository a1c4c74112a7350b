from pathlib import Path

import mpmath
import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from assess.reliability import index as module

PERIODS = pd.read_csv(
    Path(__file__).parents[1] / "published" / "index_for_period_recomputed.csv",
    comment="#",
    index_col="index",
)


def exact_probability(beta):
    with mpmath.workdps(60):
        return mpmath.erfc(mpmath.mpf(beta) / mpmath.sqrt(2)) / 2


@pytest.mark.parametrize("beta", [-8.0, -1.0, 0.0, 0.5, 3.8, 8.0, 20.0, 37.0])
def test_probability_against_high_precision(beta):
    exact = float(exact_probability(beta))
    assert float(module.probability_from_index(beta)) == pytest.approx(exact, rel=1e-12)
    if beta > -5:  # below, a double next to 1 no longer tells the index
        assert float(module.index_from_probability(exact)) == pytest.approx(beta, abs=1e-11)


@pytest.mark.parametrize("beta", [-40.0, -6.0, 0.3, 6.0, 45.0, 200.0])
def test_index_from_logarithms(beta):
    with mpmath.workdps(60):
        log_failure = float(mpmath.log(exact_probability(beta)))
        log_survival = float(mpmath.log(exact_probability(-beta)))
    if beta > -6:
        found = float(module.index_from_log_probability(log_failure))
        assert found == pytest.approx(beta, rel=1e-10)
    if beta <= 6.0:
        found = float(module.index_from_log_probability(log_survival, of_survival=True))
        assert found == pytest.approx(beta, rel=1e-10)


def test_ends():
    np.testing.assert_array_equal(
        module.index_from_probability([0.0, 0.5, 1.0, np.nan]), [np.inf, 0.0, -np.inf, np.nan]
    )


@pytest.mark.published(source="EN 1990:2002 (from memory)", place="table C1")
@pytest.mark.parametrize(
    ("probability", "printed"),
    [(1e-1, 1.28), (1e-2, 2.32), (1e-3, 3.09), (1e-4, 3.72), (1e-5, 4.27), (1e-6, 4.75),
     (1e-7, 5.20)],
)  # fmt: skip
def test_en1990_table(probability, printed):
    # Values from memory. The table rounds 2.326 to 2.32 and 4.265 to 4.27: 0.0065 is asked.
    assert float(module.index_from_probability(probability)) == pytest.approx(printed, abs=0.0065)


@pytest.mark.published(source="JCSS Probabilistic Model Code (2001)", place="part 1, Pf and beta")
@pytest.mark.parametrize(
    ("probability", "printed"),
    [(1e-1, 1.3), (1e-2, 2.3), (1e-3, 3.1), (1e-4, 3.7), (1e-5, 4.2), (1e-6, 4.7), (1e-7, 5.2)],
)
def test_jcss_table(probability, printed):
    # Read in a secondary source. 4.265 and 4.753 are cut off to 4.2 and 4.7: 0.07 is asked.
    assert float(module.index_from_probability(probability)) == pytest.approx(printed, abs=0.07)


@pytest.mark.parametrize(
    ("probability", "index"),
    [(1e-1, 1.28155), (1e-2, 2.32635), (1e-3, 3.09023), (1e-4, 3.71902), (1e-5, 4.26489),
     (1e-6, 4.75342), (1e-7, 5.19934)],
)  # fmt: skip
def test_index_recomputed(probability, index):
    assert float(module.index_from_probability(probability)) == pytest.approx(index, abs=5.1e-6)


def test_index_for_period_table():
    years = PERIODS.columns.astype(float).to_numpy()
    found = module.index_for_period(PERIODS.index.to_numpy()[:, None], years)
    np.testing.assert_allclose(found, PERIODS.to_numpy(), atol=6e-5)


@pytest.mark.published(source="fib Model Code 2010 (from memory)", place="existing structures")
@pytest.mark.parametrize(
    ("fifty", "fifteen", "one"), [(3.1, 3.4, 4.1), (3.8, 4.1, 4.7)]
)  # values from memory
def test_periods_of_the_model_code(fifty, fifteen, one):
    yearly = module.index_for_one_year(fifty, 50)
    assert round(float(yearly), 1) == one
    assert round(float(module.index_for_period(yearly, 15)), 1) == fifteen


@pytest.mark.parametrize(
    ("fifty", "one"), [(4.3, 5.0989), (3.8, 4.6782), (3.3, 4.2724), (1.5, 2.9929)]
)
def test_index_for_one_year(fifty, one):  # recomputed
    assert float(module.index_for_one_year(fifty, 50)) == pytest.approx(one, abs=6e-5)


@pytest.mark.parametrize(("beta", "years"), [(-2.0, 3), (0.2, 10), (4.7, 50), (9.0, 50), (20, 100)])
def test_index_for_period_against_high_precision(beta, years):
    with mpmath.workdps(400):
        survival = (mpmath.erfc(-mpmath.mpf(beta) / mpmath.sqrt(2)) / 2) ** years
        failure = mpmath.mpf(1) - survival
        found = mpmath.mpf(float(module.index_for_period(beta, years)))
        back = mpmath.erfc(found / mpmath.sqrt(2)) / 2
        assert abs(back / failure - 1) < 1e-9


@given(st.floats(-3.0, 12.0), st.integers(1, 200))
def test_period_and_back(beta, years):
    many = module.index_for_period(beta, years)
    assert many <= beta + 1e-12
    assert float(module.index_for_one_year(many, years)) == pytest.approx(beta, abs=1e-8)


def test_index_error_is_the_slope():
    # Against a finite difference of the index itself.
    probability, step = 1e-4, 1e-9
    slope = (
        module.index_from_probability(probability - step)
        - module.index_from_probability(probability + step)
    ) / (2 * step)
    beta = module.index_from_probability(probability)
    assert float(module.index_error(beta, 1e-6)) == pytest.approx(float(slope) * 1e-6, rel=1e-6)


def test_index_error_at_the_ends():
    errors = module.index_error([np.inf, 30.0, 60.0, 2.0], [0.0, 1e-200, 1e-300, 0.0])
    assert errors[0] == np.inf
    assert np.isfinite(errors[1])
    assert errors[2] == np.inf
    assert errors[3] == 0.0


def test_refuses_nonsense():
    with pytest.raises(ValueError, match=r"in \[0, 1\], got 1.5"):
        module.index_from_probability([0.1, 1.5])
    with pytest.raises(ValueError, match="at most 0, got 0.1"):
        module.index_from_log_probability(0.1)
    with pytest.raises(ValueError, match="years must be positive, got 0"):
        module.index_for_period(3.8, 0)
    with pytest.raises(ValueError, match="must not be negative, got -0.1"):
        module.index_error(3.8, -0.1)
