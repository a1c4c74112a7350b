"""Densities and thicknesses: likelihood, conjugate posterior, loads that follow them, faults."""

import numpy as np
import pytest
from scipy import stats

from assess.pipeline import check_case
from assess.reliability.limit_state import Action
from assess.reliability.problem import capacity_now, common_names, dimensions, section_state
from assess.updating.model import specify
from assess.updating.prior import joint_prior
from assess.updating.quantities import Quantities
from tests.updating import graphs
from tests.verification import cases

KIND = Quantities()
LEVEL = {"distribution": "normal", "mean": "24.5 kN/m^3", "V": 0.03, "source": "test"}
STATED = {
    "concrete": {
        "of": "weight density",
        "level": LEVEL,
        "scatter": {"distribution": "lognormal", "mean": "0.5 kN/m^3", "V": 0.3, "source": "test"},
    },
    "surfacing": {
        "of": "thickness",
        "level": {"distribution": "lognormal", "mean": "90 mm", "V": 0.25, "source": "test"},
        "scatter": {"distribution": "lognormal", "mean": "12 mm", "V": 0.4, "source": "test"},
    },
}
DENSITY = "location,weight density [kN/m^3]\nK1,24.1\nK1,24.3\nK2,25.0\n,23.8\n,24.6\n"
THICKNESS = "thickness [mm]\n95\n110\n84\n"
LATER = "location,weight density [kN/m^3]\nK2,24.8\n,24.2\n"
VALUES = {
    "quantity.concrete": np.array([24.4, 25.1]),
    "quantity.concrete.scatter": np.array([0.4, 0.7]),
    "quantity.surfacing": np.array([92.0, 105.0]),
    "quantity.surfacing.scatter": np.array([10.0, 18.0]),
}
ERROR = {"concrete": 0.01 * 24.5, "surfacing": 0.05 * 90.0}


def raw(density=DENSITY, thickness=THICKNESS, later=LATER):
    def entry(table, quantity, error):
        return {"table": table, "quantity": quantity, "error": error}

    surveys = [
        {
            "date": "2010-01-01",
            "quantities": [entry("a.csv", "concrete", 0.01), entry("b.csv", "surfacing", 0.05)],
        },
        {"date": "2020-01-01", "quantities": entry("c.csv", "concrete", 0.01)},
    ]
    case = cases.base(surveys=surveys)
    case["quantities"] = STATED
    load = case["members"][0]["loads"]["permanent"][0]
    load["proportional_to"] = ["concrete"]
    case["members"][0]["loads"]["permanent"].append(
        {"name": "surfacing", "effect": "80 kN*m", "V": 0.02, "proportional_to": ["surfacing"]}
    )
    return case, {"a.csv": density, "b.csv": thickness, "c.csv": later}


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(*raw())


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


# By hand: (survey, quantity, place, value).
READINGS = [
    *((0, "concrete", place, x) for place, x in
      (("K1", 24.1), ("K1", 24.3), ("K2", 25.0), ("a", 23.8), ("b", 24.6))),
    *((0, "surfacing", place, x) for place, x in (("c", 95.0), ("d", 110.0), ("e", 84.0))),
    (1, "concrete", "K2", 24.8),
    (1, "concrete", "f", 24.2),
]  # fmt: skip


def joint(quantity, draw, stage):
    """Mean, covariance and values of the readings of one quantity, in its unit."""
    mine = [r for r in READINGS if r[1] == quantity and r[0] < stage]
    same = np.array([[a[2] == b[2] for b in mine] for a in mine])
    sd = VALUES[f"quantity.{quantity}.scatter"][draw]
    covariance = same * sd**2 + np.eye(len(mine)) * ERROR[quantity] ** 2
    mean = np.full(len(mine), VALUES[f"quantity.{quantity}"][draw])
    return mean, covariance, np.array([r[3] for r in mine])


