"""Rebound numbers: graph, calibration line, simulator, priors of the hammer, faults."""

import numpy as np
import pytest
from pydantic import ValidationError

from assess.case.catalogue import catalogue
from assess.case.distributions import distribution_of
from assess.mechanics.indirect_strength import strength_from_rebound
from assess.pipeline import check_case
from assess.updating.kinds import KINDS
from assess.updating.model import specify
from assess.updating.prior import joint_prior
from tests.updating import graphs
from tests.updating import strength_case as deck
from tests.verification import cases

KIND = KINDS["rebound"]
FAR = {"level": "36", "slope": 0.5, "scatter": 0.05}


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(deck.case(("cores", "rebound")), deck.TABLES)


@pytest.mark.parametrize("stage", [0, 1, 2])
def test_graph_and_numbers_agree_and_gradients_are_finite(case, stage):
    graphs.check(KIND, KIND.rows(case), joint_prior(case), stage)


def test_hammers_without_cores_agree_too(make_case):
    case = make_case(deck.case(("rebound",)), deck.TABLES)
    graphs.check(KIND, KIND.rows(case), joint_prior(case), 2)


def test_later_surveys_say_nothing(case):
    rows = KIND.rows(case)
    nothing = KIND.log_likelihood(rows, deck.VALUES, KIND.data(rows, 0))
    np.testing.assert_array_equal(nothing, np.zeros(3))
    first = specify(case).data(1)
    last = specify(case).data(2)
    assert {name: array.shape for name, array in first.items()} == {
        name: array.shape for name, array in last.items()
    }


def test_the_line_is_that_of_least_squares_where_strengths_are_known(make_case):
    # Cores that read exactly leave a normal regression: its posterior under a flat prior is
    # normal about the least-squares line with covariance tau (X'X)^-1 (Gelman et al., Bayesian
    # Data Analysis, 3rd ed., 2013, section 14.2).
    rng = np.random.default_rng(8)
    strength = np.exp(np.log(35.0) + 0.2 * rng.standard_normal(60))
    rebound = np.exp(3.6 + 0.5 * np.log(strength / 30.0) + 0.07 * rng.standard_normal(60))
    cores = "location,strength [MPa],diameter [mm],length [mm],moisture\n" + "".join(
        f"K{i},{float(f)!r},100,200,as received\n" for i, f in enumerate(strength)
    )
    numbers = "location,rebound number\n" + "".join(
        f"K{i},{float(r)!r}\n" for i, r in enumerate(rebound)
    )
    exact = {"table": "c.csv", **deck.PLAIN, "within_location": 1e-7}
    survey = {
        "date": "2020-01-01",
        "cores": exact,
        "rebound": {"table": "r.csv", **deck.HAMMER, "reading_error": 0.09},
    }
    tables = {"c.csv": cores, "r.csv": numbers}
    rows = KIND.rows(make_case(cases.base(surveys=[survey]), tables))
    design = np.column_stack([np.ones(60), np.log(strength / 30.0)])
    best, *_ = np.linalg.lstsq(design, np.log(rebound), rcond=None)
    tau = 0.05**2 + np.log1p(0.09**2) / 9.0
    off = 0.02 * rng.standard_normal((20, 2))
    off[0] = 0.0
    values = {
        "deck.concrete_mean": np.full(20, 35.0),
        "deck.concrete_scatter": np.full(20, 0.2),
        "rebound.N.level": np.exp(best[0] + off[:, 0]),
        "rebound.N.slope": best[1] + off[:, 1],
        "rebound.N.scatter": np.full(20, 0.05),
    }
    ours = KIND.log_likelihood(rows, values, KIND.data(rows, 1))
    closed = -0.5 * np.einsum("di,ij,dj->d", off, design.T @ design / tau, off)
    np.testing.assert_allclose(ours - ours[0], closed, rtol=1e-4, atol=1e-5)


