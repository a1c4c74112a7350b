import numpy as np
import pytest

from assess.updating.kinds import KINDS
from assess.updating.model import WHITENED, build_model


@pytest.fixture(scope="module")
def model(example_spec):
    return build_model(example_spec, 2)


def test_one_free_variable_and_no_deterministic(model, example_spec):
    assert [v.name for v in model.free_RVs] == [WHITENED]
    assert model.deterministics == []
    assert tuple(model.coords["variable"]) == example_spec.prior.names
    assert {p.name for p in model.potentials} == {"cores", "cover", "section_loss"}


def test_density_and_gradient_are_finite_at_the_start(model):
    start = model.initial_point()
    assert np.isfinite(model.compile_logp(mode="FAST_COMPILE")(start))
    slope = model.compile_dlogp(mode="FAST_COMPILE")(start)
    assert np.isfinite(slope).all()
    assert np.abs(slope).max() > 0.0


@pytest.mark.parametrize("stage", [0, 1, 2])
def test_density_is_prior_and_likelihood_by_numbers(model, example_spec, stage):
    # The graph of the last stage with other data, against plain NumPy from the draws' side.
    whitened = np.random.default_rng(6).normal(0.0, 0.5, len(example_spec.prior.names))
    data = example_spec.data(stage)
    with model:
        import pymc as pm

        pm.set_data(data)
    found = float(model.compile_logp(mode="FAST_COMPILE")({WHITENED: whitened}))
    values = dict(zip(example_spec.prior.names, example_spec.prior.physical(whitened), strict=True))
    likelihood = sum(
        KINDS[key].log_likelihood(rows, values, data) for key, rows in example_spec.rows.items()
    )
    prior = -0.5 * (whitened @ whitened + len(whitened) * np.log(2.0 * np.pi))
    assert found == pytest.approx(prior + likelihood, rel=1e-9)
    assert (likelihood == 0.0) == (stage == 0)


def test_kinds_without_measurements_are_left_out(make_case):
    from assess.updating.model import specify
    from tests.verification import cases

    spec = specify(make_case(cases.base()))
    assert dict(spec.rows) == {}
    assert spec.data(0) == {}
    assert build_model(spec, 0).potentials == []
