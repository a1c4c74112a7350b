"""Cores, velocities and rebound numbers of the same places, against the joint normal density."""

import numpy as np
import pytest
from scipy import stats

from assess.reliability.problem import section_state
from assess.reliability.teaching import lost_log_likelihood
from assess.updating.kinds import KINDS
from assess.updating.model import specify
from assess.updating.strength_places import REFERENCE, units
from tests.updating.graphs import graph, numbers
from tests.verification import cases

CORES, REBOUND, VELOCITY = KINDS["cores"], KINDS["rebound"], KINDS["pulse_velocity"]
CORE_TABLE = "location,section,strength [MPa],diameter [mm],length [mm],moisture\n" + (
    "A,,38,100,200,soaked\nA,,35,100,200,soaked\nB,,31,100,200,soaked\n,S1,40,100,200,soaked\n"
)
REBOUND_TABLE = "location,section,rebound\nA,,41\nB,,36\nC,,44\n,S1,42\n,,39\nA,,43\n"
VELOCITY_TABLE = "location,section,velocity [km/s]\nA,,4.4\nC,,4.6\n,S1,4.5\n"
LATER = "location,section,rebound\nB,,38\nD,,45\n"
VALUES = {
    "deck.concrete_mean": np.array([34.0, 40.0]),
    "deck.concrete_scatter": np.array([0.12, 0.2]),
    "rebound.hammer.level": np.array([3.5, 3.6]),
    "rebound.hammer.slope": np.array([0.4, 0.55]),
    "rebound.hammer.scatter": np.array([0.04, 0.07]),
    "pulse_velocity.device.level": np.array([4.2, 4.4]),
    "pulse_velocity.device.slope": np.array([0.3, 0.45]),
    "pulse_velocity.device.scatter": np.array([0.06, 0.1]),
}


@pytest.fixture
def make(make_case):
    def build(errors="normal", curve=None, cores=True):
        first = {
            "date": "2015-01-01",
            "pulse_velocity": {"table": "v.csv", "zone": "deck"},
            "rebound": {"table": "r.csv", "zone": "deck", "device": "hammer"},
        }
        if cores:
            first["cores"] = {
                "table": "c.csv", "zone": "deck", "correction": "none", "errors": errors,
            }  # fmt: skip
        if curve:
            first["rebound"]["curve"] = first["pulse_velocity"]["curve"] = curve
        later = {"table": "l.csv", "zone": "deck", "device": "hammer"}
        case = cases.base(surveys=[first, {"date": "2020-01-01", "rebound": later}])
        tables = {
            "c.csv": CORE_TABLE, "r.csv": REBOUND_TABLE, "v.csv": VELOCITY_TABLE, "l.csv": LATER,
        }  # fmt: skip
        return make_case(case, tables)

    return build


def _joint(case, draw, stage, left_out=None):
    """Log-density of all readings as one multivariate normal."""
    at = {name: value[draw] for name, value in VALUES.items()}
    centre, scatter = np.log(at["deck.concrete_mean"]), at["deck.concrete_scatter"]
    mean, slope, place, noise, unit, value = [], [], [], [], [], []
    for kind, line in (
        (CORES, None),
        (VELOCITY, "pulse_velocity.device"),
        (REBOUND, "rebound.hammer"),
    ):
        rows = kind.rows(case)
        if rows is None or kind is left_out:
            continue
        for i in np.flatnonzero(rows.stage <= stage):
            name = rows.places[rows.place[i]] or f"{kind.form.key} {i}"
            value.append(rows.value[i])
            place.append(name)
            if line is None:
                mean.append(centre)
                slope.append(1.0)
                noise.append(1.0 / rows.extra["precision"][i])
                unit.append(f"core {i}")
            else:
                mean.append(at[f"{line}.level"] + at[f"{line}.slope"] * (centre - REFERENCE))
                slope.append(at[f"{line}.slope"])
                noise.append(rows.extra["variance"][i])
                unit.append(f"{line} {name}")
    count, slope = len(value), np.array(slope)
    covariance = np.diag(noise)
    for i in range(count):
        for j in range(count):
            if place[i] == place[j]:
                covariance[i, j] += slope[i] * slope[j] * scatter**2
            if unit[i] == unit[j] and not unit[i].startswith("core"):
                line = unit[i].split(" ")[0]
                covariance[i, j] += at[f"{line}.scatter"] ** 2
    return stats.multivariate_normal(mean, covariance).logpdf(value)


