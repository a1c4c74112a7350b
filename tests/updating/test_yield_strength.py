"""Coupons and hardness: likelihood against the joint normal density, conditioning, faults."""

import numpy as np
import pytest
from scipy import stats

from assess.pipeline import check_case
from assess.reliability.limit_state import Action
from assess.reliability.problem import build_problem, dimensions, section_state, without_dependence
from assess.updating.model import specify
from assess.updating.prior import joint_prior
from assess.updating.yield_strength import YieldStrength
from tests.updating import graphs
from tests.verification import cases

KIND = YieldStrength()
FIRST = """section,location,yield strength [MPa],hardness,steel
S1,,471,,
S1,,466,,
,A1,452,191,
,A1,,188,
,A2,,205,
,,489,,
,,455,,
,,463,,
,A1,318,,links
"""
SECOND = """section,location,yield strength [MPa],hardness,steel
S1,,,196,
,A2,480,,
,A3,,199,links
,,447,,
S2,,305,,links
"""
SCATTER = {"distribution": "lognormal", "mean": "15 MPa", "V": 0.4, "source": "test"}
VALUES = {
    "steel.main": np.array([460.0, 495.0]),
    "steel.main.scatter": np.array([14.0, 22.0]),
    "steel.links": np.array([320.0, 300.0]),
    **{
        f"yield_strength.{steel}.hardness_{name}": np.array(pair)
        for steel in ("main", "links")
        for name, pair in (
            ("factor", [1.1, 0.85]),
            ("gain", [0.9, 1.3]),
            ("scatter", [0.03, 0.06]),
        )
    },
}
LINKS_SD, COUPON_ERROR, HARDNESS_ERROR = 8.0, (5.0, 6.0), (2.876 * 5.0, 2.876 * 5.0)


def raw(first=FIRST, second=SECOND, **entry):
    surveys = [
        {"date": "2010-01-01", "yield_strength": {"table": "a.csv", "steel": "main", **entry}},
        {
            "date": "2020-01-01",
            "yield_strength": {"table": "b.csv", "steel": "main", "error": "6 MPa", **entry},
        },
    ]
    case = cases.base(surveys=surveys)
    case["steel"]["main"]["local_sd"] = SCATTER
    case["steel"]["links"] = {"mean": "310 MPa", "sd": "25 MPa", "source": "test"}
    return case, {"a.csv": first, "b.csv": second}


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(*raw())


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


# By hand: (survey, steel, bar, hardness or yield strength, whether hardness), in reading order.
READINGS = [
    *((0, "main", bar, x, False) for bar, x in
      (("S1", 471), ("S1", 466), ("A1", 452), ("b", 489), ("c", 455), ("d", 463))),
    (0, "links", "A1", 318, False),
    *((0, "main", bar, x, True) for bar, x in (("A1", 191), ("A1", 188), ("A2", 205))),
    (1, "main", "A2", 480, False),
    (1, "main", "e", 447, False),
    (1, "links", "S2", 305, False),
    (1, "main", "S1", 196, True),
    (1, "links", "A3", 199, True),
]  # fmt: skip
REFERENCE = {"main": 460.0, "links": 310.0}


def joint(steel, draw, stage=2):
    """Mean, covariance, values of one steel's readings, and covariance with each bar's strength."""
    at = {name: array[draw] for name, array in VALUES.items()}
    factor, gain, spread = (
        at[f"yield_strength.{steel}.hardness_{name}"] for name in ("factor", "gain", "scatter")
    )
    mu, ref = at[f"steel.{steel}"], REFERENCE[steel]
    sd = at.get(f"steel.{steel}.scatter", LINKS_SD)
    mine = [r for r in READINGS if r[1] == steel and r[0] < stage]
    bars = [r[2] for r in mine]
    slope = np.array([gain if r[4] else 1.0 for r in mine])
    mean = np.array([factor * ref + gain * (mu - ref) if r[4] else mu for r in mine])
    value = np.array([-90.7 + 2.876 * r[3] if r[4] else r[3] for r in mine])
    error = np.array([(HARDNESS_ERROR if r[4] else COUPON_ERROR)[r[0]] for r in mine])
    hard = np.array([r[4] for r in mine])
    same = np.array([[a == b for b in bars] for a in bars])
    covariance = same * np.outer(slope, slope) * sd**2 + np.diag(error**2)
    covariance = covariance + same * np.outer(hard, hard) * (spread * ref) ** 2
    return mean, covariance, value, error, bars, slope * sd**2, mu, sd


def test_readings_are_gathered_with_their_bars(rows):
    assert rows.value == pytest.approx([-90.7 + 2.876 * r[3] if r[4] else r[3] for r in READINGS])
    assert rows.zones[rows.zone[0]] == "steel.main"
    assert rows.zones[rows.zone[7]] == "steel.main by hardness"
    assert rows.place[2] == rows.place[7] == rows.place[8]  # coupon and hardness of bar A1
    assert rows.place[2] != rows.place[6]  # links at A1 are another bar
    assert rows.place_of("S1") == rows.place[0]
    assert rows.place_of("S2") is None  # links there say nothing of its main bars


