"""Half-cell potentials: counts, likelihood against SciPy, simulation, faults."""

import numpy as np
import pytest
from scipy import stats

from assess.pipeline import check_case
from assess.updating.half_cell import HalfCell
from assess.updating.prior import joint_prior
from tests.updating import graphs
from tests.verification import cases

KIND = HalfCell()
POTENTIALS = "potential [mV],count\n-100,3\n-120,\n-280,2\n-160,2\n"
CLASSES = "class,count\nabove -200 mV,30\n-200 to -350 mV,15\nbelow -350 mV,5\n"
VALUES = {
    "deck.onset": np.array([25.0, 60.0]),
    "deck.onset_scatter": np.array([0.3, 0.5]),
    "half_cell.active_uncertain": np.array([0.3, 0.2]),
    "half_cell.active_told_right": np.array([0.9, 0.8]),
    "half_cell.passive_uncertain": np.array([0.25, 0.4]),
    "half_cell.passive_told_right": np.array([0.95, 0.85]),
}


def raw(first=POTENTIALS, second=CLASSES, entry=None, **more):
    common = {"zone": "deck", "effective_points": 4, "electrode": "calomel"}
    surveys = [
        {"date": "2010-01-01", "half_cell": {"table": "a.csv", **common, **(entry or {})}},
        {"date": "2020-01-01", "half_cell": {"table": "b.csv", "zone": "deck",
                                             "effective_points": 20}},
    ]  # fmt: skip
    return cases.base(corrosion=True, surveys=surveys) | more, {"a.csv": first, "b.csv": second}


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(*raw())


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


def test_potentials_are_counted_in_classes_of_the_copper_sulfate_electrode(rows):
    # Against calomel -160 mV is -235 mV and -280 mV is -355 mV: shares at or below -200 mV and
    # below -350 mV of 3 + 1 + 2 + 2 points.
    np.testing.assert_allclose(rows.value, [4 / 8, 2 / 8, 20 / 50, 5 / 50])
    np.testing.assert_allclose(rows.extra["points"], [4, 4, 20, 20])


def test_counts_are_scaled_to_the_effective_points(rows):
    counts = KIND.data(rows, 2)["half_cell_counts"]
    np.testing.assert_allclose(counts, [[2.0, 1.0, 1.0], [12.0, 6.0, 2.0]])


def test_zones_of_one_table_share_its_effective_points(make_case):
    case, tables = raw("zone,potential [mV],count\ndeck,-100,30\nside,-300,10\n")
    case["zones"]["side"] = case["zones"]["deck"]
    del case["surveys"][0]["half_cell"]["zone"]
    rows = KIND.rows(make_case(case, tables))
    np.testing.assert_allclose(rows.extra["points"][:4], [3, 3, 1, 1])
    assert rows.zones == ("deck", "side")


@pytest.mark.parametrize("draw", [0, 1])
def test_likelihood_is_that_of_a_multinomial_mixture(rows, draw):
    value = {name: array[draw] for name, array in VALUES.items()}
    expected = 0.0
    for age, counts in ((39.0007, (2, 1, 1)), (48.9993, (12, 6, 2))):
        onsets = stats.lognorm(value["deck.onset_scatter"], scale=value["deck.onset"])
        chance = {"active": onsets.cdf(age), "passive": onsets.sf(age)}
        classes = np.zeros(3)
        for state, own in (("active", 2), ("passive", 0)):
            between = value[f"half_cell.{state}_uncertain"]
            right = value[f"half_cell.{state}_told_right"]
            classes[1] += chance[state] * between
            classes[own] += chance[state] * (1.0 - between) * right
            classes[2 - own] += chance[state] * (1.0 - between) * (1.0 - right)
        assert classes.sum() == pytest.approx(1.0)
        known = stats.multinomial(sum(counts), classes)
        expected += known.logpmf(counts) - stats.multinomial(sum(counts), [1 / 3] * 3).logpmf(
            counts
        )
        expected += sum(counts) * np.log(1 / 3)  # leaves the coefficient out
    found = KIND.log_likelihood(rows, VALUES, KIND.data(rows, 2))
    assert found[draw] == pytest.approx(expected, rel=1e-6)


def test_readings_between_the_limits_say_nothing_where_both_states_read_so_alike(make_case):
    case = make_case(*raw("potential [mV]\n-200\n-210\n-180\n-220\n"))
    rows = KIND.rows(case)
    alike = VALUES | {"half_cell.passive_uncertain": VALUES["half_cell.active_uncertain"]}
    early = KIND.log_likelihood(rows, alike | {"deck.onset": np.array([10.0, 10.0])},
                                KIND.data(rows, 1))  # fmt: skip
    late = KIND.log_likelihood(rows, alike | {"deck.onset": np.array([200.0, 200.0])},
                               KIND.data(rows, 1))  # fmt: skip
    np.testing.assert_allclose(early, late, rtol=1e-12)


def test_default_probabilities_give_odds_of_nine_to_one(case):
    # ASTM C876: corrosion with 90 % below -350 mV, none with 90 % above -200 mV (from memory).
    prior = {one.name: one for one in joint_prior(case).variables}
    for state in ("active", "passive"):
        told = prior[f"half_cell.{state}_told_right"].marginal
        assert told.mean / (1.0 - told.mean) == pytest.approx(9.0)
        assert "ASTM C876" in prior[f"half_cell.{state}_told_right"].source


def test_later_surveys_are_switched_off(rows, make_case):
    assert np.all(KIND.log_likelihood(rows, VALUES, KIND.data(rows, 0)) == 0.0)
    case, tables = raw()
    case["surveys"] = case["surveys"][:1]
    alone = KIND.rows(make_case(case, tables))
    np.testing.assert_allclose(
        KIND.log_likelihood(rows, VALUES, KIND.data(rows, 1)),
        KIND.log_likelihood(alone, VALUES, KIND.data(alone, 1)),
        rtol=1e-12,
    )