def test_simulation_has_the_moments_of_the_joint_normal_given_the_cores(case):
    rows = KIND.rows(case)
    values = {name: np.full(40_000, value[1]) for name, value in deck.VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(2))
    known = [r for r in deck.readings() if r.kind == "cores"]
    both = [*known, *(r for r in deck.readings() if r.kind == "rebound")]
    mean, covariance, value, _ = deck.joint(both, deck.at(1))
    n = len(known)
    gain = np.linalg.solve(covariance[:n, :n], covariance[:n, n:]).T
    expected = mean[n:] + gain @ (value[:n] - mean[:n])
    left = covariance[n:, n:] - gain @ covariance[:n, n:]
    sd = np.sqrt(np.diag(left))
    np.testing.assert_array_less(np.abs(drawn.mean(axis=0) - expected), 4.5 * sd / 200.0)
    np.testing.assert_allclose(
        np.corrcoef(drawn.T), left / np.outer(sd, sd), atol=4.5 / np.sqrt(4e4)
    )
    np.testing.assert_allclose(drawn.std(axis=0), sd, rtol=0.02)


def test_the_catalogues_line_is_the_basic_curve_at_30_mpa():
    # EN 13791:2007, 8.3.3 (from memory), solved and differentiated numerically.
    level = np.exp(np.interp(np.log(30.0), *_log_curve(strength_from_rebound, 24.5, 49.5)))
    entries = catalogue()
    for what, expected in (("level", level), ("slope", _slope(level))):
        low, high = entries[f"rebound number {what} by EN 13791"]["quantiles"].values()
        assert np.sqrt(low * high) == pytest.approx(expected, rel=0.005)
    # 26 % in strength from the level, 17 % from place to place: some 30 % together.
    level_sd = np.log(45.4 / 30.6) / (2.0 * 1.6448536)
    assert np.hypot(level_sd, 0.08) / _slope(level) == pytest.approx(0.30, abs=0.02)


def _log_curve(curve, low, high):
    reading = np.linspace(low, high, 20_001)
    return np.log(curve(reading)), np.log(reading)


def _slope(level):
    steps = level * np.array([1.0 - 1e-5, 1.0 + 1e-5])
    return 2e-5 / np.diff(np.log(strength_from_rebound(steps)))[0]


def test_the_basic_curve_has_its_published_pieces():
    # EN 13791:2007, figure 2, from memory.
    assert strength_from_rebound(np.array([20.0, 24.0, 50.0])) == pytest.approx([2.0, 7.0, 52.0])


def test_a_hammer_with_pairs_and_one_with_a_curve_have_their_own_priors(case):
    known = {variable.name: variable for variable in KIND.variables(case)}
    assert set(known) == {
        f"rebound.{name}.{what}" for name in "NM" for what in ("level", "slope", "scatter")
    }
    assert known["rebound.N.level"].source.startswith("engineering judgement")
    assert known["rebound.M.level"].source.startswith("EN 13791:2007")
    wide, narrow = (
        np.log(known[f"rebound.{name}.level"].marginal.from_score(np.array([-1.0, 1.0])))
        for name in "NM"
    )
    assert np.ptp(wide) > 2.0 * np.ptp(narrow)


def test_the_engineers_own_line_is_taken(make_case):
    own = {
        name: {"distribution": "lognormal", "mean": mean, "V": 0.1, "source": "trial beams 2019"}
        for name, mean in (("level", 35.0), ("slope", 0.55), ("scatter", 0.06))
    }
    raw = deck.case(("rebound",))
    raw["surveys"][0]["rebound"]["curve"] = own
    variables = KIND.variables(make_case(raw, deck.TABLES))
    assert variables[0].source == "trial beams 2019"
    assert float(variables[0].marginal.from_score(0.0)) == pytest.approx(35.0 / np.sqrt(1.01))


def _faults(tmp_path, raw, tables=deck.TABLES):
    path = cases.write_case(tmp_path, raw, tables)
    return path.read_text().split("\n"), check_case(path)