def _ours(case, stage):
    total = 0.0
    for kind in (CORES, VELOCITY, REBOUND):
        rows = kind.rows(case)
        if rows is not None:
            total = total + kind.log_likelihood(rows, VALUES, kind.data(rows, stage))
    return total


@pytest.mark.parametrize("stage", [1, 2])
@pytest.mark.parametrize("cores", [True, False])
def test_kinds_together_have_the_joint_density(make, stage, cores):
    case = make(cores=cores, curve="published")
    ours = _ours(case, stage)
    exact = [_joint(case, draw, stage) for draw in (0, 1)]
    assert ours[1] - ours[0] == pytest.approx(exact[1] - exact[0], rel=1e-9)


def test_normal_errors_are_a_limit_of_student_errors(make):
    # With as many degrees of freedom as allowed t errors are nearly normal: so are the densities.
    case = make(errors="Student-t")
    rows = {kind: kind.rows(case) for kind in (CORES, VELOCITY, REBOUND)}
    total = []
    for freedom in (np.inf, 1e7):
        found = 0.0
        for kind, some in rows.items():
            for core in [r for k, r in getattr(some, "earlier", ()) if k == "cores"] + (
                [some] if kind is CORES else []
            ):
                core.extra["freedom"][:] = freedom
            for _, velocity in [p for p in getattr(some, "earlier", ()) if p[0] != "cores"]:
                for _, core in velocity.earlier:
                    core.extra["freedom"][:] = freedom
            found = found + kind.log_likelihood(some, VALUES, kind.data(some, 2))
        total.append(found)
    np.testing.assert_allclose(total[0], total[1], atol=2e-4)


def test_the_sampler_sees_the_same_density(make):
    for errors in ("normal", "Student-t"):
        case = make(errors)
        prior = specify(case).prior
        at = 0.5 * np.random.default_rng(7).normal(size=len(prior.names))
        for kind in (VELOCITY, REBOUND):
            rows = kind.rows(case)
            value, gradient = graph(kind, rows, prior, 2)(at)
            assert value == pytest.approx(numbers(kind, rows, prior, 2, at), abs=1e-8)
            assert np.all(np.isfinite(gradient))


def test_later_surveys_say_nothing_before(make):
    case = make()
    rows = REBOUND.rows(case)
    nothing = REBOUND.log_likelihood(rows, VALUES, REBOUND.data(rows, 0))
    np.testing.assert_allclose(nothing, 0.0, atol=1e-12)


def test_section_strength_is_conditional_on_all_that_was_read_there(make):
    case = make()
    spec = specify(case)
    values = {
        **{n: np.zeros(2) for n in spec.prior.names},
        **VALUES,
        "steel.main": np.full(2, 460.0),
    }
    values |= {"deck.cover_mean": np.full(2, 40.0), "deck.cover_scatter": np.full(2, 8.0)}
    state = section_state(case, spec, case.spec.sections()["S1"], 2, values)
    (model,) = [m for m in state.locals if "strength" in m.names]
    assert {"cores", "rebound", "pulse_velocity"} <= state.measured
    for draw in (0, 1):
        at = {name: value[draw] for name, value in VALUES.items()}
        centre, variance = np.log(at["deck.concrete_mean"]), at["deck.concrete_scatter"] ** 2
        core = CORES.rows(case)
        readings = [(1.0, np.log(40.0), 1.0 / core.extra["precision"][0])]
        for line, y, error in (
            ("rebound.hammer", np.log(42.0), np.log1p(0.1**2 / 10.0)),
            ("pulse_velocity.device", 4.5, (0.02 * 4.2) ** 2),
        ):
            b, s = at[f"{line}.slope"], at[f"{line}.scatter"]
            readings.append((b, y - at[f"{line}.level"] + b * REFERENCE, s**2 + error))
        precision = 1.0 / variance + sum(b * b / v for b, _, v in readings)
        mean = (centre / variance + sum(b * y / v for b, y, v in readings)) / precision
        for z in (-1.0, 2.0):
            found = model.values(np.full((1, 1, 1), z), np.array([draw]))["strength"].item()
            assert np.log(found) == pytest.approx(mean + z / np.sqrt(precision))


