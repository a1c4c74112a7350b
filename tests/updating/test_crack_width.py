"""Crack widths: loss read from them, likelihood against double integrals, simulation, faults."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.pipeline import check_case
from assess.updating.crack_width import CrackWidth
from assess.updating.prior import joint_prior
from tests.updating import graphs
from tests.verification import cases

KIND = CrackWidth()
HEAD = "section,location,crack width [mm],bar diameter [mm],cover [mm]\n"
FIRST = HEAD + ",B1,none,16,30\n,B2,0.2,16,30\nS1,,no crack,20,\n,,0.6,12,40\n"
SECOND = HEAD + ",B1,0.3,16,30\n,B2,0.5,16,30\nS1,,none,20,\n,,none,16,25\n"
VALUES = {
    "deck.onset": np.array([25.0, 38.0]),
    "deck.onset_scatter": np.array([0.3, 0.5]),
    "deck.current": np.array([0.6, 1.5]),
    "deck.current_scatter": np.array([0.4, 0.6]),
    "crack_width.factor": np.array([1.2, 0.8]),
    "crack_width.scatter": np.array([0.3, 0.5]),
}
AGES = (39.00068, 48.99932)


def raw(first=FIRST, second=SECOND, **entry):
    surveys = [
        {"date": date, "crack_width": {"table": table, "zone": "deck", **entry}}
        for date, table in (("2010-01-01", "a.csv"), ("2020-01-01", "b.csv"))
    ]
    return cases.base(corrosion=True, surveys=surveys), {"a.csv": first, "b.csv": second}


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(*raw(concentration=2))


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


def at(draw):
    return {name: array[draw] for name, array in VALUES.items()}


def test_a_width_is_read_as_a_loss_of_radius(rows):
    # By hand, uniform attack, bar of 16 mm, cover 30 mm, width 0.5 mm: 9.9506 mm² of area
    # (check table of the formulas), that is a ring of radius 8 less r with pi (64 - r²) = 9.9506.
    ring = 8.0 - np.sqrt(64.0 - 9.9506 / np.pi)
    assert np.exp(rows.value[5]) == pytest.approx(ring, rel=1e-5)
    assert np.isnan(rows.value[[0, 2, 6, 7]]).all()
    # No crack: less than 7.53 + 9.32 c/phi micrometre; the zone's mean cover is 40 mm.
    np.testing.assert_allclose(
        np.exp(rows.extra["limit"][[0, 2]]),
        [7.53e-3 + 9.32e-3 * 30 / 16, 7.53e-3 + 9.32e-3 * 40 / 20],
    )
    np.testing.assert_allclose(rows.extra["age"], [AGES[0]] * 4 + [AGES[1]] * 4, atol=1e-4)


def test_concentration_follows_the_attack_of_the_zone(make_case):
    pitting = KIND.rows(make_case(*raw()))
    case, tables = raw()
    case["zones"]["deck"]["corrosion"]["attack"] = "uniform"
    uniform = KIND.rows(make_case(case, tables))
    local = KIND.rows(make_case(*raw(concentration=6)))
    np.testing.assert_allclose(pitting.value, local.value)
    # Pits concentrate the loss: the same crack tells of less mean loss.
    assert np.all(pitting.value[[1, 3, 4, 5]] < uniform.value[[1, 3, 4, 5]])
    np.testing.assert_allclose(pitting.extra["limit"], uniform.extra["limit"])


def by_double_integral(visits, value):
    """Integrate over score of ln onset and score of ln shown rate; nothing conjugate."""
    log_rate = np.log(0.0116044 * value["deck.current"] * value["crack_width.factor"])
    sd = np.hypot(value["deck.current_scatter"], value["crack_width.scatter"])
    z = np.linspace(-8.0, 8.0, 4001)[:, None]
    onset = value["deck.onset"] * np.exp(value["deck.onset_scatter"] * z)
    u = np.linspace(-7.0, 7.0, 2801)
    density = stats.norm.pdf(z) * stats.norm.pdf(u)
    for age, log_loss, limit, error in visits:
        with np.errstate(divide="ignore"):
            shown = np.log(np.maximum(age - onset, 0.0)) + log_rate + sd * u
        if np.isnan(log_loss):
            density = density * (shown < limit)
        else:
            reading = np.where(np.isfinite(shown), stats.norm.pdf(log_loss, shown, error), 0.0)
            density = density * (shown >= limit) * reading * np.sqrt(2.0 * np.pi) * error
    return integrate.trapezoid(integrate.trapezoid(density, u, axis=1), z[:, 0])


@pytest.mark.parametrize("draw", [0, 1])
@pytest.mark.parametrize("stage", [1, 2])
def test_likelihood_is_that_of_a_double_integral(rows, draw, stage):
    value = at(draw)
    error = np.sqrt(np.log1p(0.1**2))
    expected = 0.0
    for place in range(len(rows.places)):
        chosen = np.flatnonzero((rows.place == place) & (rows.stage <= stage))
        visits = [
            (rows.extra["age"][r], rows.value[r], rows.extra["limit"][r], error) for r in chosen
        ]
        expected += np.log(by_double_integral(visits, value)) if visits else 0.0
    found = KIND.log_likelihood(rows, value, KIND.data(rows, stage))
    assert found == pytest.approx(expected, abs=0.004)


def test_factor_and_scatter_matter_as_the_relation_says(rows):
    # All widths and limits scaled by f on the loss is the same as the relation's factor f.
    value = at(0)
    scaled = {**rows.extra, "limit": rows.extra["limit"] - np.log(1.2)}
    other = type(rows)(rows.value - np.log(1.2), rows.stage, rows.zone, rows.place,
                       rows.place_zone, rows.zones, rows.places, scaled)  # fmt: skip
    one = value | {"crack_width.factor": np.float64(1.0)}
    assert KIND.log_likelihood(other, one, KIND.data(other, 2)) == pytest.approx(
        KIND.log_likelihood(rows, value, KIND.data(rows, 2)), rel=1e-9
    )


def test_later_surveys_are_switched_off(rows, make_case):
    assert KIND.log_likelihood(rows, at(0), KIND.data(rows, 0)) == 0.0
    case, tables = raw(concentration=2)
    case["surveys"] = case["surveys"][:1]
    alone = KIND.rows(make_case(case, tables))
    assert KIND.log_likelihood(alone, at(1), KIND.data(alone, 1)) == pytest.approx(
        KIND.log_likelihood(rows, at(1), KIND.data(rows, 1)), abs=1e-5
    )


def test_data_have_names_of_their_own(rows):
    assert all(name.startswith("crack_width_") for name in KIND.data(rows, 2))


def test_order_and_unit_of_rows_do_not_matter(rows, make_case):
    lines = FIRST.strip().split("\n")
    turned = "\n".join([lines[0], *reversed(lines[1:])]) + "\n"
    inches = HEAD.replace("crack width [mm]", "crack width [in]") + (
        f",B1,{0.3 / 25.4},16,30\n,B2,{0.5 / 25.4},16,30\nS1,,none,20,\n,,none,16,25\n"
    )
    other = KIND.rows(make_case(*raw(turned, inches, concentration=2)))
    assert KIND.log_likelihood(other, at(0), KIND.data(other, 2)) == pytest.approx(
        KIND.log_likelihood(rows, at(0), KIND.data(rows, 2)), rel=1e-10
    )


def test_graph_and_numbers_agree_and_gradients_are_finite(case, rows):
    graphs.check(KIND, rows, joint_prior(case), 2)


def test_simulation_follows_the_definition(rows):
    count = 60_000
    values = {name: np.full(count, array[1]) for name, array in VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(1))
    rng = np.random.default_rng(2)
    onset = 38.0 * np.exp(0.5 * rng.standard_normal(count))
    rate = 0.0116044 * 1.5 * np.exp(0.6 * rng.standard_normal(count))
    place = 0.8 * np.exp(0.5 * rng.standard_normal(count))
    for row, age in ((0, AGES[0]), (4, AGES[1])):
        shown = place * rate * np.maximum(age - onset, 0.0)
        cracked = shown >= 7.53e-3 + 9.32e-3 * 30 / 16
        assert np.isfinite(drawn[:, row]).mean() == pytest.approx(cracked.mean(), abs=0.008)
        read = np.log(shown[cracked]) + np.sqrt(np.log1p(0.01)) * rng.standard_normal(cracked.sum())
        mine = drawn[np.isfinite(drawn[:, row]), row]
        assert mine.mean() == pytest.approx(read.mean(), abs=0.03)
        assert mine.std() == pytest.approx(read.std(), rel=0.03)
    # A crack that is there does not close.
    assert np.isfinite(drawn[np.isfinite(drawn[:, 0]), 4]).all()


def test_a_section_learns_through_its_zone_only(rows):
    assert KIND.local(rows, 2, "S1", "deck", VALUES) == ()


BAD = [
    ({}, HEAD.replace("[mm],bar", "[MPa],bar") + ",,0.1,16,30\n", "does not convert to mm"),
    ({}, "crack width [mm]\n0.1\n", "column 'bar diameter' is missing"),
    ({}, HEAD + ",,-0.1,16,30\n", "is out of range"),
    ({}, HEAD + ",,,16,30\n", "the cell is empty"),
    ({}, HEAD, "no rows"),
    ({}, HEAD.replace("section", "zone") + "quay,,0.1,16,30\n", "there is no zone of this name"),
    ({}, HEAD + ",,25,16,30\n", "wider than the loss of the whole bar explains, given 25 mm at"),
    ({"concentration": 1}, FIRST, "a concentration is out of range"),
]


@pytest.mark.parametrize(("entry", "table", "words"), BAD)
def test_faults_are_said_with_their_place(tmp_path, entry, table, words):
    case, tables = raw(table, **entry)
    faults = [str(fault) for fault in check_case(cases.write_case(tmp_path, case, tables)).faults]
    assert any(words in fault for fault in faults), faults


def test_a_crack_that_closed_is_a_fault_in_the_line_of_the_later_row(tmp_path):
    second = HEAD + ",B7,0.1,16,30\n,B2,none,16,30\n"
    path = cases.write_case(tmp_path, *raw(FIRST, second))
    (fault,) = check_case(path).faults
    assert str(fault).startswith(f"{tmp_path / 'b.csv'}:3: a crack was measured at a place")
    assert "a.csv:3; give the two cracks different locations" in str(fault)


def test_a_zone_without_corrosion_is_a_fault(tmp_path):
    case, tables = raw()
    del case["zones"]["deck"]["corrosion"]
    faults = [str(f) for f in check_case(cases.write_case(tmp_path, case, tables)).faults]
    words = "a.csv:2: cracks along bars were looked for in a zone without corrosion"
    assert any(words in fault for fault in faults), faults
