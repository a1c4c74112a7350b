"""Corrosion currents: likelihood against adaptive quadrature, simulation, entries, faults."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.pipeline import check_case
from assess.updating.corrosion_current import CorrosionCurrent
from assess.updating.prior import joint_prior
from tests.updating import graphs
from tests.verification import cases

KIND = CorrosionCurrent()
FIRST = (
    "location,section,current [µA/cm^2]\nR1,,passive\nR2,,0.8\n,S1,passive\n"
    ",,1.5\n,,0.6\n,,passive\n,,0.04\n,,<0.25\n"
)
SECOND = "location,section,current [µA/cm^2]\nR1,,1.1\nR2,,1.3\nR2,,1.0\n,S1,passive\n,,2.0\n"
THIRD = "location,section,current [µA/cm^2]\nR1,,0.7\n,S1,below limit\n"
VALUES = {
    "deck.onset": np.array([32.0, 45.0]),
    "deck.onset_scatter": np.array([0.4, 0.3]),
    "deck.current": np.array([1.0, 0.3]),
    "deck.current_scatter": np.array([0.5, 0.8]),
    "corrosion_current.device_1": np.array([1.2, 0.6]),
    "corrosion_current.device_2": np.array([0.8, 1.5]),
    "corrosion_current.season_1": np.array([0.5, -1.0]),
    "corrosion_current.season_2": np.array([-0.3, 0.8]),
}
ENTRIES = (
    {"table": "a.csv", "zone": "deck", "device": "A", "season": 0.4},
    {"table": "b.csv", "zone": "deck", "device": "B", "repeatability": 0.3,
     "passive_limit": 0.2},
    {"table": "c.csv", "zone": "deck", "device": "B", "average": True},
)  # fmt: skip
DATES = ("2000-01-01", "2012-01-01", "2022-01-01")
AGES = tuple((np.datetime64(d) - np.datetime64("1971-01-01")).astype(float) / 365.25 for d in DATES)
TABLES = {"a.csv": FIRST, "b.csv": SECOND, "c.csv": THIRD}


def raw(entries=ENTRIES, tables=TABLES):
    surveys = [
        {"date": date, "corrosion_current": dict(entry)}
        for date, entry in zip(DATES, entries, strict=False)
    ]
    return cases.base(corrosion=True, surveys=surveys), dict(tables)


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(*raw())


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


def at(draw):
    return {name: array[draw] for name, array in VALUES.items()}


def test_rows_below_the_passive_limit_have_no_value(rows):
    assert np.exp(rows.value[[1, 3, 4, 8]]) == pytest.approx([0.8, 1.5, 0.6, 1.1])
    assert np.isnan(rows.value[[0, 2, 5, 6, 7]]).all()  # 0.04 is below 0.1
    np.testing.assert_allclose(np.exp(rows.extra["limit"][[0, 7, 8]]), [0.1, 0.25, 0.2])
    np.testing.assert_allclose(rows.extra["season"][[0, 8, 13]],
                               [np.sqrt(np.log(1.16)), np.sqrt(np.log(1.25)), 0.0])  # fmt: skip
    assert rows.places[:3] == ("deck: R1", "deck: R2", "section S1")


def _limit(rows, row, survey):
    own = rows.places[rows.place[row]] == "" and survey == 1 and row == 7  # the one that says <0.25
    return np.log(0.25 if own else 0.2 if survey == 2 else 0.1)


def visits_of(rows, place, value, stage):
    """(age, ln reading or NaN, mean of ln reading, error, ln limit) of a place, by hand."""
    found = []
    season = {1: 0.4, 2: 0.5}
    for row in np.flatnonzero((rows.place == place) & (rows.stage <= stage)):
        k = int(rows.stage[row])
        mean = np.log(value["deck.current"])
        mean += np.log(value[f"corrosion_current.device_{1 if k == 1 else 2}"])
        if k < 3:
            mean += np.sqrt(np.log1p(season[k] ** 2)) * value[f"corrosion_current.season_{k}"]
        error = np.sqrt(np.log1p((0.3 if k == 2 else 0.2) ** 2))
        found.append((AGES[k - 1], rows.value[row], mean, error, _limit(rows, row, k)))
    return found


def by_quadrature(visits, value):
    """Likelihood of a place's readings: onset interval by interval, local current adaptively."""
    onset = stats.lognorm(value["deck.onset_scatter"], scale=value["deck.onset"])
    scatter = value["deck.current_scatter"]
    ages = sorted({visit[0] for visit in visits})
    total = 0.0
    for low, high in zip([0.0, *ages], [*ages, np.inf], strict=True):

        def density(u, high=high):
            product = stats.norm.pdf(u, 0.0, scatter)
            for age, reading, mean, error, limit in visits:
                active = age >= high
                if np.isnan(reading):
                    product *= stats.norm.cdf((limit - mean - u) / error) if active else 1.0
                else:
                    product *= stats.norm.pdf(reading, mean + u, error) if active else 0.0
            return product

        points = [v[1] - v[2] for v in visits if np.isfinite(v[1])]
        inner = integrate.quad(density, -9 * scatter, 9 * scatter, points=points or [0.0],
                               epsabs=1e-13, epsrel=1e-9, limit=400)[0]  # fmt: skip
        total += (onset.cdf(high) - onset.cdf(low)) * inner
    return total