@pytest.mark.parametrize("stage", [1, 2])
def test_likelihood_is_the_joint_normal_density(rows, stage):
    found = KIND.log_likelihood(rows, VALUES, KIND.data(rows, stage))
    for draw in range(2):
        expected = 0.0
        for quantity, error in ERROR.items():
            mean, covariance, value = joint(quantity, draw, stage)
            expected += stats.multivariate_normal(mean, covariance).logpdf(value)
            expected += len(value) * (np.log(error) + 0.5 * np.log(2.0 * np.pi))
        assert found[draw] == pytest.approx(expected, rel=1e-10)


def test_later_surveys_are_switched_off(rows):
    assert np.all(KIND.log_likelihood(rows, VALUES, KIND.data(rows, 0)) == 0.0)


def test_the_sampler_sees_the_same_likelihood_with_a_gradient(case, rows):
    graphs.check(KIND, rows, joint_prior(case), 2)


def test_with_known_scatter_the_posterior_is_the_conjugate_normal(rows):
    # Precision-weighted mean of the prior and of the thicknesses (Gelman et al. 2013, 2.5), by
    # summing prior times likelihood over a grid.
    sd, error, prior = 10.0, ERROR["surfacing"], (90.0, 20.0)
    grid = np.linspace(20.0, 200.0, 4001)
    values = {name: np.full(len(grid), array[0]) for name, array in VALUES.items()}
    values |= {"quantity.surfacing": grid, "quantity.surfacing.scatter": np.full(len(grid), sd)}
    log_density = KIND.log_likelihood(rows, values, KIND.data(rows, 2))
    weight = np.exp(log_density - log_density.max()) * stats.norm.pdf(grid, *prior)
    mean = np.average(grid, weights=weight)
    spread = np.sqrt(np.average((grid - mean) ** 2, weights=weight))
    each, read = 1.0 / (sd**2 + error**2), np.array([95.0, 110.0, 84.0])
    total = prior[1] ** -2 + 3.0 * each
    assert mean == pytest.approx((prior[0] / prior[1] ** 2 + each * read.sum()) / total, rel=1e-6)
    assert spread == pytest.approx(total**-0.5, rel=1e-4)


def test_neither_order_nor_a_split_table_nor_the_unit_changes_anything(make_case, rows):
    head, *lines = DENSITY.splitlines(keepends=True)
    case, tables = raw(density=head + "".join(reversed(lines)))
    turned = KIND.rows(make_case(case, tables))
    entry = case["surveys"][0]["quantities"][0]
    case["surveys"][0]["quantities"].append({**entry, "table": "d.csv"})
    tables |= {"a.csv": head + "".join(lines[:2]), "d.csv": head + "".join(lines[2:])}
    split = KIND.rows(make_case(case, tables))
    centimetres = "thickness [cm]\n9.5\n11.0\n8.4\n"
    other = KIND.rows(make_case(*raw(thickness=centimetres)))
    first = KIND.log_likelihood(rows, VALUES, KIND.data(rows, 2))
    for again in (turned, split, other):
        found = KIND.log_likelihood(again, VALUES, KIND.data(again, 2))
        assert found == pytest.approx(first, rel=1e-12)


def test_places_read_alike_are_one_group(make_case):
    many = raw(thickness="thickness [mm]\n" + "".join(f"{90 + 0.01 * i}\n" for i in range(3000)))
    arrays = [KIND.data(KIND.rows(make_case(*one)), 2) for one in (raw(), many)]
    assert all(arrays[0][name].shape == arrays[1][name].shape for name in arrays[0])