@pytest.mark.parametrize("stage", [1, 2])
def test_likelihood_is_the_joint_normal_density(rows, stage):
    found = KIND.log_likelihood(rows, VALUES, KIND.data(rows, stage))
    for draw in range(2):
        expected = 0.0
        for steel in ("main", "links"):
            mean, covariance, value, error, *_ = joint(steel, draw, stage)
            density = stats.multivariate_normal(mean, covariance).logpdf(value)
            # Terms of the reading errors alone are left out.
            expected += density + np.sum(np.log(error) + 0.5 * np.log(2.0 * np.pi))
        assert found[draw] == pytest.approx(expected, rel=1e-10)


def test_later_surveys_are_switched_off(rows):
    assert np.all(KIND.log_likelihood(rows, VALUES, KIND.data(rows, 0)) == 0.0)


def test_the_sampler_sees_the_same_likelihood_with_a_gradient(case, rows):
    graphs.check(KIND, rows, joint_prior(case), 2)


def test_bars_tested_alike_are_one_group(make_case):
    lines = "".join(f"{440 + 0.01 * i}\n" for i in range(2000))
    case, tables = raw(first="yield strength [MPa]\n" + lines)
    many = KIND.rows(make_case(case, tables))
    few = KIND.rows(make_case(*raw(first="yield strength [MPa]\n440\n441\n")))
    shapes = [{k: v.shape for k, v in KIND.data(r, 2).items()} for r in (many, few)]
    assert shapes[0] == shapes[1]


def test_neither_order_nor_a_split_table_changes_anything(make_case, rows):
    head, *lines = FIRST.splitlines(keepends=True)
    case, tables = raw(first=head + "".join(reversed(lines)))
    turned = KIND.rows(make_case(case, tables))
    entry = case["surveys"][0]["yield_strength"]
    case["surveys"][0]["yield_strength"] = [entry, {**entry, "table": "c.csv"}]
    tables = {"a.csv": head + "".join(lines[:4]), "c.csv": head + "".join(lines[4:])}
    split = KIND.rows(make_case(case, tables | {"b.csv": SECOND}))
    first = KIND.log_likelihood(rows, VALUES, KIND.data(rows, 2))
    for other in (turned, split):
        again = KIND.log_likelihood(other, VALUES, KIND.data(other, 2))
        assert again == pytest.approx(first, rel=1e-12)


def test_the_unit_of_entry_does_not_matter(make_case, rows):
    converted = FIRST.replace("[MPa]", "[ksi]")
    for row in FIRST.splitlines()[1:]:
        value = row.split(",")[2]
        if value:
            ksi = f"{float(value) / 6.894757293168361:.10f}"
            converted = converted.replace(row, row.replace(value, ksi, 1))
    other = KIND.rows(make_case(*raw(first=converted)))
    assert other.value == pytest.approx(rows.value, rel=1e-8)


def test_brinell_is_brought_to_vickers(make_case, rows):
    brinell = KIND.rows(make_case(*raw(hardness_scale="Brinell")))
    hard = rows.extra["sort"] == 1
    # ISO 18265, table A.1 (from memory): HB = 0.95 HV.
    expected = [-90.7 + 2.876 * r[3] / 0.95 for r in READINGS if r[4]]
    assert brinell.value[hard] == pytest.approx(expected)


def test_simulation_has_the_moments_of_the_model(rows):
    values = {name: np.full(60_000, array[1]) for name, array in VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(3))
    for steel in ("main", "links"):
        mean, covariance, *_ = joint(steel, 1)
        mine = [i for i, r in enumerate(READINGS) if r[1] == steel]
        sd = np.sqrt(np.diag(covariance))
        np.testing.assert_allclose(drawn[:, mine].mean(axis=0), mean, atol=0.025 * sd.max())
        np.testing.assert_allclose(
            np.cov(drawn[:, mine].T) / np.outer(sd, sd), covariance / np.outer(sd, sd), atol=0.03
        )


@pytest.mark.parametrize("stage", [1, 2])
def test_a_tested_section_has_the_conditional_strength_of_its_bars(rows, stage):
    (local,) = KIND.local(rows, stage, "S1", "deck", VALUES)
    assert local.names == ("yield strength",)
    for draw in range(2):
        mean, covariance, value, _, bars, with_bar, mu, sd = joint("main", draw, stage)
        cross = np.where([bar == "S1" for bar in bars], with_bar, 0.0)
        gain = np.linalg.solve(covariance, cross)
        assert local.mean[draw] == pytest.approx(mu + gain @ (value - mean), rel=1e-10)
        assert local.sd[draw] == pytest.approx(np.sqrt(sd**2 - gain @ cross), rel=1e-8)


