"""Cover: the inner layer of bars, and bars that were read and then laid bare."""

import numpy as np
import pytest
from scipy import stats

from assess.case.reader import read_case
from assess.updating.kinds import KINDS
from assess.updating.model import specify
from assess.vocabulary import vocabulary
from tests.updating.graphs import graph, numbers
from tests.verification import cases

COVER = KINDS["cover"]
VALUES = {
    "deck.cover_mean": np.array([40.0, 36.0]),
    "deck.cover_scatter": np.array([8.0, 5.0]),
    "cover_meter_1.bias": np.array([2.0, -3.0]),
}
METER = {"name": "A", "bias": "3 mm", "scatter": "2 mm"}


@pytest.fixture
def make(make_case):
    def build(table, **entry):
        entry = {"table": "cover.csv", "zone": "deck", "meter": METER, **entry}
        case = cases.base(surveys=[{"date": "2020-01-01", "cover": entry}])
        return make_case(case, {"cover.csv": table})

    return build


def test_inner_bars_lie_deeper_by_the_outer_ones_and_scatter_more(make):
    case = make("cover [mm],layer\n52,inner\n40,outer\n41,\n>60,inner\n", outer_bar="12 mm")
    rows = COVER.rows(case)
    assert rows.value[:3].tolist() == [40.0, 40.0, 41.0]
    assert rows.extra["variance"].tolist() == [8.0, 4.0, 4.0, 8.0]
    assert rows.extra["beyond"][3] == 48.0
    assert rows.extra["reach"].tolist() == [48.0, 60.0, 60.0, 48.0]
    found = COVER.log_likelihood(rows, VALUES, COVER.data(rows, 1))
    for k in (0, 1):
        mean = VALUES["deck.cover_mean"][k] + VALUES["cover_meter_1.bias"][k]
        total = VALUES["deck.cover_scatter"][k] ** 2 + np.array([8.0, 4.0, 4.0])
        exact = stats.norm(mean, np.sqrt(total)).logpdf([40.0, 40.0, 41.0]).sum()
        exact += stats.norm(mean, np.sqrt(total[0])).logsf(48.0)
        assert found[k] == pytest.approx(exact + 1.5 * np.log(2 * np.pi))


def test_inner_bars_need_the_outer_diameter(make):
    (fault,) = COVER.faults(make("cover [mm],layer\n52,outer\n40,inner\n"))
    assert fault.line == 3
    assert "diameter of the outer bars" in str(fault)


TABLE = "location,cover [mm],exposed cover [mm]\n,44,41\nR1,39,\nR1,43,40\n,45,\n"


def test_a_bar_laid_bare_is_a_second_reading_without_bias(make):
    rows = COVER.rows(make(TABLE, exposed_error="1 mm"))
    assert len(rows.value) == 6
    found = COVER.log_likelihood(rows, VALUES, COVER.data(rows, 1))
    exact = []
    for k in (0, 1):
        bias = VALUES["cover_meter_1.bias"][k]
        mean = np.array([bias, bias, bias, bias, 0.0, 0.0]) + VALUES["deck.cover_mean"][k]
        place = np.array([0, 1, 1, 2, 0, 1])
        covariance = np.diag([4.0, 4.0, 4.0, 4.0, 1.0, 1.0])
        covariance += VALUES["deck.cover_scatter"][k] ** 2 * (place[:, None] == place)
        reading = [44.0, 39.0, 43.0, 45.0, 41.0, 40.0]
        exact.append(stats.multivariate_normal(mean, covariance).logpdf(reading))
    assert found[1] - found[0] == pytest.approx(exact[1] - exact[0])


def test_many_pairs_tell_the_bias_from_the_cover(make):
    # Reading less truth is bias plus both errors, whatever the cover: its mean has the variance
    # (4 + 1)/n. The likelihood in the bias, along covers that agree with the truth, is that.
    rng = np.random.default_rng(4)
    truth = rng.normal(40.0, 8.0, 60)
    pairs = [f"{t + 3.0 + 2.0 * rng.normal():.2f},{t + rng.normal():.2f}\n" for t in truth]
    rows = COVER.rows(make("cover [mm],exposed cover [mm]\n" + "".join(pairs)))
    difference = rows.value[:60] - rows.value[60:]
    bias = np.linspace(-2.0, 8.0, 401)
    values = {
        "deck.cover_mean": np.full(401, 40.0),
        "deck.cover_scatter": np.full(401, 1e4),  # nothing known of the covers
        "cover_meter_1.bias": bias,
    }
    log_likelihood = COVER.log_likelihood(rows, values, COVER.data(rows, 1))
    exact = stats.norm(difference.mean(), np.sqrt(5.0 / 60.0)).logpdf(bias)
    np.testing.assert_allclose(
        log_likelihood - log_likelihood.max(), exact - exact.max(), atol=1e-3
    )


def test_the_graph_agrees(make):
    case = make(TABLE)
    prior, rows = specify(case).prior, COVER.rows(case)
    at = np.random.default_rng(1).normal(size=len(prior.names))
    value, gradient = graph(COVER, rows, prior, 1)(at)
    assert value == pytest.approx(numbers(COVER, rows, prior, 1, at))
    assert np.all(np.isfinite(gradient))


def test_readings_in_centimetres_are_doubted_though_each_may_be(make_case):
    # 5.5 mm is a cover that is met; a median of it is not.
    table = "cover [mm]\n" + "".join(f"{4.6 + 0.2 * k:.1f}\n" for k in range(10))
    entry = {"table": "cover.csv", "zone": "deck", "meter": METER}
    case = cases.base(surveys=[{"date": "2020-01-01", "cover": entry}])
    path = make_case(case, {"cover.csv": table}).path
    (doubt,) = [d for d in read_case(path, vocabulary()).doubts if "median" in str(d)]
    assert doubt.line == 2
    assert "given 5.5 mm" in str(doubt)
    assert "written in cm" in str(doubt)
