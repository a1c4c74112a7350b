"""Carbonation depths: likelihood against SciPy and adaptive quadrature, simulation, faults."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.pipeline import check_case
from assess.updating import bounds
from assess.updating.carbonation_depth import CarbonationDepth
from assess.updating.prior import joint_prior
from tests.updating import graphs
from tests.verification import cases

KIND = CarbonationDepth()
CARBONATION = {
    "carbonation_rate": {
        "distribution": "lognormal", "mean": "4 mm/yr^0.5", "V": 0.4, "source": "test",
    },
    "carbonation_rate_scatter": {
        "distribution": "lognormal", "mean": 0.35, "V": 0.4, "source": "test",
    },
}  # fmt: skip
FIRST = """location,depth [mm]
,18
,24
,>45
,none
,31
C1,20
C1,26
C1,>45
C2,none
C2,4
C3,>45
C3,>45
C4,22
C4,19
"""
SECOND = """location,section,depth [mm]
C1,,33
C2,,<5
C2,,none
,S1,28
C5,,none
C5,,>60
,,41
,,<5
"""
VALUES = {
    "deck.carbonation_rate": np.array([3.5, 6.0]),
    "deck.carbonation_rate_scatter": np.array([0.3, 0.55]),
}
AGES = {1: 39.0007, 2: 48.9993}  # 1 January 1971 to 1 January 2010 and 2020, in 365.25 days
ERROR = {1: 0.15, 2: 0.3}


def raw(first=FIRST, second=SECOND, entry=None):
    common = {"zone": "deck", "error": 0.15, "detection_limit": "2 mm"} | (entry or {})
    surveys = [
        {"date": "2010-01-01", "carbonation_depth": {"table": "a.csv", **common}},
        {"date": "2020-01-01",
         "carbonation_depth": {"table": "b.csv", **common, "error": 0.3,
                               "detection_limit": "3 mm"}},
    ]  # fmt: skip
    case = cases.base(surveys=surveys)
    case["zones"]["deck"]["carbonation"] = CARBONATION
    return case, {"a.csv": first, "b.csv": second}


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(*raw())


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


def at(draw):
    return {name: value[draw] for name, value in VALUES.items()}


def reference(rows, values, stage):
    """All places, one by one: the local rate by adaptive quadrature over its logarithm."""
    median = np.log(values["deck.carbonation_rate"])
    scatter = values["deck.carbonation_rate_scatter"]
    total = 0.0
    for place in range(len(rows.places)):
        here = np.flatnonzero((rows.place == place) & (rows.stage <= stage))
        if len(here) == 0:
            continue
        error = np.array([np.sqrt(np.log1p(ERROR[s] ** 2)) for s in rows.stage[here]])
        root = np.array([0.5 * np.log(AGES[s]) for s in rows.stage[here]])

        def density(log_rate, here=here, error=error, root=root):
            result = stats.norm.logpdf(log_rate, median, scatter)
            for row, e, r in zip(here, error, root, strict=True):
                reading = stats.norm(log_rate + r, e)
                value = rows.value[row]
                if np.isfinite(value):
                    result += reading.logpdf(value)
                elif np.signbit(value):
                    result += reading.logcdf(rows.extra["low"][row])
                else:
                    result += reading.logsf(rows.extra["high"][row])
            return result

        grid = np.linspace(median - 9 * scatter, median + 9 * scatter, 4001)
        peak = density(grid).max()
        steps = list(grid[np.argsort(density(grid))[-3:]])
        area = integrate.quad(
            lambda x, density=density, peak=peak: np.exp(density(x) - peak),
            grid[0], grid[-1], points=steps, limit=400, epsabs=0.0, epsrel=1e-11,
        )[0]  # fmt: skip
        total += peak + np.log(area)
    return total


def test_rows_are_read_with_their_bounds(rows):
    below, beyond = bounds.is_below(rows.value), bounds.is_beyond(rows.value)
    assert np.flatnonzero(below).tolist() == [3, 8, 15, 16, 18, 21]
    assert np.flatnonzero(beyond).tolist() == [2, 7, 10, 11, 19]
    np.testing.assert_allclose(np.exp(rows.extra["low"][[0, 3, 14, 15, 16]]), [2, 2, 3, 5, 3])
    np.testing.assert_allclose(np.exp(rows.extra["high"][[0, 2, 14, 19]]), [45, 45, 60, 60])
    np.testing.assert_allclose(rows.extra["age"][[0, -1]], list(AGES.values()), atol=1e-4)
    assert np.exp(rows.value[0]) == pytest.approx(18.0)


@pytest.mark.parametrize("stage", [1, 2])
def test_likelihood_is_that_of_all_places_by_quadrature(rows, stage):
    found = KIND.log_likelihood(rows, VALUES, KIND.data(rows, stage))
    expected = [reference(rows, at(draw), stage) for draw in (0, 1)]
    # Terms of the reading errors alone are left out, hence the difference of two points.
    assert found[1] - found[0] == pytest.approx(expected[1] - expected[0], rel=1e-6)


def test_likelihood_compares_data_sets_too(rows):
    # Other readings of the same design at the same parameters, at places alone and shared.
    value = rows.value.copy()
    value[[0, 5, 12]] = np.log([11.0, 35.0, 30.0])
    other = KIND.observed(rows, value)
    found = [KIND.log_likelihood(one, at(0), KIND.data(one, 2)) for one in (rows, other)]
    expected = [reference(one, at(0), 2) for one in (rows, other)]
    assert found[1] - found[0] == pytest.approx(expected[1] - expected[0], abs=1e-5)


def test_a_depth_read_below_the_stated_limit_is_a_bound(make_case):
    rows = KIND.rows(make_case(*raw("location,depth [mm]\nA,1.5\nB,2\nC,<1\nD,20\n")))
    assert np.flatnonzero(bounds.is_below(rows.value)).tolist()[:2] == [0, 2]
    np.testing.assert_allclose(np.exp(rows.extra["low"][:4]), [2.0, 2.0, 1.0, 2.0])


@pytest.mark.parametrize("error", [1e-3, 0.01, 0.1, 1.0])
@pytest.mark.parametrize("scatter", [0.05, 0.3, 1.0])
def test_bounds_at_one_place_are_exact_whatever_the_error(make_case, error, scatter):
    # Beyond 20 and below 40 mm at the same place in the same survey, and once more beyond 22 mm.
    table = "location,depth [mm]\nA,>20\nA,<40\nA,>22\n"
    case, tables = raw(table, "location,depth [mm]\nB,20\n", {"error": error})
    del case["surveys"][0]["carbonation_depth"]["detection_limit"]
    rows = KIND.rows(make_case(case, tables))
    values = {"deck.carbonation_rate": 4.0, "deck.carbonation_rate_scatter": scatter}
    found = KIND.log_likelihood(rows, values, KIND.data(rows, 1))
    e, root = np.sqrt(np.log1p(error**2)), np.sqrt(AGES[1])

    def integrand(z):
        depth = np.log(4.0 * root) + scatter * z
        chance = stats.norm.cdf((depth - np.log([20.0, 22.0])) / e).prod()
        return stats.norm.pdf(z) * chance * stats.norm.cdf((np.log(40.0) - depth) / e)

    at_limits = [(np.log(limit / (4.0 * root))) / scatter for limit in (20.0, 22.0, 40.0)]
    near = [z + k * e / scatter for z in at_limits for k in (-6.0, -2.0, 0.0, 2.0, 6.0)]
    cuts = sorted({-9.0, 9.0, *(z for z in near if -9.0 < z < 9.0)})
    area = sum(
        integrate.quad(integrand, a, b, epsabs=1e-14, epsrel=1e-10)[0]
        for a, b in zip(cuts[:-1], cuts[1:], strict=True)
    )
    assert found == pytest.approx(np.log(area), abs=2e-3 if error < 0.1 else 1e-5)


def test_readings_without_bounds_have_the_conjugate_posterior(make_case):
    # Known scatter and error: ln of the median rate is normal with a normal likelihood.
    case, tables = raw("location,depth [mm]\nA,20\nB,30\nC,26\n", "location,depth [mm]\nA,35\n")
    rows = KIND.rows(make_case(case, tables))
    scatter = 0.3
    grid = np.linspace(0.0, 3.0, 6001)
    values = {
        "deck.carbonation_rate": np.exp(grid),
        "deck.carbonation_rate_scatter": np.full(len(grid), scatter),
    }
    log_likelihood = KIND.log_likelihood(rows, values, KIND.data(rows, 2))
    weight = np.exp(log_likelihood - log_likelihood.max())
    mean = np.average(grid, weights=weight)
    # Each place estimates its ln rate with variance 1/sum(1/e²), around the median by scatter².
    e = {s: np.log1p(v**2) for s, v in ERROR.items()}
    y = {d: np.log(d) - 0.5 * np.log(AGES[1]) for d in (20.0, 30.0, 26.0)}
    late = np.log(35.0) - 0.5 * np.log(AGES[2])
    own = 1.0 / (1.0 / e[1] + 1.0 / e[2])
    estimates = [((y[20.0] / e[1] + late / e[2]) * own, own), (y[30.0], e[1]), (y[26.0], e[1])]
    precision = np.array([1.0 / (scatter**2 + v) for _, v in estimates])
    assert mean == pytest.approx(precision @ [m for m, _ in estimates] / precision.sum(), rel=1e-6)
    spread = np.average((grid - mean) ** 2, weights=weight)
    assert spread == pytest.approx(1.0 / precision.sum(), rel=1e-3)


def test_later_surveys_are_switched_off(rows, make_case):
    assert np.all(KIND.log_likelihood(rows, VALUES, KIND.data(rows, 0)) == 0.0)
    case, tables = raw()
    case["surveys"] = case["surveys"][:1]
    alone = KIND.rows(make_case(case, tables))
    ours = KIND.log_likelihood(rows, VALUES, KIND.data(rows, 1))
    theirs = KIND.log_likelihood(alone, VALUES, KIND.data(alone, 1))
    np.testing.assert_allclose(ours, theirs, rtol=1e-12)


def test_order_of_rows_does_not_matter(rows, make_case):
    def backwards(table):
        head, *body = table.splitlines()
        return "\n".join([head, *reversed(body)]) + "\n"

    other = KIND.rows(make_case(*raw(backwards(FIRST), backwards(SECOND))))
    np.testing.assert_allclose(
        KIND.log_likelihood(other, VALUES, KIND.data(other, 2)),
        KIND.log_likelihood(rows, VALUES, KIND.data(rows, 2)),
        rtol=1e-12,
    )


def test_cost_does_not_grow_with_the_number_of_readings(make_case):
    many = "location,depth [mm]\n" + ",20\n,25\n,>45\n,none\nC1,18\nC1,>45\n" * 200
    rows = KIND.rows(make_case(*raw(many)))
    few = KIND.rows(make_case(*raw("location,depth [mm]\n,20\n,25\n,>45\n,none\nC1,18\nC1,>45\n")))
    sizes = {name: array.shape for name, array in KIND.data(rows, 2).items()}
    assert sizes == {name: array.shape for name, array in KIND.data(few, 2).items()}


def test_other_readings_keep_the_shapes_that_were_compiled(rows):
    first = KIND.data(rows, 2)
    count = len(rows.value)
    for value in (np.full(count, 3.0), np.full(count, bounds.BELOW), np.full(count, bounds.BEYOND)):
        data = KIND.data(KIND.observed(rows, value), 2)
        assert {k: v.shape for k, v in data.items()} == {k: v.shape for k, v in first.items()}
        assert np.isfinite(KIND.log_likelihood(rows, VALUES, data)).all()


def test_simulation_follows_the_model(rows):
    count = 60_000
    values = {name: np.full(count, value[0]) for name, value in VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(1))
    error, root = np.sqrt(np.log1p(0.15**2)), 0.5 * np.log(AGES[1])
    known = stats.norm(np.log(3.5) + root, np.hypot(0.3, error))
    assert bounds.is_beyond(drawn[:, 0]).mean() == pytest.approx(known.sf(np.log(45.0)), abs=0.004)
    assert bounds.is_below(drawn[:, 15]).mean() == pytest.approx(
        stats.norm(np.log(3.5) + 0.5 * np.log(AGES[2]), 0.42).cdf(np.log(5.0)), abs=0.002
    )
    inside = drawn[np.isfinite(drawn[:, 0]), 0]
    low, high = known.cdf(np.log([2.0, 45.0]))
    assert stats.kstest(inside, lambda x: (known.cdf(x) - low) / (high - low)).pvalue > 1e-3
    # C1 in both surveys: one rate, two errors; rows of their own share nothing. At a low rate few
    # readings are bounds.
    slow = {**values, "deck.carbonation_rate": np.full(count, 2.0)}
    drawn = KIND.simulate(rows, slow, np.random.default_rng(2))
    inside = drawn[np.isfinite(drawn[:, [0, 1, 5, 14]]).all(axis=1)]
    assert len(inside) > 0.99 * count
    covariance = np.cov(inside[:, [0, 1, 5, 14]].T)
    assert covariance[2, 3] == pytest.approx(0.3**2, rel=0.06)
    assert covariance[2, 2] == pytest.approx(0.3**2 + error**2, rel=0.04)
    assert abs(covariance[0, 1]) < 0.002


def test_graph_numbers_and_gradient_agree(case, rows):
    graphs.check(KIND, rows, joint_prior(case), 2)


def test_no_local_variable_is_of_carbonation(rows):
    assert KIND.local(rows, 2, "S1", "deck", VALUES) == ()


@pytest.mark.parametrize(
    ("table", "entry", "words"),
    [
        ("location\nA\n", {}, "a.csv:1: column 'depth' is missing"),
        ("depth [MPa]\n20\n", {}, "a.csv:1: column 'depth' has a unit that does not convert to mm"),
        ("depth\n20\n", {}, "a.csv:1: column 'depth' has no unit"),
        ("depth [mm]\n20\n-3\n", {}, "a.csv:3: column 'depth': is out of range, given -3"),
        ("depth [mm]\n0\n", {}, "a.csv:2: column 'depth': is out of range, given 0"),
        ("depth [mm]\nsome\n", {}, "a.csv:2: column 'depth': text where a number is wanted"),
        ("depth [mm]\n", {}, "a.csv:1: the table has a header but no rows"),
        ("zone,depth [mm]\ndeck,20\nroof,21\n", {}, "a.csv:3: there is no zone of this name"),
        ("section,depth [mm]\nS9,20\n", {}, "a.csv:2: there is no section of this name"),
        ("depth [mm]\n20\n", {"error": 20}, "a coefficient of variation is out of range"),
        ("depth [mm]\n20\n", {"detection_limit": "-2 mm"}, "a length is out of range"),
        ("zone,depth [mm]\ndeck,20\nwall,21\nwall,22\n", {},
         "a.csv:3: carbonation was measured in a zone without carbonation, given wall"),
        ("depth [mm]\n20\nnone\n", {"detection_limit": None},
         "the smallest depth that shows is not stated, given a.csv:3"),
    ],
)  # fmt: skip
def test_faults_are_said_with_their_place(tmp_path, table, entry, words):
    case, tables = raw(table)
    first = case["surveys"][0]["carbonation_depth"] | entry
    case["surveys"][0]["carbonation_depth"] = {k: v for k, v in first.items() if v is not None}
    if "zone," in table:
        del case["surveys"][0]["carbonation_depth"]["zone"]
    case["zones"]["wall"] = cases.base()["zones"]["deck"]
    path = cases.write_case(tmp_path, case, tables)
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault for fault in faults), faults


def test_concrete_without_age_is_refused(tmp_path):
    case, tables = raw()
    case["structure"]["built"] = "2010-01-01"
    faults = [str(f) for f in check_case(cases.write_case(tmp_path, case, tables)).faults]
    assert any("carbonation was measured on the day of construction" in f for f in faults), faults
