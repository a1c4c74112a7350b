"""EN 13791:2019 and ACI 214.4R-10; tables from memory, factors recomputed with SciPy."""

import numpy as np
import pytest
from scipy import stats

from assess.mechanics.characteristic_strength import (
    K_N,
    characteristic_strength_en,
    equivalent_specified_strength,
    one_sided_factor,
)

REGION = np.array([31.2, 28.4, 35.0, 30.1, 26.9, 33.3, 29.7, 32.5])


def test_factors_of_the_european_standard_are_those_of_a_prediction():
    # EN 1990, table D1, V unknown: t(0.05; n - 1) sqrt(1 + 1/n); 8 is printed as 2.00.
    for count, printed in K_N.items():
        predicted = stats.t(count - 1).ppf(0.95) * np.sqrt(1.0 + 1.0 / count)
        assert printed == pytest.approx(predicted, abs=0.0105)


def test_characteristic_strength_is_the_smaller_of_two():
    scatter = REGION.std(ddof=1)
    assert characteristic_strength_en(REGION) == pytest.approx(REGION.mean() - 2.0 * scatter)
    even = np.full(8, 25.0)  # no scatter counts as 8 %; the lowest plus 4 MPa is larger
    assert characteristic_strength_en(even) == pytest.approx(25.0 * (1.0 - 2.0 * 0.08))
    low = np.array([14.0] + [30.0] * 29)  # lowest plus 2 MPa
    assert characteristic_strength_en(low) == pytest.approx(16.0)


def test_a_count_between_printed_ones_takes_the_larger_factor():
    values = np.linspace(28.0, 36.0, 17)
    expected = values.mean() - 1.81 * max(values.std(ddof=1), 0.08 * values.mean())
    assert characteristic_strength_en(values) == pytest.approx(expected)


def test_too_few_places_give_nothing():
    with pytest.raises(ValueError, match="8 test locations or more, got 7"):
        characteristic_strength_en(REGION[:7])
    with pytest.raises(ValueError, match="3 cores or more, got 2"):
        equivalent_specified_strength(REGION[:2], 0.03, 0.75)


@pytest.mark.parametrize(
    ("count", "confidence", "factor"),
    # Recomputed with the non-central t distribution; agrees with ACI 214.4R-10, table 9.2 and
    # Natrella, table A-7 (both from memory).
    [(3, 0.75, 2.5011), (5, 0.90, 2.7423), (8, 0.95, 2.5819), (12, 0.75, 1.6244)],
)
def test_one_sided_factors(count, confidence, factor):
    assert one_sided_factor(count, confidence) == pytest.approx(factor, abs=5e-5)


def test_one_sided_bound_covers_at_its_confidence():
    rng = np.random.default_rng(8)
    samples = rng.normal(30.0, 4.0, (20_000, 6))
    bound = samples.mean(1) - one_sided_factor(6, 0.90) * samples.std(1, ddof=1)
    share = np.mean(bound < stats.norm(30.0, 4.0).ppf(0.10))
    assert share == pytest.approx(0.90, abs=0.01)


def test_error_of_the_corrections_adds_in_squares():
    mean, scatter = REGION.mean(), REGION.std(ddof=1)
    expected = mean - np.hypot(1.7399 * scatter, 0.6745 * 0.036 * mean)
    assert equivalent_specified_strength(REGION, 0.036, 0.75) == pytest.approx(expected, abs=1e-3)
