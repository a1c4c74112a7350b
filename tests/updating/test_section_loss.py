import numpy as np
import pytest

from assess.updating.kinds import KINDS
from tests.verification import cases

LOSS = KINDS["section_loss"]
VALUES = {
    "deck.onset": np.array([25.0, 35.0]),
    "deck.onset_scatter": np.array([0.3, 0.5]),
    "deck.current": np.array([2.0, 4.0]),
    "deck.current_scatter": np.array([0.4, 0.6]),
}


def _at(draw):
    return {name: value[draw] for name, value in VALUES.items()}


@pytest.fixture(scope="module")
def rows(example_case):
    return LOSS.rows(example_case)


def test_rows(rows):
    # Loss of radius is half that of the diameter; 31.0 left of 32 mm is 0.5 mm.
    assert rows.value[0] == pytest.approx(np.log(0.4))
    assert np.isnan(rows.value[1])
    assert rows.value[5] == pytest.approx(np.log(0.5))
    np.testing.assert_allclose(rows.extra["limit"][:4], np.log(0.1))
    np.testing.assert_allclose(rows.extra["limit"][4:], np.log(0.2))
    np.testing.assert_allclose(rows.extra["age"], [39.414] * 4 + [49.416] * 4, atol=1e-3)
    assert rows.places == ("section S1", "deck: B1", "deck: B2", "deck: B3", "deck: B4")


def test_losses_below_the_limit_count_as_none_found(make_case):
    case = cases.base(
        corrosion=True,
        surveys=[{"date": "2020-01-01", "section_loss": cases.loss_entry("a.csv", "0.5 mm")}],
    )
    table = "location,original diameter [mm],residual diameter [mm]\nB1,32,31.5\nB2,32,30.5\n"
    found = LOSS.rows(make_case(case, {"a.csv": table})).value
    assert np.isnan(found[0])
    assert found[1] == pytest.approx(np.log(0.75))


def test_stage_equals_the_case_with_the_first_survey_only(rows, make_case):
    case = cases.example()
    case["surveys"] = case["surveys"][:1]
    alone = LOSS.rows(make_case(case, cases.EXAMPLE_TABLES))
    ours = LOSS.log_likelihood(rows, _at(0), LOSS.data(rows, 1))
    theirs = LOSS.log_likelihood(alone, _at(0), LOSS.data(alone, 1))
    assert ours == pytest.approx(theirs, abs=1e-5)
    assert LOSS.log_likelihood(rows, _at(0), LOSS.data(rows, 0)) == 0.0


def test_places_add_up(rows):
    # Each place alone, through the same likelihood: they are independent given the zone.
    data = LOSS.data(rows, 2)
    total = LOSS.log_likelihood(rows, _at(1), data)
    single = 0.0
    for place in range(len(rows.places)):
        only = {name: array.copy() for name, array in data.items()}
        others = np.arange(len(rows.places)) != place
        for name in ("loss_found", "loss_none", "loss_precision"):
            only[name][others] = 0.0
        single += LOSS.log_likelihood(rows, _at(1), only)
    assert total == pytest.approx(single, rel=1e-12)


def test_simulation_shares_of_none_found(rows):
    # By the definition: years corroded times rate below the limit, plain Monte Carlo.
    count = 40_000
    values = {name: np.full(count, value[1]) for name, value in VALUES.items()}
    simulated = LOSS.simulate(rows, values, np.random.default_rng(1))
    rng = np.random.default_rng(2)
    onset = 35.0 * np.exp(0.5 * rng.standard_normal(count))
    rate = 4.0 * 0.0116044 * np.exp(0.6 * rng.standard_normal(count))
    for row in (1, 4):
        loss = rate * np.maximum(rows.extra["age"][row] - onset, 0.0)
        share = np.mean(loss < np.exp(rows.extra["limit"][row]))
        assert np.isnan(simulated[:, row]).mean() == pytest.approx(share, abs=0.012)
    # Visits to one place agree: what was found stays found where the limit is no larger.
    first, second = np.flatnonzero(rows.place == rows.place_of("S1"))
    assert np.corrcoef(simulated[np.isfinite(simulated[:, [first, second]]).all(axis=1)][
        :, [first, second]].T)[0, 1] > 0.5  # fmt: skip


def test_local_of_a_section_without_break_outs_is_the_zone(rows):
    onset, current = LOSS.local(rows, 2, "S2", "deck", VALUES)
    np.testing.assert_allclose(onset.mean, np.log(VALUES["deck.onset"]))
    np.testing.assert_allclose(current.sd, VALUES["deck.current_scatter"])
    assert onset.logarithm
    assert current.logarithm
    before = LOSS.local(rows, 0, "S1", "deck", VALUES)
    np.testing.assert_allclose(before[1].mean, np.log(VALUES["deck.current"]))
    assert LOSS.local(rows, 2, "S1", "sound", VALUES) == ()


def test_local_current_explains_the_measured_loss(rows):
    values = {name: np.full(4000, value[0]) for name, value in VALUES.items()}
    rng = np.random.default_rng(1)
    (local,) = LOSS.local(rows, 2, "S1", "deck", values)
    found = local.values(rng.standard_normal((4000, 1, 2)), np.arange(4000))
    loss = 0.0116044 * found["current"] * (rows.extra["age"][4] - found["onset"])
    assert np.median(loss) == pytest.approx(0.8, rel=0.15)  # measured 0.8 mm, V 0.15
    assert (found["onset"] < rows.extra["age"][0]).all()


def test_faults(make_case):
    table = (
        "location,original diameter [mm],residual diameter [mm]\nB1,32,33\nB2,32,31\nB2,32,none\n"
    )
    entry = {"date": "2020-01-01", "section_loss": cases.loss_entry("a.csv")}
    case = make_case(cases.base(corrosion=True, surveys=[entry]), {"a.csv": table})
    assert "residual diameter exceeds" in LOSS.faults(case)[0].what
    sound = make_case(cases.base(surveys=[entry]), {"a.csv": table.replace("33", "31")})
    assert any("without corrosion" in fault.what for fault in LOSS.faults(sound))
    healed = make_case(
        cases.base(corrosion=True, surveys=[entry]), {"a.csv": table.replace("33", "31")}
    )
    assert [fault.given for fault in LOSS.faults(healed)] == ["deck: B2"]
