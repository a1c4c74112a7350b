"""Recorded maxima: likelihood against SciPy and quadrature, simulation, faults."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.pipeline import check_case
from assess.updating.kinds import KINDS
from assess.updating.prior import joint_prior
from tests.verification import cases

KIND = KINDS["annual_maxima"]
TRAFFIC = {
    "quantity": "moment",
    "location": {"distribution": "lognormal", "mean": "400 kN*m", "V": 0.3, "source": "test"},
    "scale": {"distribution": "lognormal", "mean": "40 kN*m", "V": 0.5, "source": "test"},
    "shape": {"distribution": "normal", "mean": 0.0, "sd": 0.1, "source": "test"},
}
TRUCKS = {
    "quantity": "force",
    "location": {"distribution": "lognormal", "mean": "500 kN", "V": 0.3, "source": "test"},
    "scale": {"distribution": "lognormal", "mean": "50 kN", "V": 0.5, "source": "test"},
}
MOMENTS = "maximum moment [kN*m],period\n420,1\n455,1\n401,\n520,10\n"
WEIGHTS = "maximum force [kN];period [month]\n480;1\n515;1\n"
VALUES = {
    "load.traffic.location": np.array([400e6, 420e6]),
    "load.traffic.scale": np.array([40e6, 35e6]),
    "load.traffic.shape": np.array([0.05, -0.1]),
    "load.trucks.location": np.array([500e3, 480e3]),
    "load.trucks.scale": np.array([50e3, 60e3]),
}


def raw(**more):
    surveys = [
        {"date": "2015-01-01", "annual_maxima": {"table": "a.csv", "load_model": "traffic"}},
        {
            "date": "2020-01-01",
            "annual_maxima": {"table": "b.csv", "load_model": "trucks", "error": 0.05},
        },
    ]
    case = cases.base(surveys=surveys)
    case["load_models"] = {"traffic": TRAFFIC, "trucks": TRUCKS}
    return case | more


TABLES = {"a.csv": MOMENTS.replace("period", "period [yr]"), "b.csv": WEIGHTS}


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(raw(), TABLES)


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


def test_load_models_bring_their_variables(case):
    names = joint_prior(case).names
    assert set(VALUES) <= set(names)
    assert "load.trucks.shape" not in names  # Gumbel: there is no shape to be uncertain of


def test_moments_without_error_have_the_extreme_value_density(rows):
    found = KIND.log_likelihood(rows, VALUES, KIND.data(rows, 1))
    for draw in range(2):
        u, b, xi = (VALUES[f"load.traffic.{k}"][draw] for k in ("location", "scale", "shape"))
        known = stats.genextreme(-xi, u, b)
        expected = sum(
            known.logpdf(x) + np.log(t) + (t - 1.0) * known.logcdf(x)
            for x, t in ((420e6, 1.0), (455e6, 1.0), (401e6, 1.0), (520e6, 10.0))
        )
        assert found[draw] == pytest.approx(expected, rel=1e-10)


def test_recording_errors_are_integrated_out(rows):
    both = KIND.log_likelihood(rows, VALUES, KIND.data(rows, 2))
    first = KIND.log_likelihood(rows, VALUES, KIND.data(rows, 1))
    sd = np.sqrt(np.log1p(0.05**2))
    for draw in range(2):
        u, b = (VALUES[f"load.trucks.{k}"][draw] for k in ("location", "scale"))
        known, years = stats.gumbel_r(u, b), 1.0 / 12.0
        expected = 0.0
        for recorded in (480e3, 515e3):

            def integrand(e, recorded=recorded, known=known, years=years):
                # Density of the recorded value: of the true one by its Jacobian e^-e.
                true = recorded * np.exp(-e)
                density = years * known.pdf(true) * known.cdf(true) ** (years - 1.0)
                return stats.norm.pdf(e, 0.0, sd) * density * np.exp(-e)

            expected += np.log(integrate.quad(integrand, -8 * sd, 8 * sd)[0])
        assert both[draw] - first[draw] == pytest.approx(expected, rel=1e-6)


def test_later_surveys_are_switched_off(rows):
    assert np.all(KIND.log_likelihood(rows, VALUES, KIND.data(rows, 0)) == 0.0)


def test_simulation_follows_the_model(rows):
    values = {name: np.full(30_000, value[0]) for name, value in VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(1))
    known = stats.genextreme(-0.05, 400e6, 40e6)
    assert stats.kstest(drawn[:, 0], known.cdf).pvalue > 1e-3
    ten = stats.kstest(drawn[:, 3], lambda x: known.cdf(x) ** 10)
    assert ten.pvalue > 1e-3
    month = stats.gumbel_r(500e3 + 50e3 * np.log(1.0 / 12.0), 50e3)
    assert np.median(drawn[:, 4]) == pytest.approx(month.median(), rel=0.01)
    assert np.log(drawn[:, 4]).std() > np.log(month.rvs(30_000, random_state=2)).std()


def test_graph_and_numbers_agree(rows):
    tensor = pytest.importorskip("pytensor.tensor")
    graph = {name: tensor.dscalar() for name in VALUES}
    data = KIND.data(rows, 2)
    found = KIND.log_likelihood(rows, graph, data).eval(
        {graph[name]: value[0] for name, value in VALUES.items()}, mode="FAST_COMPILE"
    )
    assert found == pytest.approx(KIND.log_likelihood(rows, VALUES, data)[0], rel=1e-10)


@pytest.mark.parametrize(
    ("entry", "table", "words"),
    [
        ({"load_model": "trafic"}, MOMENTS, "there is no load model of this name, given trafic"),
        ({"load_model": "trucks"}, MOMENTS, "has no value, which load model 'trucks' needs"),
        ({"load_model": "traffic"}, "maximum moment [mm]\n400\n", "does not convert to N"),
        ({"load_model": "traffic"}, "maximum moment [kN*m]\n-4\n", "out of range"),
        ({"load_model": "traffic"}, "maximum moment [kN*m]\n", "no rows"),
    ],
)
def test_faults_are_said_with_their_place(tmp_path, entry, table, words):
    survey = {"date": "2015-01-01", "annual_maxima": {"table": "a.csv", **entry}}
    case = raw(surveys=[survey])
    path = cases.write_case(tmp_path, case, {"a.csv": table.replace(",period", "")
                                             .replace(",10", "").replace(",1", "")
                                             .replace("401,", "401")})  # fmt: skip
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault for fault in faults), faults
