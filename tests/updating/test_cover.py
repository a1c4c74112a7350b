from dataclasses import replace

import numpy as np
import pytest
from scipy import integrate, stats

from assess.updating.kinds import KINDS
from tests.verification import cases

COVER = KINDS["cover"]
VALUES = {
    "deck.cover_mean": np.array([38.0, 42.0]),
    "deck.cover_scatter": np.array([7.0, 9.5]),
    "cover_meter_1.bias": np.array([1.5, -2.0]),
    "cover_meter_2.bias": np.array([-3.0, 0.5]),
}
ERROR = (3.0, 4.0)  # scatter of the two meters


def _at(draw):
    return {name: value[draw] for name, value in VALUES.items()}


@pytest.fixture(scope="module")
def rows(example_case):
    return COVER.rows(example_case)


def _reference(rows, values, stage):
    """All active readings, one by one: singles normal, shared places jointly, censored tails."""
    total = 0.0
    mean, sd = values["deck.cover_mean"], values["deck.cover_scatter"]
    active = rows.stage <= stage
    for place in range(len(rows.places)):
        here = np.flatnonzero((rows.place == place) & active)
        if len(here) == 0:
            continue
        meter = rows.extra["meter"][here].astype(int)
        centre = mean + np.array([values[f"cover_meter_{m + 1}.bias"] for m in meter])
        noise = np.array([ERROR[m] for m in meter])
        covariance = np.diag(noise**2) + sd**2
        limit = rows.extra["beyond"][here]
        if np.isfinite(limit).any():
            assert len(here) == 1
            total += stats.norm(centre[0], np.sqrt(covariance[0, 0])).logsf(limit[0])
        else:
            total += stats.multivariate_normal(centre, covariance).logpdf(rows.value[here])
    return total


@pytest.mark.parametrize("stage", [1, 2])
def test_likelihood_is_the_sum_over_readings(rows, stage):
    data = COVER.data(rows, stage)
    ours = [COVER.log_likelihood(rows, _at(i), data) for i in (0, 1)]
    reference = [_reference(rows, _at(i), stage) for i in (0, 1)]
    assert ours[1] - ours[0] == pytest.approx(reference[1] - reference[0], rel=1e-9)


def test_before_the_first_survey_nothing_is_known(rows):
    assert COVER.log_likelihood(rows, _at(0), COVER.data(rows, 0)) == 0.0


def test_stage_equals_the_case_with_the_first_survey_only(rows, make_case):
    case = cases.example()
    case["surveys"] = case["surveys"][:1]
    first = make_case(case, cases.EXAMPLE_TABLES)
    alone = COVER.rows(first)
    ours = [COVER.log_likelihood(rows, _at(i), COVER.data(rows, 1)) for i in (0, 1)]
    theirs = [COVER.log_likelihood(alone, _at(i), COVER.data(alone, 1)) for i in (0, 1)]
    assert ours[1] - ours[0] == pytest.approx(theirs[1] - theirs[0], rel=1e-12)


def test_range_of_a_meter_holds_for_all_its_readings(rows):
    meter = rows.extra["meter"]
    np.testing.assert_array_equal(rows.extra["reach"][meter == 0], 60.0)
    np.testing.assert_array_equal(rows.extra["reach"][meter == 1], 55.0)


def test_other_readings_keep_the_shapes_that_were_compiled(rows):
    # Simulated data may be censored elsewhere, or nowhere.
    first = COVER.data(rows, 2)
    for value in (np.full(len(rows.value), 40.0), np.full(len(rows.value), np.nan)):
        other = COVER.data(COVER.observed(rows, value), 2)
        assert {k: v.shape for k, v in other.items()} == {k: v.shape for k, v in first.items()}
    everything = COVER.data(COVER.observed(rows, np.full(len(rows.value), np.nan)), 2)
    assert everything["cover_censored"].sum() == len(rows.value)
    assert not everything["cover_shared_precision"].any()


def test_simulation_has_the_moments_of_the_model(rows):
    values = {name: np.full(40_000, value[0]) for name, value in VALUES.items()}
    values["deck.cover_mean"] = np.full(40_000, 30.0)  # few readings are beyond the range
    simulated = COVER.simulate(rows, values, np.random.default_rng(1))
    first, second = np.flatnonzero(rows.place == rows.place_of("S1"))[:2]
    both = np.isfinite(simulated[:, [first, second]]).all(axis=1)
    known = stats.norm(31.5, np.hypot(7.0, 3.0))
    share = np.isnan(simulated[:, first]).mean()
    assert share == pytest.approx(known.sf(60.0), abs=0.002)
    covariance = np.cov(simulated[both][:, [first, second]].T)
    assert covariance[0, 1] == pytest.approx(49.0, rel=0.05)


def test_local_cover_given_its_readings(rows):
    found = COVER.local(rows, 1, "S1", "deck", VALUES)[0]
    # Two readings of meter 1 at S1: 43 and 39 mm.
    prior, precision = 7.0**-2.0, 3.0**-2.0
    mean = (prior * 38.0 + precision * (43.0 + 39.0 - 2 * 1.5)) / (prior + 2 * precision)
    assert found.mean[0] == pytest.approx(mean)
    assert found.sd[0] == pytest.approx((prior + 2 * precision) ** -0.5)
    elsewhere = COVER.local(rows, 2, "S2", "deck", VALUES)[0]
    np.testing.assert_array_equal(elsewhere.mean, VALUES["deck.cover_mean"])


def test_a_reading_beyond_the_range_conditions_the_local_cover(rows):
    # S1 once more, now out of reach at 60 mm: posterior by quadrature of its definition.
    there = np.flatnonzero(rows.place == rows.place_of("S1"))
    value, beyond = rows.value.copy(), rows.extra["beyond"].copy()
    value[there[1]], beyond[there[1]] = np.nan, 60.0
    censored = replace(rows, value=value, extra={**rows.extra, "beyond": beyond})
    (found,) = COVER.local(censored, 1, "S1", "deck", VALUES)
    for draw in range(len(VALUES["deck.cover_mean"])):
        at = _at(draw)
        bias = at["cover_meter_1.bias"]

        def density(c, at=at, bias=bias):
            return (
                stats.norm.pdf(c, at["deck.cover_mean"], at["deck.cover_scatter"])
                * stats.norm.pdf(rows.value[there[0]], c + bias, 3.0)
                * stats.norm.cdf((c + bias - 60.0) / 3.0)
            )

        total = integrate.quad(density, 0.0, 120.0, points=[50.0, 60.0])[0]
        z = np.array([[[-2.0], [0.0], [2.0]]])
        for value_at, score in zip(
            found.values(z, np.array([draw]))["cover"][0], z.ravel(), strict=True
        ):
            below = integrate.quad(density, 0.0, value_at, points=[value_at - 5.0])[0] / total
            assert below == pytest.approx(stats.norm.cdf(score), rel=2e-2)


def test_graph_and_numbers_agree(rows):
    tensor = pytest.importorskip("pytensor.tensor")
    graph = {name: tensor.dscalar() for name in VALUES}
    data = COVER.data(rows, 2)
    found = COVER.log_likelihood(rows, graph, data).eval(
        {graph[name]: value[0] for name, value in VALUES.items()}, mode="FAST_COMPILE"
    )
    assert found == pytest.approx(COVER.log_likelihood(rows, _at(0), data), rel=1e-10)