@pytest.mark.parametrize("stage", [1, 2, 3])
@pytest.mark.parametrize("draw", [0, 1])
def test_likelihood_is_that_of_an_adaptive_quadrature(rows, draw, stage):
    value = at(draw)
    expected = 0.0
    for place in range(len(rows.places)):
        visits = visits_of(rows, place, value, stage)
        if not visits:
            continue
        expected += np.log(by_quadrature(visits, value))
        if len(visits) < (rows.place == place).sum() or len(visits) > 1:
            # Shared places leave out the constants of their errors.
            for _, reading, _, error, _ in visits:
                expected += np.isfinite(reading) * np.log(np.sqrt(2.0 * np.pi) * error)
        else:
            expected += np.isfinite(visits[0][1]) * 0.5 * np.log(2.0 * np.pi)
    found = KIND.log_likelihood(rows, value, KIND.data(rows, stage))
    assert found == pytest.approx(expected, rel=2e-6)


def test_quadrature_over_low_readings_holds_for_sharp_and_blunt_errors(make_case):
    # Three low readings of one place, whose local currents scatter up to ten errors wide.
    case, tables = raw()
    for name in tables:
        tables[name] = "location,current [µA/cm^2]\nR1,passive\n"
    rows = KIND.rows(make_case(case, tables))
    for scatter, error in ((0.1, 1e-5), (0.5, 1e-5), (1.0, 1e-5), (2.0, 1e-2)):
        for current in (0.02, 0.1, 1.0):
            value = at(0) | {"deck.current_scatter": scatter, "deck.current": current}
            value["deck.onset"] = 15.0  # active at all visits, nearly for sure
            found = KIND.log_likelihood(rows, value, KIND.data(rows, 3))
            expected = np.log(by_quadrature(visits_of(rows, 0, value, 3), value))
            assert found == pytest.approx(expected, abs=error)


def test_later_surveys_are_switched_off(rows, make_case):
    assert KIND.log_likelihood(rows, at(0), KIND.data(rows, 0)) == 0.0
    case, tables = raw()
    case["surveys"] = case["surveys"][:1]
    alone = KIND.rows(make_case(case, tables))
    # Alone, all places are single: the constants of their errors apart, nothing differs.
    ours = [KIND.log_likelihood(rows, at(draw), KIND.data(rows, 1)) for draw in (0, 1)]
    theirs = [KIND.log_likelihood(alone, at(draw), KIND.data(alone, 1)) for draw in (0, 1)]
    assert ours[0] - ours[1] == pytest.approx(theirs[0] - theirs[1], rel=1e-9)