def test_a_calibration_line_agrees_with_least_squares(make_case):
    # Many pairs whose strengths are known exactly: the likelihood in level and slope is that of
    # least squares with the scatter known (Gelman et al., BDA3, section 14.2).
    rng = np.random.default_rng(11)
    strength = rng.uniform(20.0, 60.0, 30)
    reading = np.exp(3.5 + 0.42 * (np.log(strength) - REFERENCE) + 0.05 * rng.normal(size=30))
    tables = {
        "c.csv": "location,strength [MPa],diameter [mm],length [mm],moisture\n"
        + "".join(f"P{i},{f},100,200,soaked\n" for i, f in enumerate(strength)),
        "r.csv": "location,rebound\n" + "".join(f"P{i},{r}\n" for i, r in enumerate(reading)),
    }
    survey = {
        "date": "2015-01-01",
        "cores": {
            "table": "c.csv", "zone": "deck", "correction": "none", "within_location": 1e-4,
        },
        "rebound": {"table": "r.csv", "zone": "deck", "V": 1e-4},
    }  # fmt: skip
    case = make_case(cases.base(surveys=[survey]), tables)
    rows = REBOUND.rows(case)
    x, y = np.log(strength) - REFERENCE, np.log(reading)
    grid = np.linspace(-0.05, 0.05, 21)
    level, slope = (part.ravel() for part in np.meshgrid(3.5 + grid, 0.42 + 2 * grid))
    count = len(level)
    values = {
        "deck.concrete_mean": np.full(count, 38.0),
        "deck.concrete_scatter": np.full(count, 0.3),
        "rebound.device.level": level,
        "rebound.device.slope": slope,
        "rebound.device.scatter": np.full(count, 0.05),
    }
    found = REBOUND.log_likelihood(rows, values, REBOUND.data(rows, 1))
    misfit = ((y - level[:, None] - slope[:, None] * x) ** 2).sum(axis=1)
    exact = -0.5 * misfit / 0.05**2
    np.testing.assert_allclose(found - found.max(), exact - exact.max(), rtol=1e-3, atol=1e-3)


def test_repeated_readings_of_a_place_share_its_departure(make):
    rows = REBOUND.rows(make())
    found = units(rows)
    assert len(found.place) == 6  # A twice, B twice, C, S1, D and one on its own
    assert found.of_row[0] == found.of_row[5]


def test_simulated_readings_have_the_moments_of_the_model(make):
    case = make()
    rows = REBOUND.rows(case)
    draws = 100_000
    values = {name: np.full(draws, value[0]) for name, value in VALUES.items()}
    found = REBOUND.simulate(rows, values, np.random.default_rng(3))
    alone = rows.places.index("deck: D")
    row = int(np.flatnonzero(rows.place == alone)[0])
    at = {name: value[0] for name, value in VALUES.items()}
    b = at["rebound.hammer.slope"]
    mean = at["rebound.hammer.level"] + b * (np.log(34.0) - REFERENCE)
    variance = (b * 0.12) ** 2 + 0.04**2 + rows.extra["variance"][row]
    assert found[:, row].mean() == pytest.approx(mean, abs=1e-3)
    assert found[:, row].var() == pytest.approx(variance, rel=0.02)
    assert np.cov(found[:, 0], found[:, 5])[0, 1] > 0.04**2  # both at A


def test_readings_without_a_core_need_the_published_curve(make):
    faults = [*REBOUND.faults(make(cores=False)), *VELOCITY.faults(make(cores=False))]
    assert len(faults) == 3
    assert all(fault.line > 1 for fault in faults)
    assert "no core was taken" in str(faults[0])
    assert "curve: published" in str(faults[0])
    assert list(REBOUND.faults(make())) == []


@pytest.mark.parametrize("left_out", [CORES, VELOCITY, REBOUND])
def test_leaving_a_kind_out_leaves_the_density_of_the_others(make, left_out):
    case = make()
    spec = specify(case)
    lost = lost_log_likelihood(spec, left_out.form.key, VALUES, 2)
    kept = _ours(case, 2) - lost
    exact = [_joint(case, draw, 2, left_out) for draw in (0, 1)]
    assert kept[1] - kept[0] == pytest.approx(exact[1] - exact[0], rel=1e-9)