def test_simulation_has_the_moments_of_the_model(rows):
    values = {name: np.full(60_000, array[1]) for name, array in VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(3))
    stated = {"concrete": 24.5, "surfacing": 90.0}
    for quantity in ERROR:
        mean, covariance, _ = joint(quantity, 1, 2)
        mine = [i for i, r in enumerate(READINGS) if r[1] == quantity]
        scaled = drawn[:, mine] * stated[quantity]
        sd = np.sqrt(covariance[0, 0])
        np.testing.assert_allclose(scaled.mean(axis=0), mean, atol=0.025 * sd)
        np.testing.assert_allclose(np.cov(scaled.T) / sd**2, covariance / sd**2, atol=0.03)


def test_permanent_loads_follow_their_quantities(case):
    prior = joint_prior(case)
    z = np.random.default_rng(5).standard_normal((3, len(prior.names)))
    draws = dict(zip(prior.names, prior.physical(z).T, strict=True))
    heavier = draws | {"quantity.concrete": draws["quantity.concrete"] + 1.225}
    thicker = draws | {"quantity.surfacing": draws["quantity.surfacing"] + 9.0}
    entry = case.spec.sections()["S1"]
    assert common_names(case.spec, entry)[-2:] == ("quantity.concrete", "quantity.surfacing")

    def capacity(values, score):
        state = section_state(case, specify(case), entry, 0, values)
        names = list(dimensions(state))
        point = np.zeros((3, 1, len(names)))
        point[..., names.index("permanent load")] = score
        return capacity_now(case, state, point, np.arange(3), Action())[:, 0]

    base = capacity(draws, 0.0)
    # 5 % of 24.5 kN/m³ on 450 kNm; a tenth of 90 mm on 80 kNm.
    assert base - capacity(heavier, 0.0) == pytest.approx(np.full(3, 0.05 * 450e6), rel=1e-6)
    assert base - capacity(thicker, 0.0) == pytest.approx(np.full(3, 0.1 * 80e6), rel=1e-6)
    # One standard deviation of the load's own, V 0.05 and 0.02, of the effects that there are.
    ratios = draws["quantity.concrete"] / 24.5, draws["quantity.surfacing"] / 90.0
    sd = np.hypot(0.05 * 450e6 * ratios[0], 0.02 * 80e6 * ratios[1])
    assert base - capacity(draws, 1.0) == pytest.approx(sd, rel=1e-6)


def _without_scatter(case):
    case["quantities"] = {**STATED, "concrete": {"of": "weight density", "level": LEVEL}}


def _unknown_quantity(case):
    case["surveys"][0]["quantities"][0]["quantity"] = "concret"


def _unknown_load(case):
    case["members"][0]["loads"]["permanent"][0]["proportional_to"] = ["concret"]


def _twice(case):
    case["members"][0]["loads"]["permanent"][0]["proportional_to"] = ["concrete", "concrete"]


def _nothing(_case):
    pass


@pytest.mark.parametrize(
    ("change", "table", "words"),
    [
        (_without_scatter, DENSITY, "quantities.concrete: the quantity was measured but its scat"),
        (_unknown_quantity, DENSITY, ".quantity: there is no quantity of this name, given concret"),
        (_unknown_load, DENSITY, "permanent.0.proportional_to.0: there is no quantity of this"),
        (_twice, DENSITY, "proportional_to.1: the quantity stands twice, given concrete"),
        (_nothing, "thickness [mm]\n90\n", "a.csv:2: column 'weight density' has no value, which"),
        (_nothing, "weight density [mm]\n24\n", "a unit that does not convert to kN/m^3"),
        (_nothing, "weight density\n24\n", "column 'weight density' has no unit"),
        (_nothing, "weight density [kN/m^3]\n-24\n", "a.csv:2: column 'weight density': is out of"),
        (_nothing, "weight density [kN/m^3]\n", "no rows"),
        (_nothing, "section,weight density [kN/m^3]\nS9,24\n", "a.csv:2: there is no section of"),
    ],
)
def test_faults_are_said_with_their_place(tmp_path, change, table, words):
    case, tables = raw(density=table)
    change(case)
    path = cases.write_case(tmp_path, case, tables)
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault for fault in faults), faults
