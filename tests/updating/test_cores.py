import numpy as np
import pytest
from scipy import stats

from assess.mechanics.core_corrections import correction
from assess.updating.cores import CORRECTIONS
from assess.updating.kinds import KINDS
from tests.verification import cases

CORES = KINDS["cores"]
VALUES = {
    "deck.concrete_mean": np.array([33.0, 38.0]),
    "deck.concrete_scatter": np.array([0.12, 0.2]),
    "cores.length_correction": np.array([0.5, -1.0]),
    "cores.diameter_correction": np.array([-0.4, 1.3]),
    "cores.moisture_correction": np.array([1.1, 0.2]),
    "cores.damage_correction": np.array([0.0, -0.6]),
}


def _at(draw):
    return {name: value[draw] for name, value in VALUES.items()}


@pytest.fixture(scope="module")
def rows(example_case):
    return CORES.rows(example_case)


def test_rows(rows):
    assert len(rows.value) == 8
    assert rows.places == ("deck: K1", "deck: K2", "deck: K3", "deck: K4", "deck: K5", "section S1")
    factors = correction(np.array([35.0]), np.array([94.0]), np.array([94.0]), np.array(["soaked"]))
    assert rows.value[3] == pytest.approx(float(np.log(35.0 * factors.factor[0])))
    np.testing.assert_allclose(rows.extra["precision"], 1.0 / np.log1p(0.05**2))
    # A core of length twice its diameter needs no factor for its length, hence has no error in it.
    assert rows.extra["loading"][1, CORRECTIONS.index("length")] < 1e-9
    assert rows.extra["loading"][4, CORRECTIONS.index("diameter")] > 0.0


def _reference(rows, values):
    """Multivariate normal of all cores, built entry by entry."""
    count = len(rows.value)
    shift = sum(
        values.get(f"cores.{name}_correction", 0.0) * rows.extra["loading"][:, k]
        for k, name in enumerate(CORRECTIONS)
    )
    covariance = np.diag(1.0 / rows.extra["precision"])
    for i in range(count):
        for j in range(count):
            if rows.place[i] == rows.place[j]:
                covariance[i, j] += values["deck.concrete_scatter"] ** 2
    mean = np.log(values["deck.concrete_mean"]) + shift
    return stats.multivariate_normal(mean, covariance).logpdf(rows.value)


def test_likelihood_is_that_of_the_multivariate_normal(rows):
    ours = [CORES.log_likelihood(rows, _at(i), CORES.data(rows, 1)) for i in (0, 1)]
    reference = [_reference(rows, _at(i)) for i in (0, 1)]
    assert ours[1] - ours[0] == pytest.approx(reference[1] - reference[0], rel=1e-9)


def test_later_cores_say_nothing(rows):
    nothing = CORES.log_likelihood(rows, _at(0), CORES.data(rows, 0))
    assert nothing == 0.0


def test_simulation_has_the_moments_of_the_model(rows):
    values = {name: np.full(40_000, value[1]) for name, value in VALUES.items()}
    simulated = CORES.simulate(rows, values, np.random.default_rng(1))
    covariance = np.cov(simulated.T)
    assert covariance[2, 3] == pytest.approx(0.04, rel=0.03)  # two cores of K3
    assert covariance[0, 1] == pytest.approx(0.0, abs=0.001)
    assert covariance[0, 0] == pytest.approx(0.04 + np.log1p(0.05**2), rel=0.03)


def test_local_strength_given_its_cores(rows):
    found = CORES.local(rows, 1, "S1", "deck", VALUES)[0]
    values = _at(1)
    here = rows.place == rows.place_of("S1")
    shift = sum(
        values.get(f"cores.{name}_correction", 0.0) * rows.extra["loading"][here, k]
        for k, name in enumerate(CORRECTIONS)
    )
    prior, precision = 1.0 / 0.2**2, rows.extra["precision"][here]
    total = prior + precision.sum()
    mean = (prior * np.log(38.0) + precision @ (rows.value[here] - shift)) / total
    assert found.mean[1] == pytest.approx(mean)
    assert found.sd[1] == pytest.approx(total**-0.5)
    elsewhere = CORES.local(rows, 1, "S2", "deck", VALUES)[0]
    np.testing.assert_allclose(elsewhere.mean, np.log(VALUES["deck.concrete_mean"]))
    before = CORES.local(rows, 0, "S1", "deck", VALUES)[0]
    np.testing.assert_allclose(before.sd, VALUES["deck.concrete_scatter"])


def test_uncorrected_cores_have_no_correction_errors(make_case):
    entry = {"table": "cores.csv", "zone": "deck", "correction": "none"}
    case = cases.base(surveys=[{"date": "2020-01-01", "cores": entry}])
    read = make_case(case, {"cores.csv": cases.CORES_TABLE})
    assert CORES.variables(read) == ()
    np.testing.assert_allclose(CORES.rows(read).value[0], np.log(31.6))