def test_a_section_nobody_tested_is_left_to_the_limit_state(rows):
    assert KIND.local(rows, 2, "S2", "deck", VALUES) == ()
    assert KIND.local(rows, 0, "S1", "deck", VALUES) == ()
    assert KIND.local(None, 0, "S1", "deck", VALUES) == ()


@pytest.fixture(scope="module")
def draws(case):
    prior = joint_prior(case)
    z = np.random.default_rng(5).standard_normal((4000, len(prior.names)))
    return dict(zip(prior.names, prior.physical(z).T, strict=True))


def capacity_strength(case, state, draws):
    """Yield strength that the bending check sees, solved from its load capacity's slope."""
    names = list(dimensions(state))
    problem = build_problem(case, state, Action())
    z = np.zeros((3, 1, len(names)))
    low = problem.log_hazard(z, np.arange(3), np.array([0]))
    z[..., names.index("yield strength")] = 1.0
    return names, low, problem.log_hazard(z, np.arange(3), np.array([0]))


def test_bending_takes_the_tested_strength_in_place_of_chance(case, draws):
    spec = specify(case)
    entries = case.spec.sections()
    tested, other = (section_state(case, spec, entries[s], 2, draws) for s in ("S1", "S2"))
    assert tested.measured == {"yield_strength"}
    assert other.measured == frozenset()
    names, low, high = capacity_strength(case, tested, draws)
    assert sorted(names) == sorted(dimensions(other))  # it takes the place of the chance
    assert dimensions(tested)["yield strength"] == "steel strength"
    assert np.all(high < low)  # stronger steel, less hazard
    _, low_other, high_other = capacity_strength(case, other, draws)
    # Two coupons of error 5 MPa tell more than the scatter of 15 MPa leaves open.
    assert np.all(low - high < 0.6 * (low_other - high_other))
    assert "steel.main.scatter" in other.common


def test_the_scatter_of_bars_is_a_common_variable_where_it_is_uncertain(case, draws, make_case):
    assert draws["steel.main.scatter"].mean() == pytest.approx(15.0, rel=0.03)
    assert "steel.links.scatter" not in draws
    plain = make_case(cases.base())
    assert "steel.main.scatter" not in joint_prior(plain).names


def test_dropping_the_dependence_keeps_what_was_tested(case, draws):
    entry = case.spec.sections()["S1"]
    kept = section_state(case, specify(case), entry, 2, draws)
    torn = without_dependence(kept, 3)
    assert list(dimensions(torn)) == list(dimensions(kept))
    (before,), (after,) = (
        [m for m in state.locals if "yield strength" in m.names] for state in (kept, torn)
    )
    np.testing.assert_array_equal(np.sort(after.mean), np.sort(before.mean))
    assert not np.array_equal(after.mean, before.mean)


@pytest.mark.parametrize(
    ("table", "entry", "words"),
    [
        ("steel\nmain\n", {}, "a.csv:2: the row says nothing, allowed yield strength, hardness"),
        ("yield strength [mm]\n460\n", {}, "a unit that does not convert to MPa"),
        ("yield strength\n460\n", {}, "a.csv:1: column 'yield strength' has no unit"),
        ("yield strength [MPa]\n-1\n", {}, "a.csv:2: column 'yield strength': is out of range"),
        ("hardness\n0\n", {}, "a.csv:2: column 'hardness': is out of range"),
        ("yield strength [MPa]\n", {}, "no rows"),
        (
            "yield strength [MPa],steel\n460,man\n",
            {},
            "a.csv:2: there is no steel of this name, given 'man', allowed main, links, did you",
        ),
        (
            "yield strength [MPa]\n460\n",
            {"steel": "mains"},
            "case.yaml:41: surveys.2010-01-01.yield_strength.steel: there is no steel of this name",
        ),
        ("yield strength [MPa]\n460\n", {"steel": None}, "a.csv:2: the row names no steel"),
        (
            "yield strength [MPa],section\n460,S3\n",
            {},
            "a.csv:2: there is no section of this name, given 'S3', allowed S1, S2",
        ),
        ("yield strength [MPa]\n460\n", {"error": "0 MPa"}, "out of range, given 0 MPa"),
    ],
)
def test_faults_are_said_with_their_place(tmp_path, table, entry, words):
    case, tables = raw(first=table)
    said = case["surveys"][0]["yield_strength"] | entry
    case["surveys"][0]["yield_strength"] = {k: v for k, v in said.items() if v is not None}
    case["surveys"] = case["surveys"][:1]
    path = cases.write_case(tmp_path, case, tables)
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault for fault in faults), faults


def test_a_line_of_hardness_must_stay_positive(tmp_path):
    case, tables = raw()
    case["priors"] = {
        "yield_strength.main.hardness_factor": {
            "distribution": "normal",
            "mean": 1.0,
            "sd": 0.2,
            "source": "test",
        }
    }
    path = cases.write_case(tmp_path, case, tables)
    faults = [str(fault) for fault in check_case(path).faults]
    assert any("must be a distribution of positive values only" in fault for fault in faults)
