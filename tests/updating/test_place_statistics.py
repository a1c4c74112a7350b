"""Statistics of places read alike: what they keep is all that the readings say."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from assess.updating.place_statistics import (
    Places,
    deviation_square,
    normal_log_likelihood,
    without_prefix,
)


def places(latent, precision, stage, population=None):
    count = len(latent)
    return Places(
        prefix="x",
        latent=np.array(latent),
        population=np.zeros(count, dtype=np.int64) if population is None else np.array(population),
        sort=np.zeros(count, dtype=np.int64),
        precision=np.array(precision, dtype=np.float64),
        stage=np.array(stage),
    )


READING = st.tuples(
    st.integers(0, 4), st.sampled_from([0.5, 2.0]), st.integers(1, 2), st.floats(-5.0, 5.0)
)


@given(st.lists(READING, min_size=1, max_size=12), st.integers(1, 2))
def test_the_grouped_likelihood_is_that_of_all_readings(readings, stage):
    latent = np.unique([r[0] for r in readings], return_inverse=True)[1]
    made = places(latent, [r[1] for r in readings], [r[2] for r in readings])
    value = np.array([r[3] for r in readings])
    data = without_prefix("x", made.data(value, stage))
    mean, variance = 0.7, 1.9
    found = float(np.sum(normal_log_likelihood(data, mean, variance)))
    active = [i for i, r in enumerate(readings) if r[2] <= stage]
    expected = 0.0
    if active:
        precision = np.array([readings[i][1] for i in active])
        same = latent[active][:, None] == latent[active]
        covariance = same * variance + np.diag(1.0 / precision)
        expected = stats.multivariate_normal(np.full(len(active), mean), covariance).logpdf(
            value[active]
        ) - 0.5 * np.sum(np.log(precision) - np.log(2.0 * np.pi))
    assert found == pytest.approx(expected, rel=1e-9, abs=1e-9)


def test_a_group_is_of_one_population_and_one_weight_at_every_stage():
    made = places([0, 1, 2, 2, 3], [1, 1, 1, 1, 4], [1, 1, 1, 2, 1], [0, 0, 0, 0, 1])
    data = without_prefix("x", made.data(np.zeros(5), 2))
    assert sorted(zip(made.group_population, data["count"], strict=True)) == [
        (0, 1.0), (0, 2.0), (1, 1.0),
    ]  # fmt: skip
    assert sorted(data["precision"][:, 0]) == [1.0, 2.0, 4.0]


def test_shapes_are_the_same_at_every_stage():
    made = places([0, 0, 1, 2], [1, 2, 1, 1], [1, 2, 2, 1])
    shapes = [{k: v.shape for k, v in made.data(np.ones(4), s).items()} for s in (0, 1, 2)]
    assert shapes[0] == shapes[1] == shapes[2]


def test_sums_of_squares_keep_their_digits_far_from_zero():
    value = 1e6 + np.array([0.0, 0.1, 0.25])
    made = places([0, 1, 2], [1, 1, 1], [1, 1, 1])
    data = without_prefix("x", made.data(value, 1))
    centre = 1e6 + 0.05
    expected = np.sum((value - centre) ** 2)
    assert float(deviation_square(data, centre)[0]) == pytest.approx(expected, rel=1e-6)


def test_the_summary_of_one_place_weighs_its_readings():
    made = places([0, 0, 1], [1, 3, 1], [1, 2, 1])
    precision, mean = made.summary(np.array([10.0, 20.0, 7.0]), 2, 0)
    assert precision.tolist() == [4.0]
    assert mean.tolist() == [17.5]
    assert made.summary(np.array([10.0, 20.0, 7.0]), 0, 0)[0].tolist() == [0.0]