def test_order_and_unit_of_rows_do_not_matter(rows, make_case):
    case, tables = raw()
    lines = FIRST.strip().split("\n")
    tables["a.csv"] = "\n".join([lines[0], *reversed(lines[1:])]) + "\n"
    body = [line.split(",") for line in SECOND.strip().split("\n")[1:]]
    tables["b.csv"] = "location,section,current [mA/m^2]\n" + "\n".join(
        f"{a},{b},{c if c == 'passive' else 10 * float(c)}" for a, b, c in body
    )
    other = KIND.rows(make_case(case, tables))
    assert KIND.log_likelihood(other, at(1), KIND.data(other, 3)) == pytest.approx(
        KIND.log_likelihood(rows, at(1), KIND.data(rows, 3)), rel=1e-10
    )


def test_a_table_split_in_two_says_the_same(rows, make_case):
    case, tables = raw()
    lines = FIRST.strip().split("\n")
    tables["a.csv"] = "\n".join(lines[:5]) + "\n"
    tables["a2.csv"] = "\n".join([lines[0], *lines[5:]]) + "\n"
    case["surveys"][0]["corrosion_current"] = [
        dict(ENTRIES[0]), {**ENTRIES[0], "table": "a2.csv"}
    ]  # fmt: skip
    split = make_case(case, tables)
    other = KIND.rows(split)
    assert set(VALUES) <= set(joint_prior(split).names)  # one season for both tables
    assert KIND.log_likelihood(other, at(1), KIND.data(other, 3)) == pytest.approx(
        KIND.log_likelihood(rows, at(1), KIND.data(rows, 3)), rel=1e-10
    )


def test_graph_and_numbers_agree_and_gradients_are_finite(case, rows):
    graphs.check(KIND, rows, joint_prior(case), 3)
    graphs.check(KIND, rows, joint_prior(case), 1)


def test_simulation_follows_the_definition(rows):
    count = 60_000
    values = {name: np.full(count, array[0]) for name, array in VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(1))
    rng = np.random.default_rng(2)
    onset = 32.0 * np.exp(0.4 * rng.standard_normal(count))
    local = 1.0 * np.exp(0.5 * rng.standard_normal(count))
    error = np.sqrt(np.log1p(0.2**2))
    first = local * 1.2 * np.exp(np.sqrt(np.log1p(0.4**2)) * 0.5)
    first = first * np.exp(error * rng.standard_normal(count))
    mean = local * 0.8 * np.exp(error * rng.standard_normal(count))
    first = np.where((onset < AGES[0]) & (first >= 0.1), first, np.nan)
    mean = np.where((onset < AGES[2]) & (mean >= 0.1), mean, np.nan)
    row_1, row_3 = 0, 13  # place R1 at the first and at the third visit
    for row, known in ((row_1, first), (row_3, mean)):
        assert np.isnan(drawn[:, row]).mean() == pytest.approx(np.isnan(known).mean(), abs=0.008)
        assert np.nanmean(drawn[:, row]) == pytest.approx(np.nanmean(np.log(known)), abs=0.015)
        assert np.nanstd(drawn[:, row]) == pytest.approx(np.nanstd(np.log(known)), rel=0.02)
    both = np.isfinite(drawn[:, row_1]) & np.isfinite(drawn[:, row_3])
    # One place: once active, always active; readings share the local current.
    assert both.sum() / np.isfinite(drawn[:, row_1]).sum() > 0.99
    found = np.corrcoef(drawn[both][:, [row_1, row_3]].T)[0, 1]
    assert found == pytest.approx(0.25 / (0.25 + error**2), abs=0.02)


def test_readings_of_a_visit_share_the_season_and_means_have_none(case):
    names = joint_prior(case).names
    assert "corrosion_current.season_1" in names
    assert "corrosion_current.season_2" in names
    assert "corrosion_current.season_3" not in names
    source = {one.name: one.source for one in joint_prior(case).variables}
    assert "RILEM TC 154-EMC" in source["corrosion_current.device_1"]