def test_order_and_unit_and_repetition_of_rows_do_not_matter(make_case, rows):
    other = "potential [V]\n" + "\n".join(["-0.16"] * 2 + ["-0.12"] + ["-0.28"] * 2 + ["-0.1"] * 3)
    again = KIND.rows(make_case(*raw(other)))
    np.testing.assert_allclose(again.value, rows.value)


def test_graph_and_numbers_agree_and_gradients_are_finite(case, rows):
    graphs.check(KIND, rows, joint_prior(case), 2)


def test_simulated_shares_have_the_moments_of_a_multinomial(rows):
    count = 40_000
    values = {name: np.full(count, array[0]) for name, array in VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(1))
    # By the definition, point by point: a bar corrodes or not, then reads.
    rng = np.random.default_rng(2)
    active = 25.0 * np.exp(0.3 * rng.standard_normal(count)) < 48.9993
    between = rng.uniform(size=count) < np.where(active, 0.3, 0.25)
    right = rng.uniform(size=count) < np.where(active, 0.9, 0.95)
    low = between | (active == right)  # at or below -200 mV
    below = ~between & (active == right)
    assert drawn[:, 2].mean() == pytest.approx(low.mean(), abs=0.008)
    assert drawn[:, 3].mean() == pytest.approx(below.mean(), abs=0.008)
    p = below.mean()
    assert drawn[:, 3].var() == pytest.approx(p * (1.0 - p) / 20.0, rel=0.05)
    assert np.all(drawn[:, 3] <= drawn[:, 2])
    put = KIND.observed(rows, drawn[0])
    counts = KIND.data(put, 2)["half_cell_counts"]
    np.testing.assert_allclose(counts, np.round(counts), atol=1e-9)


def test_a_section_learns_through_its_zone_only(rows):
    assert KIND.local(rows, 2, "S1", "deck", VALUES) == ()


BAD = [
    (
        {},
        "potential [mV],location\n-100,\n,P2\n",
        "says either a potential or a class, given neither",
    ),
    ({}, "potential [mV],class\n-100,above -200 mV\n", "a potential or a class, given both"),
    ({}, "potential [mV],count\n-100,2.5\n", "a number of points must be whole, given 2.5"),
    ({}, "potential [mm]\n-100\n", "column 'potential' has a unit that does not convert to mV"),
    ({}, "potential\n-100\n", "column 'potential' has no unit"),
    ({}, "potential [mV]\n-9000\n", "is out of range"),
    ({}, "class\nbelow -400 mV\n", "no such choice"),
    ({}, "potential [mV]\n", "no rows"),
    ({}, "potential [mV],zone\n-100,quay\n", "there is no zone of this name"),
    ({"effective_points": 40}, POTENTIALS, "more independent points than points, given 40"),
    ({"effective_points": 0.5}, POTENTIALS, "a number of independent points is out of range"),
    ({"electrode": "zinc"}, POTENTIALS, "electrode"),
    ({"electrode": None}, POTENTIALS, "potentials without their reference electrode"),
]


@pytest.mark.parametrize(("entry", "table", "words"), BAD)
def test_faults_are_said_with_their_place(tmp_path, entry, table, words):
    case, tables = raw(table, entry=entry)
    if entry.get("electrode", "") is None:
        del case["surveys"][0]["half_cell"]["electrode"]
    path = cases.write_case(tmp_path, case, tables)
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault for fault in faults), faults


def test_a_zone_without_corrosion_and_a_prior_beyond_one_are_faults(tmp_path):
    case, tables = raw()
    case["priors"] = {
        "half_cell.active_told_right": {
            "distribution": "normal", "mean": 0.9, "sd": 0.1, "source": "test",
        }
    }  # fmt: skip
    path = cases.write_case(tmp_path, case, tables)
    faults = [str(fault) for fault in check_case(path).faults]
    assert any("must be a distribution between 0 and 1" in fault for fault in faults), faults
    del case["priors"], case["zones"]["deck"]["corrosion"]
    path = cases.write_case(tmp_path, case, tables)
    faults = [str(fault) for fault in check_case(path).faults]
    words = "a.csv:2: potentials were measured in a zone without corrosion"
    assert any(words in fault for fault in faults), faults


@pytest.mark.parametrize(
    ("table", "words"),
    [
        ("potential [mV]\n-0.25\n-0.31\n-0.1\n-0.4\n", "in volt? write potential [V]"),
        ("potential [mV]\n250\n310\n100\n400\n", "without their sign?"),
    ],
)
def test_potentials_that_look_like_something_else_are_doubted(tmp_path, table, words):
    case, tables = raw(table)
    found = [str(doubt) for doubt in check_case(cases.write_case(tmp_path, case, tables)).doubts]
    assert any(words in doubt for doubt in found), found


def test_a_case_may_state_its_own_probabilities(make_case):
    case, tables = raw()
    case["priors"] = {
        "half_cell.active_told_right": {
            "distribution": "constant", "mean": 0.8, "source": "break-outs",
        }
    }  # fmt: skip
    prior = joint_prior(make_case(case, tables))
    at = prior.names.index("half_cell.active_told_right")
    assert prior.physical(np.zeros((1, len(prior.names))))[0, at] == 0.8


def test_a_million_rows_cost_what_their_counts_cost(make_case):
    few = KIND.rows(make_case(*raw("potential [mV]\n" + "-100\n-300\n" * 50)))
    many = KIND.rows(make_case(*raw("potential [mV]\n" + "-100\n-300\n" * 5_000)))
    assert many.value.shape == few.value.shape
    np.testing.assert_allclose(many.value, few.value)
