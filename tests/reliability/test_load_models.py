"""Loads whose yearly maxima are uncertain: predictive load, load factors, faults."""

import numpy as np
import pytest
from scipy import integrate as quadrature
from scipy import stats

from assess.pipeline import check_case
from assess.reliability.annual_maximum import AnnualMaximum
from assess.reliability.importance import Problem
from assess.reliability.index import index_from_probability, probability_from_index
from assess.reliability.lifetime import integrate
from assess.reliability.limit_state import Action
from assess.reliability.problem import build_problem, common_names, section_state
from assess.reliability.section import Precision, load_factor, section_reliability
from assess.updating.model import specify
from tests.verification import cases

MODEL = {
    "quantity": "moment",
    "location": {"distribution": "lognormal", "mean": "250 kN*m", "V": 0.1, "source": "test"},
    "scale": {"distribution": "lognormal", "mean": "25 kN*m", "V": 0.3, "source": "test"},
    "shape": {"distribution": "normal", "mean": 0.0, "sd": 0.1, "source": "test"},
}
PRECISION = Precision(4, 0.01, 11)


def raw(maximum, **model):
    case = cases.base()
    case["load_models"] = {"traffic": MODEL | model}
    case["members"][0]["loads"]["variable"]["annual_maximum"] = maximum
    return case


@pytest.mark.parametrize("shape", [0.0, 0.15, -0.1])
def test_hazards_are_those_of_the_distribution_of_each_draw(shape):
    mode, scale = np.array([[10.0, 11.0], [12.0, 13.0]]), np.array([[1.0, 1.0], [2.0, 2.0]])
    maximum = AnnualMaximum(mode, scale, np.full(2, shape))
    capacity = np.linspace(11.0, 19.0, 12).reshape(2, 3, 2)
    found = maximum.log_hazard(capacity, np.array([1, 0]), np.array([0, 1]))
    for row, draw in enumerate((1, 0)):
        for year in range(2):
            known = stats.genextreme(-shape, mode[draw, year], scale[draw, year])
            np.testing.assert_allclose(
                np.exp(-np.exp(found[row, :, year])), known.cdf(capacity[row, :, year]), rtol=1e-9
            )


def test_the_predictive_load_carries_the_uncertainty_of_its_parameters():
    # Known resistance, location normal: P = E[1 - F(q | u)], by quadrature over u.
    rng = np.random.default_rng(1)
    location = 5.0 + 0.6 * rng.standard_normal(4000)
    maximum = AnnualMaximum(location[:, None], np.full((4000, 1), 0.5), np.full(4000, 0.1))

    def log_hazard(z, chosen, which):
        return maximum.log_hazard(9.0 + 0.01 * z, chosen, which)

    found = integrate(Problem(log_hazard, 1, 4000, 1), chains=4, tolerance=0.003, seed=1).annual

    def failing(u):
        return stats.norm.pdf(u, 5.0, 0.6) * stats.genextreme(-0.1, u, 0.5).sf(9.0)

    expected = index_from_probability(quadrature.quad(failing, 1.0, 9.0)[0])
    assert found.index[0] == pytest.approx(float(expected), abs=0.03)  # 4000 draws of u
    assert found.index[0] < index_from_probability(stats.genextreme(-0.1, 5.0, 0.5).sf(9.0)) - 0.05


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(raw({"load_model": "traffic", "factor": 1.1, "growth": 0.01}), {})


@pytest.fixture(scope="module")
def state(case):
    spec = specify(case)
    z = np.random.default_rng(2).standard_normal((800, len(spec.prior.names)))
    values = dict(zip(spec.prior.names, spec.prior.physical(z).T, strict=True))
    return section_state(case, spec, case.spec.sections()["S1"], 0, values)


def test_sections_use_the_variables_of_their_load_model(case, state):
    names = common_names(case.spec, case.spec.sections()["S1"])
    assert {"load.traffic.location", "load.traffic.scale", "load.traffic.shape"} <= set(names)
    problem = build_problem(case, state, Action())
    location, scale = (state.common[f"load.traffic.{k}"] for k in ("location", "scale"))
    grown = 1.0 + 0.01 * np.arange(10)
    np.testing.assert_allclose(problem.load_ratio, (location / scale)[:, None] * grown)


@pytest.mark.parametrize("difference", [-0.3, 0.4])
def test_load_factors_meet_their_target_with_uncertain_loads(case, state, difference):
    left = section_reliability(case, state, Action(), 1, PRECISION)
    wanted = float(left.annual.index[0]) + difference
    factor = load_factor(left, float(probability_from_index(wanted)), 1)
    again = section_reliability(
        case, state, Action(load_factor=factor), 1, Precision(4, 1.0, 11), left.proposal
    )
    assert again.annual.index[0] == pytest.approx(wanted, abs=1e-4)


@pytest.mark.parametrize(
    ("maximum", "model", "words"),
    [
        ({"load_model": "trafic"}, {}, "there is no load model of this name, given trafic"),
        ({"load_model": "traffic", "lever": "2 m"}, {}, "the load model is of a moment"),
        ({"load_model": "traffic", "V": 0.1}, {}, "takes one way to be said"),
        ({"mean": "250 kN*m"}, {}, "takes one way to be said"),
    ],
)
def test_faults(tmp_path, maximum, model, words):
    path = cases.write_case(tmp_path, raw(maximum, **model))
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault for fault in faults), faults


def test_a_force_acts_with_its_lever(make_case):
    force = {
        "quantity": "force",
        "location": {"distribution": "lognormal", "mean": "125 kN", "V": 0.1, "source": "test"},
        "scale": {"distribution": "lognormal", "mean": "12.5 kN", "V": 0.3, "source": "test"},
    }
    case = raw({"load_model": "traffic", "lever": "2 m"})
    case["load_models"]["traffic"] = force
    read = make_case(case, {})
    entry = read.spec.sections()["S1"]
    common = {"load.traffic.location": np.array([125e3]), "load.traffic.scale": np.array([12.5e3])}
    maximum = entry.loads.variable.annual_maximum.in_years(np.array([2026.0]), 2026, common)
    assert maximum.mode == pytest.approx(np.array([[250e6]]))
    assert maximum.scale == pytest.approx(np.array([[25e6]]))
    assert maximum.shape == 0.0
