"""Delaminated shares: likelihood against SciPy's quadrature and multinomial, simulation, faults."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.pipeline import check_case
from assess.updating.delamination import Delamination
from assess.updating.prior import joint_prior
from tests.updating import graphs
from tests.verification import cases

KIND = Delamination()
HEAD = "location,share [%],patches\n"
FIRST = HEAD + "north,5,40\nsouth,0,20\n"
SECOND = HEAD + "north,20,40\neast,100,10\n"
THIRD = HEAD + "north,20,40\nsouth,15,20\n,8,50\n"
DATES = ("2000-01-01", "2010-01-01", "2020-01-01")
AGES = tuple((np.datetime64(d) - np.datetime64("1971-01-01")).astype(float) / 365.25 for d in DATES)
VALUES = {
    "deck.onset": np.array([25.0, 45.0]),
    "deck.onset_scatter": np.array([0.4, 0.6]),
    "deck.current": np.array([0.6, 2.0]),
    "deck.current_scatter": np.array([0.5, 0.3]),
    "delamination.critical_loss": np.array([0.1, 0.2]),
    "delamination.critical_scatter": np.array([0.3, 0.5]),
}


def raw(first=FIRST, second=SECOND, third=THIRD):
    surveys = [
        {"date": date, "delamination": {"table": table, "zone": "deck"}}
        for date, table in zip(DATES, ("a.csv", "b.csv", "c.csv"), strict=True)
    ]
    return cases.base(corrosion=True, surveys=surveys), dict(
        zip(("a.csv", "b.csv", "c.csv"), (first, second, third), strict=True)
    )


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(*raw())


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


def at(draw):
    return {name: array[draw] for name, array in VALUES.items()}


def share_loose(age, value):
    """Expected share at an age, by adaptive quadrature over the onset."""
    onset = stats.lognorm(value["deck.onset_scatter"], scale=value["deck.onset"])
    sd = np.hypot(value["deck.current_scatter"], value["delamination.critical_scatter"])
    rate = 0.0116044 * value["deck.current"]

    def density(t):
        margin = np.log(rate * (age - t) / value["delamination.critical_loss"]) / sd
        return onset.pdf(t) * stats.norm.cdf(margin)

    return integrate.quad(density, 0.0, age, epsabs=1e-13, epsrel=1e-10, limit=500)[0]


def test_rows_are_shares_of_surfaces(rows):
    np.testing.assert_allclose(rows.value, [0.05, 0.0, 0.2, 1.0, 0.2, 0.15, 0.08])
    assert rows.places == ("deck: north", "deck: south", "deck: east", "deck: whole zone")


@pytest.mark.parametrize("draw", [0, 1])
@pytest.mark.parametrize("stage", [1, 2, 3])
def test_likelihood_is_that_of_a_multinomial_over_times(rows, draw, stage):
    value = at(draw)
    g1, g2, g3 = (share_loose(age, value) for age in AGES)
    # Patches by surface: loose at the first, later, sound at the last survey that counts.
    surfaces = {
        1: [((2, 38), (g1, 1 - g1)), ((0, 20), (g1, 1 - g1))],
        2: [((2, 6, 32), (g1, g2 - g1, 1 - g2)), ((0, 20), (g1, 1 - g1)),
            ((10, 0), (g2, 1 - g2))],
        3: [((2, 6, 0, 32), (g1, g2 - g1, g3 - g2, 1 - g3)),
            ((0, 3, 17), (g1, g3 - g1, 1 - g3)), ((10, 0), (g2, 1 - g2)),
            ((4, 46), (g3, 1 - g3))],
    }[stage]  # fmt: skip
    expected = 0.0
    for counts, chances in surfaces:
        known = stats.multinomial(sum(counts), chances)
        even = stats.multinomial(sum(counts), np.full(len(counts), 1 / len(counts)))
        # What the tool leaves out, the coefficient, is that of any other multinomial.
        expected += known.logpmf(counts) - even.logpmf(counts)
        expected -= sum(counts) * np.log(len(counts))
    found = KIND.log_likelihood(rows, value, KIND.data(rows, stage))
    assert found == pytest.approx(expected, rel=1e-4, abs=2e-3)


def test_shares_of_nearly_nothing_keep_their_digits(make_case):
    # One share, young structure: the likelihood's slope in the share is that of its logarithm.
    rows = KIND.rows(make_case(*raw(HEAD + ",1,100\n", HEAD + "x,0,1\n", HEAD + "y,0,1\n")))
    for onset in (60.0, 120.0, 200.0):
        value = at(0) | {"deck.onset": np.float64(onset)}
        g = share_loose(AGES[0], value)
        found = KIND.log_likelihood(rows, value, KIND.data(rows, 1))
        assert found == pytest.approx(np.log(g) + 99 * np.log1p(-g), rel=1e-3)
    assert g < 1e-4


def test_later_surveys_are_switched_off(rows, make_case):
    assert KIND.log_likelihood(rows, at(0), KIND.data(rows, 0)) == 0.0
    case, tables = raw()
    case["surveys"] = case["surveys"][:2]
    alone = KIND.rows(make_case(case, tables))
    assert KIND.log_likelihood(alone, at(1), KIND.data(alone, 2)) == pytest.approx(
        KIND.log_likelihood(rows, at(1), KIND.data(rows, 2)), rel=1e-12
    )


def test_a_surface_surveyed_again_without_growth_is_no_second_sample(make_case):
    # The same shares of other surfaces say more of the zone than those of the same one.
    same = KIND.rows(make_case(*raw(HEAD + "a,20,50\n", HEAD + "a,20,50\n", HEAD + "z,0,1\n")))
    other = KIND.rows(make_case(*raw(HEAD + "a,20,50\n", HEAD + "b,20,50\n", HEAD + "z,0,1\n")))
    medians = np.array([20.0, 30.0, 40.0])

    def spread(rows):
        values = [at(0) | {"deck.onset": m} for m in medians]
        found = [KIND.log_likelihood(rows, v, KIND.data(rows, 2)) for v in values]
        first = [KIND.log_likelihood(rows, v, KIND.data(rows, 1)) for v in values]
        return np.subtract(found, first)

    # Conditional on the first survey no patch has come loose since: L = ((1 - G2)/(1 - G1))^40
    # of those sound, and no term for those loose.
    g = np.array([[share_loose(t, at(0) | {"deck.onset": m}) for t in AGES[:2]] for m in medians])
    np.testing.assert_allclose(spread(same), 40 * np.log((1 - g[:, 1]) / (1 - g[:, 0])), rtol=1e-3)
    expected = 10 * np.log(g[:, 1]) + 40 * np.log(1 - g[:, 1])
    np.testing.assert_allclose(spread(other), expected, rtol=1e-3)


def test_order_and_unit_of_rows_do_not_matter(rows, make_case):
    turned = HEAD + "south,0,20\nnorth,5,40\n"
    plain = HEAD.replace(" [%]", "") + "east,1,10\nnorth,0.2,40\n"
    other = KIND.rows(make_case(*raw(turned, plain)))
    assert KIND.log_likelihood(other, at(0), KIND.data(other, 3)) == pytest.approx(
        KIND.log_likelihood(rows, at(0), KIND.data(rows, 3)), rel=1e-12
    )


def test_graph_and_numbers_agree_and_gradients_are_finite(case, rows):
    graphs.check(KIND, rows, joint_prior(case), 3)
    graphs.check(KIND, rows, joint_prior(case), 1)


def test_simulated_shares_have_the_moments_of_a_multinomial(rows):
    count = 20_000
    values = {name: np.full(count, array[0]) for name, array in VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(1))
    g1, g2, g3 = (share_loose(age, at(0)) for age in AGES)
    for row, g, patches in ((0, g1, 40), (2, g2, 40), (5, g3, 20)):
        assert drawn[:, row].mean() == pytest.approx(g, abs=0.004)
        assert drawn[:, row].var() == pytest.approx(g * (1 - g) / patches, rel=0.06)
        np.testing.assert_allclose(drawn[:, row] * patches, np.round(drawn[:, row] * patches))
    grown = drawn[:, 2] - drawn[:, 0]
    assert grown.min() >= 0.0
    assert grown.var() == pytest.approx((g2 - g1) * (1 - g2 + g1) / 40, rel=0.06)


def test_a_section_learns_through_its_zone_only(rows):
    assert KIND.local(rows, 2, "S1", "deck", VALUES) == ()


BAD = [
    (HEAD.replace("%", "mm") + "n,5,10\n", "does not convert to a pure number"),
    ("location,share [%]\nn,5\n", "column 'patches' is missing"),
    (HEAD + "n,120,10\n", "a share is between nothing and all, given 120 %, allowed 0 to 100 %"),
    (HEAD.replace(" [%]", "") + "n,12,10\n", "in percent? write share [%]"),
    (HEAD + "n,-1,10\n", "a share is between nothing and all, given -1 %"),
    (HEAD + "n,5,2.5\n", "a number of patches must be whole, given 2.5"),
    (HEAD + "n,5,0\n", "is out of range"),
    (HEAD + "n,,10\n", "the cell is empty"),
    (HEAD, "no rows"),
    (HEAD.replace("location", "zone") + "quay,5,10\n", "there is no zone of this name"),
    (HEAD + "n,5,10\nn,6,10\n", "a.csv:3: a surface has two shares at one time, given deck: n"),
    (HEAD + ",5,10\n,6,10\n", "name different surfaces under location"),
    (HEAD + "north,50,40\n", "has shrunk, given deck: north, from 0.5 to 0.2"),
    (HEAD + "north,5,30\n", "another number of patches than before, given deck: north, 40"),
]


@pytest.mark.parametrize(("table", "words"), BAD)
def test_faults_are_said_with_their_place(tmp_path, table, words):
    path = cases.write_case(tmp_path, *raw(table))
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault for fault in faults), faults


def test_a_zone_without_corrosion_and_a_negative_loss_are_faults(tmp_path):
    case, tables = raw()
    case["priors"] = {
        "delamination.critical_loss": {
            "distribution": "normal", "mean": "0.1 mm", "sd": "0.1 mm", "source": "test",
        }
    }  # fmt: skip
    faults = [str(f) for f in check_case(cases.write_case(tmp_path, case, tables)).faults]
    assert any("must be a distribution of positive values only" in fault for fault in faults)
    del case["priors"], case["zones"]["deck"]["corrosion"]
    faults = [str(f) for f in check_case(cases.write_case(tmp_path, case, tables)).faults]
    words = "a.csv:2: delamination was looked for in a zone without corrosion"
    assert any(words in fault for fault in faults), faults