def test_device_factor_is_within_two_with_ninety_percent(case):
    # RILEM TC 154-EMC: accurate to a factor of two (from memory).
    (device,) = (v for v in joint_prior(case).variables if v.name == "corrosion_current.device_2")
    np.testing.assert_allclose(
        device.marginal.from_score(np.array([-1.6448536, 0.0, 1.6448536])), [0.5, 1.0, 2.0],
        rtol=1e-6,
    )  # fmt: skip


def test_readings_are_taken_to_the_mean_temperature(make_case):
    entry = {**ENTRIES[0], "temperature": 30, "mean_temperature": 10}
    warm = KIND.rows(make_case(*raw((entry, *ENTRIES[1:]))))
    cold = KIND.rows(make_case(*raw()))
    shift = np.log(0.75 / 1.73)  # from 30 to 10 °C
    np.testing.assert_allclose(warm.value[1], cold.value[1] + shift)
    np.testing.assert_allclose(warm.extra["limit"][0], cold.extra["limit"][0] + shift)


def test_cost_does_not_grow_with_readings_on_their_own(make_case):
    case, tables = raw()
    tables["a.csv"] = "current [µA/cm^2]\n" + "0.9\n1.4\npassive\n" * 2_000
    rows = KIND.rows(make_case(case, tables))
    size = sum(array.size for array in KIND.data(rows, 3).values())
    assert size < 60
    # Three readings two thousand times: the likelihood is two thousand times theirs.
    tables["a.csv"] = "current [µA/cm^2]\n0.9\n1.4\npassive\n"
    few = KIND.rows(make_case(case, tables))
    many = KIND.log_likelihood(rows, at(1), KIND.data(rows, 1))
    assert many == pytest.approx(2_000 * KIND.log_likelihood(few, at(1), KIND.data(few, 1)))


def test_a_section_learns_through_its_zone_only(rows):
    assert KIND.local(rows, 3, "S1", "deck", VALUES) == ()


BAD = [
    ({}, "current [mm]\n1\n", "column 'current' has a unit that does not convert to µA/cm^2"),
    ({}, "current\n1\n", "column 'current' has no unit"),
    ({}, "current [µA/cm^2]\n-1\n", "is out of range"),
    ({}, "current [µA/cm^2]\n>5\n", "cannot be a bound, given '>5'"),
    ({}, "current [µA/cm^2]\n", "no rows"),
    ({}, "location\nR1\n", "column 'current' is missing"),
    ({}, "current [µA/cm^2],zone\n1,quay\n", "there is no zone of this name"),
    ({"device": ""}, FIRST, "device"),
    ({"temperature": 30}, FIRST, "one temperature without the other, given temperature"),
    ({"average": True}, FIRST, "a yearly mean has no season, given season"),
    ({"temperature": 80, "mean_temperature": 10}, FIRST, "degrees Celsius is out of range"),
]


@pytest.mark.parametrize(("entry", "table", "words"), BAD)
def test_faults_are_said_with_their_place(tmp_path, entry, table, words):
    case, tables = raw(({**ENTRIES[0], **entry},), TABLES | {"a.csv": table})
    faults = [str(fault) for fault in check_case(cases.write_case(tmp_path, case, tables)).faults]
    assert any(words in fault for fault in faults), faults


def test_a_zone_without_corrosion_and_a_negative_factor_are_faults(tmp_path):
    case, tables = raw()
    case["priors"] = {
        "corrosion_current.device_1": {
            "distribution": "normal", "mean": 1.0, "sd": 0.5, "source": "test",
        }
    }  # fmt: skip
    faults = [str(f) for f in check_case(cases.write_case(tmp_path, case, tables)).faults]
    assert any("must be a distribution of positive values only" in fault for fault in faults)
    del case["priors"], case["zones"]["deck"]["corrosion"]
    faults = [str(f) for f in check_case(cases.write_case(tmp_path, case, tables)).faults]
    words = "a.csv:2: a corrosion current was measured in a zone without corrosion"
    assert any(words in fault for fault in faults), faults