def test_a_hammer_without_pairs_and_curve_is_refused(tmp_path):
    raw = deck.case(("cores", "rebound"))
    raw["surveys"][1]["rebound"].pop("curve")
    table = "location,rebound number\nB1,40\n,38\n"
    lines, checked = _faults(tmp_path, raw, deck.TABLES | {"rebound2.csv": table})
    (fault,) = checked.faults
    assert lines[fault.line - 1].strip() in ("device:", "name: M")
    assert "nothing leads from the readings of device 'M' to strength" in str(fault)
    assert "add curve: to the entry" in str(fault)


def test_a_hammer_with_two_curves_is_refused(tmp_path):
    raw = deck.case(("rebound",))
    own = {
        name: {"distribution": "lognormal", "mean": mean, "V": 0.1, "source": "trial"}
        for name, mean in FAR.items()
    }
    raw["surveys"][1]["rebound"] |= {"device": {"name": "N"}, "curve": own}
    lines, checked = _faults(tmp_path, raw)
    (fault,) = checked.faults
    assert "device 'N' has another curve in line" in str(fault)
    assert "curve" in lines[fault.line - 1] or "level" in lines[fault.line - 1]


@pytest.mark.parametrize(
    ("table", "words", "line"),
    [
        ("location,rebound number,readings\nK1,38,8.5\n", "must be whole", 2),
        ("location,rebound number\nK1,38\nK2,-3\n", "rebound number", 3),
        ("location,rebound number\nK1,38\nK2,138\n", "rebound number", 3),
        ("location,rebound number [MPa]\nK1,38\n", "MPa", 1),
        ("location,hardness\nK1,38\n", "rebound number", 1),
        ("location,zone,rebound number\nK1,pier,38\n", "pier", 2),
        ("location,rebound number\n", "", 1),
    ],
)
def test_bad_tables_are_refused_with_their_line(tmp_path, table, words, line):
    raw = deck.case(("cores", "rebound"))
    if "zone" in table:
        raw["surveys"][0]["rebound"].pop("zone")
    _, checked = _faults(tmp_path, raw, deck.TABLES | {"rebound.csv": table})
    found = [f for f in checked.faults if f.file.endswith("rebound.csv")]
    assert found
    assert any(words in str(fault) and fault.line == line for fault in found)


def test_a_prior_that_a_scatter_cannot_have_is_refused(tmp_path):
    raw = deck.case(("cores", "rebound"))
    raw["priors"] = {
        "rebound.N.scatter": {"distribution": "normal", "mean": 0.1, "sd": 0.02, "source": "test"}
    }
    lines, checked = _faults(tmp_path, raw)
    (fault,) = checked.faults
    assert "rebound.N.scatter must be a distribution of positive values only" in str(fault)
    assert "rebound.N.scatter" in lines[fault.line - 1]


def test_readings_beyond_the_curve_are_doubted(tmp_path):
    table = "location,rebound number\nK1,38\nK2,53\n"
    raw = deck.case(("rebound",))
    _, checked = _faults(tmp_path, raw, deck.TABLES | {"rebound.csv": table})
    assert not checked.faults
    doubts = [d for d in checked.doubts if d.file.endswith("rebound.csv")]
    assert any(
        d.line == 3 and "outside what the curve of EN 13791 was drawn for" in str(d) for d in doubts
    )


def test_a_stated_level_must_be_positive():
    with pytest.raises(ValidationError, match="distribution of positive values only"):
        KIND.form.entry.model_validate(
            {
                "table": "r.csv",
                "device": {"name": "N"},
                "curve": {
                    "level": {"distribution": "normal", "mean": 36, "sd": 3, "source": "x"},
                    "slope": {"distribution": "lognormal", "mean": 0.5, "V": 0.1, "source": "x"},
                    "scatter": {"distribution": "lognormal", "mean": 0.1, "V": 0.1, "source": "x"},
                },
            }
        )


@pytest.mark.parametrize("what", ["level", "slope", "scatter"])
@pytest.mark.parametrize("basis", ["by EN 13791", "left to pairs"])
def test_every_prior_of_a_hammer_is_in_the_catalogue(what, basis):
    stated = distribution_of("-").model_validate({"catalogue": f"rebound number {what} {basis}"})
    assert stated.marginal().support[0] >= 0.0
