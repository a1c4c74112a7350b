"""Pulse velocities: graph, units, conditioning on cores and rebound numbers, prior, faults."""

import numpy as np
import pytest
from scipy import optimize

from assess.case.catalogue import catalogue
from assess.mechanics.indirect_strength import strength_from_velocity
from assess.pipeline import check_case
from assess.updating.kinds import KINDS
from assess.updating.prior import joint_prior
from tests.updating import graphs
from tests.updating import strength_case as deck
from tests.verification import cases

KIND = KINDS["pulse_velocity"]


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(deck.case(), deck.TABLES)


@pytest.mark.parametrize("stage", [0, 1, 2])
def test_graph_and_numbers_agree_and_gradients_are_finite(case, stage):
    graphs.check(KIND, KIND.rows(case), joint_prior(case), stage)


def test_later_surveys_say_nothing(case):
    rows = KIND.rows(case)
    nothing = KIND.log_likelihood(rows, deck.VALUES, KIND.data(rows, 0))
    np.testing.assert_array_equal(nothing, np.zeros(3))


def test_velocities_are_read_in_their_unit(case):
    rows = KIND.rows(case)
    np.testing.assert_allclose(np.exp(rows.value[:2]), [4.4, 4.21])
    np.testing.assert_allclose(np.exp(rows.value[-3:]), [4.52, 4.38, 4.47])
    # Two readings behind the second row, one behind the first.
    np.testing.assert_allclose(rows.extra["error"][:2], np.log1p(0.02**2) / np.array([1.0, 2.0]))


def test_simulation_has_the_moments_of_the_joint_normal_given_cores_and_rebound(case):
    rows = KIND.rows(case)
    values = {name: np.full(40_000, value[2]) for name, value in deck.VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(2))
    known = [r for r in deck.readings() if r.kind != "pulse_velocity"]
    both = [*known, *(r for r in deck.readings() if r.kind == "pulse_velocity")]
    mean, covariance, value, _ = deck.joint(both, deck.at(2))
    n = len(known)
    gain = np.linalg.solve(covariance[:n, :n], covariance[:n, n:]).T
    expected = mean[n:] + gain @ (value[:n] - mean[:n])
    left = covariance[n:, n:] - gain @ covariance[:n, n:]
    sd = np.sqrt(np.diag(left))
    np.testing.assert_array_less(np.abs(drawn.mean(axis=0) - expected), 4.5 * sd / 200.0)
    np.testing.assert_allclose(
        np.corrcoef(drawn.T), left / np.outer(sd, sd), atol=4.5 / np.sqrt(4e4)
    )


def test_the_catalogues_line_is_the_basic_curve_at_30_mpa():
    # EN 13791:2007, 8.4.3 (from memory), solved and differentiated numerically.
    level = optimize.brentq(lambda v: strength_from_velocity(v) - 30.0, 4.2, 4.8)
    steps = level * np.array([1.0 - 1e-5, 1.0 + 1e-5])
    slope = 2e-5 / np.diff(np.log(strength_from_velocity(steps)))[0]
    for what, expected in (("level", level), ("slope", slope)):
        entry = catalogue()[f"pulse velocity {what} by EN 13791"]
        low, high = entry["quantiles"].values()
        assert np.sqrt(low * high) == pytest.approx(expected, rel=0.005)


def test_a_device_with_pairs_has_a_wide_prior_in_its_unit(case):
    known = {variable.name: variable for variable in KIND.variables(case)}
    assert set(known) == {f"pulse_velocity.P.{what}" for what in ("level", "slope", "scatter")}
    assert known["pulse_velocity.P.level"].unit == "km/s"
    assert known["pulse_velocity.P.level"].source.startswith("engineering judgement")


def test_rebound_at_the_same_places_is_no_pair(tmp_path):
    raw = deck.case(("rebound", "pulse_velocity"))
    for survey in raw["surveys"]:
        survey["pulse_velocity"].pop("curve", None)
    checked = check_case(cases.write_case(tmp_path, raw, deck.TABLES))
    (fault,) = checked.faults
    assert "nothing leads from the readings of device 'P' to strength" in str(fault)
    assert fault.line > 0


@pytest.mark.parametrize(
    ("table", "words", "line"),
    [
        ("location,pulse velocity [km/s],readings\nK1,4.4,1.5\n", "must be whole", 2),
        ("location,pulse velocity [km/s]\nK1,4.4\nK2,44\n", "pulse velocity", 3),
        ("location,pulse velocity [MPa]\nK1,38\n", "km/s", 1),
        ("location,velocity [km/s]\nK1,4.4\n", "pulse velocity", 1),
    ],
)
def test_bad_tables_are_refused_with_their_line(tmp_path, table, words, line):
    tables = deck.TABLES | {"velocity.csv": table}
    checked = check_case(cases.write_case(tmp_path, deck.case(), tables))
    found = [f for f in checked.faults if f.file.endswith("velocity.csv")]
    assert any(words in str(fault) and fault.line == line for fault in found)


def test_readings_beyond_the_curve_are_doubted_in_the_tables_own_unit(tmp_path):
    table = "location,pulse velocity [m/s]\nK1,4400\nK2,3900\n"
    raw = deck.case(("pulse_velocity",))
    path = cases.write_case(tmp_path, raw, deck.TABLES | {"velocity.csv": table})
    checked = check_case(path)
    assert not checked.faults
    doubt = next(d for d in checked.doubts if "drawn for" in str(d))
    assert doubt.line == 3
    assert "3900 m/s" in str(doubt)
    assert "4000 to 4800 m/s" in str(doubt)
