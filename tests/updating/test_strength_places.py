"""Cores and indirect tests of the same places: the kinds' densities make up the joint one."""

from dataclasses import replace

import numpy as np
import pytest
from scipy import integrate, stats

from assess.reliability.problem import section_state, without_dependence
from assess.reliability.teaching import lost_log_likelihood
from assess.updating.kinds import KINDS
from assess.updating.model import specify
from assess.updating.strength_places import data, find_units, given, lay_out, log_likelihood
from tests.updating import strength_case as deck

ALL = ("cores", "rebound", "pulse_velocity")


@pytest.fixture(scope="module")
def spec(make_case):
    return specify(make_case(deck.case(), deck.TABLES))


def _total(spec, stage, kinds=ALL, values=deck.VALUES):
    return sum(
        KINDS[key].log_likelihood(spec.rows[key], values, KINDS[key].data(spec.rows[key], stage))
        for key in kinds
    )


@pytest.mark.parametrize("stage", [1, 2])
@pytest.mark.parametrize(
    "kinds", [ALL, ("cores", "rebound"), ("cores", "pulse_velocity"), ("rebound", "pulse_velocity")]
)
def test_the_kinds_add_up_to_the_joint_normal_density(make_case, kinds, stage):
    some = specify(make_case(deck.case(kinds), deck.TABLES))
    chosen = [r for r in deck.readings() if r.kind in kinds and r.stage <= stage]
    reference = []
    for draw in range(3):
        mean, covariance, value, _ = deck.joint(chosen, deck.at(draw))
        reference.append(stats.multivariate_normal(mean, covariance).logpdf(value))
    ours = _total(some, stage, kinds)
    # Terms of the errors alone are left out, and cancel between draws.
    np.testing.assert_allclose(ours - ours[0], np.array(reference) - reference[0], rtol=1e-9)


@pytest.mark.parametrize(
    ("key", "before"), [("rebound", ("cores",)), ("pulse_velocity", ("cores", "rebound"))]
)
def test_a_kind_alone_is_the_density_of_its_readings_given_those_before(spec, key, before):
    kinds = (*before, key)
    known = [r for r in deck.readings() if r.kind in before]
    both = [r for r in deck.readings() if r.kind in kinds]
    reference = []
    for draw in range(3):
        pair = []
        for chosen in (both, known):
            mean, covariance, value, _ = deck.joint(chosen, deck.at(draw))
            pair.append(stats.multivariate_normal(mean, covariance).logpdf(value))
        reference.append(pair[0] - pair[1])
    ours = _total(spec, 2, (key,))
    np.testing.assert_allclose(ours - ours[0], np.array(reference) - reference[0], rtol=1e-9)


@pytest.mark.parametrize("left_out", ["cores", "rebound", "pulse_velocity"])
def test_leaving_a_kind_out_leaves_the_density_of_the_others(spec, left_out):
    kinds = ("cores", "rebound", "pulse_velocity")
    ours = _total(spec, 2, kinds) - lost_log_likelihood(spec, left_out, deck.VALUES, 2)
    reference = []
    for draw in range(3):
        kept = [r for r in deck.readings() if r.kind in kinds and r.kind != left_out]
        mean, covariance, value, _ = deck.joint(kept, deck.at(draw))
        reference.append(stats.multivariate_normal(mean, covariance).logpdf(value))
    np.testing.assert_allclose(ours - ours[0], np.array(reference) - reference[0], rtol=1e-9)


def test_a_kind_that_tells_no_variable_anything_loses_the_same_for_all_draws(make_case):
    table = "section,diameter [mm]\nS1,31.8\n"
    bars = {"table": "bars.csv"}
    raw = deck.case(("cores",))
    raw["surveys"][0]["bars_found"] = bars
    some = specify(make_case(raw, deck.TABLES | {"bars.csv": table}))
    lost = lost_log_likelihood(some, "bars_found", deck.VALUES, 2)
    assert lost.shape == (3,)
    assert np.ptp(lost) == 0.0


def test_readings_alone_at_their_places_enter_in_groups(spec):
    layout = lay_out(spec.rows["rebound"])
    # Single rows of 9, 9 (left out), 12 readings, and of the other hammer; Z is alone, too.
    assert sorted(np.bincount(layout.group).tolist()) == [1, 1, 3]
    names = {spec.rows["rebound"].places[place] for place in layout.shared}
    assert names == {"deck: K1", "deck: K2", "deck: K3", "deck: L1", "deck: X", "section S1"}


def test_cost_does_not_grow_with_single_readings(make_case):
    many = "location,rebound number\n" + ",38\n,41\n,44\n" * 2000
    case = deck.case(("rebound",))
    found = specify(make_case(case, deck.TABLES | {"rebound.csv": many})).rows["rebound"]
    sizes = {name: array.size for name, array in KINDS["rebound"].data(found, 2).items()}
    assert max(sizes.values()) < 10


def test_the_order_of_readings_does_not_matter(spec):
    rng = np.random.default_rng(3)
    for key in ("rebound", "pulse_velocity"):
        rows = spec.rows[key]
        order = rng.permutation(len(rows.value))
        mixed = replace(
            rows,
            value=rows.value[order],
            stage=rows.stage[order],
            zone=rows.zone[order],
            place=rows.place[order],
            extra={name: array[order] for name, array in rows.extra.items()},
        )
        for stage in (1, 2):
            np.testing.assert_allclose(
                KINDS[key].log_likelihood(mixed, deck.VALUES, KINDS[key].data(mixed, stage)),
                KINDS[key].log_likelihood(rows, deck.VALUES, KINDS[key].data(rows, stage)),
                rtol=1e-10,
            )


def _quadrature(cores, freedom, indirect, draw):
    """Log of the ratio of densities with and without indirect readings at one place."""
    values = deck.at(draw)
    mu, sigma = np.log(values["deck.concrete_mean"]), values["deck.concrete_scatter"]

    def density(u, some):
        product = stats.norm.pdf(u, mu, sigma)
        for one in cores:
            product *= stats.t.pdf((one.value - u) / one.error**0.5, freedom) / one.error**0.5
        for one in some:
            name = f"{one.kind}.{one.device}"
            centre = np.log(values[f"{name}.level"]) + values[f"{name}.slope"] * (u - np.log(30.0))
            sd = np.sqrt(values[f"{name}.scatter"] ** 2 + one.error)
            product *= stats.norm.pdf(one.value, centre, sd)
        return product

    points = sorted({mu, *(one.value for one in cores)})
    after, before = (
        integrate.quad(density, mu - 12 * sigma, mu + 12 * sigma, (some,), points=points, limit=400)
        for some in (indirect, [])
    )
    return np.log(after[0] / before[0])


def test_cores_with_student_errors_are_conditioned_on_by_quadrature(spec):
    rows, cores = spec.rows["rebound"], spec.rows["cores"]
    freedom = np.full(len(cores.value), 3.0)
    heavy = replace(cores, extra={**cores.extra, "freedom": freedom})
    ours = log_likelihood(
        "rebound",
        given(rows, {"cores": heavy}),
        deck.VALUES,
        data("rebound", given(rows, {"cores": heavy}), 1),
    )
    first = [r for r in deck.readings() if r.stage == 1]
    reference = np.zeros(3)
    for place in {r.place for r in first if r.kind == "rebound"}:
        here = [r for r in first if r.place == place]
        mine = [r for r in here if r.kind == "rebound"]
        # Rows of one unit share its departure: their mean is one reading.
        weight = np.array([1.0 / r.error for r in mine])
        mean = weight @ [r.value for r in mine] / weight.sum()
        unit = mine[0]._replace(value=mean, error=1.0 / weight.sum())
        known = [r for r in here if r.kind == "cores"]
        reference += [_quadrature(known, 3.0, [unit], draw) for draw in range(3)]
    np.testing.assert_allclose(ours - ours[0], reference - reference[0], rtol=1e-5, atol=1e-6)


def test_simulation_beside_cores_with_student_errors_follows_their_density(spec):
    rows, cores = spec.rows["rebound"], spec.rows["cores"]
    heavy = replace(cores, extra={**cores.extra, "freedom": np.full(len(cores.value), 3.0)})
    values = {name: np.full(40_000, value[0]) for name, value in deck.VALUES.items()}
    drawn = KINDS["rebound"].simulate(
        given(rows, {"cores": heavy}), values, np.random.default_rng(5)
    )
    place = rows.places.index("deck: K2")
    row = int(np.flatnonzero(rows.place == place)[0])
    known = [r for r in deck.readings() if r.place == "K2" and r.kind == "cores"]
    one = deck.at(0)
    grid = np.linspace(2.5, 4.5, 20_001)
    weight = stats.norm.pdf(grid, np.log(one["deck.concrete_mean"]), one["deck.concrete_scatter"])
    for core in known:
        weight = weight * stats.t.pdf((core.value - grid) / core.error**0.5, 3.0)
    weight /= weight.sum()
    centre = weight @ grid
    spread = weight @ (grid - centre) ** 2
    slope = one["rebound.N.slope"]
    expected = np.log(one["rebound.N.level"]) + slope * (centre - np.log(30.0))
    variance = slope**2 * spread + one["rebound.N.scatter"] ** 2 + rows.extra["error"][row]
    assert drawn[:, row].mean() == pytest.approx(expected, abs=4.5 * (variance / 4e4) ** 0.5)
    assert drawn[:, row].var() == pytest.approx(variance, rel=0.03)


def _conditional(section, stage, draw):
    """Mean and standard deviation of ln strength at a section, from the joint normal."""
    here = [r for r in deck.readings() if r.place == section and r.stage <= stage]
    mean, covariance, value, with_strength = deck.joint(here, deck.at(draw))
    gain = np.linalg.solve(covariance, with_strength)
    mu, sigma = deck.at(draw)["deck.concrete_mean"], deck.at(draw)["deck.concrete_scatter"]
    return np.log(mu) + gain @ (value - mean), np.sqrt(sigma**2 - gain @ with_strength)


@pytest.mark.parametrize(("section", "last"), [("S1", "cores"), ("S2", "cores")])
def test_a_sections_strength_is_the_conditional_normal_of_all_its_tests(make_case, section, last):
    case = make_case(deck.case(), deck.TABLES)
    spec = specify(case)
    steel = {"steel.main": np.full(3, 460.0)}
    cover = {"deck.cover_mean": np.full(3, 40.0), "deck.cover_scatter": np.full(3, 8.0)}
    entry = case.spec.sections()[section]
    state = section_state(case, spec, entry, 1, deck.VALUES | steel | cover)
    strength = [
        (model, key)
        for model, key in zip(state.locals, state.kinds, strict=True)
        if "strength" in model.names
    ]
    assert [key for _, key in strength] == [last]
    model = strength[0][0]
    for draw in range(3):
        mean, sd = _conditional(section, 1, draw)
        assert model.mean[draw] == pytest.approx(mean, rel=1e-10)
        assert model.sd[draw] == pytest.approx(sd, rel=1e-10)
    apart = without_dependence(state, 1)
    names = [name for one in apart.locals for name in one.names]
    assert names.count("strength") == 1


def test_a_section_not_tested_yet_is_that_of_its_cores_or_its_zone(make_case):
    case = make_case(deck.case(), deck.TABLES)
    spec = specify(case)
    for key in ("rebound", "pulse_velocity"):
        assert KINDS[key].local(spec.rows[key], 0, "S1", "deck", deck.VALUES) == ()
        assert KINDS[key].local(None, 0, "S1", "deck", deck.VALUES) == ()
    assert KINDS["rebound"].local(spec.rows["rebound"], 2, "S2", "deck", deck.VALUES) == ()


def test_other_readings_of_earlier_kinds_can_be_put_in(spec):
    rows, cores = spec.rows["rebound"], spec.rows["cores"]
    weaker = replace(cores, value=cores.value - 0.3)
    changed = given(rows, {"cores": weaker})
    before, after = (
        KINDS["rebound"].log_likelihood(one, deck.VALUES, KINDS["rebound"].data(one, 2))
        for one in (rows, changed)
    )
    assert np.all(np.abs(after - before) > 0.1)
    assert given(cores, {"cores": weaker}) is cores


def test_readings_of_one_device_at_one_place_make_one_unit(spec):
    units = find_units(spec.rows["rebound"])
    place = spec.rows["rebound"].places.index("deck: X")
    assert np.sum(units.place == place) == 2  # hammers N and M
    assert len(units.of_row) == 15


def test_the_errors_of_core_corrections_are_the_cores_own(make_case):
    raw = deck.case(("cores", "rebound"))
    for survey in raw["surveys"]:
        survey["cores"]["correction"] = "ACI 214.4R"
    tables = deck.TABLES | {
        "cores.csv": deck.CORES.replace(",100,200,as received", ",75,90,air dried")
    }
    some = specify(make_case(raw, tables))
    rows, cores = some.rows["rebound"], some.rows["cores"]
    errors = {"length": 1.3, "diameter": -0.7, "moisture": 0.9, "damage": 2.0, "bar": -0.4}
    values = deck.VALUES | {
        f"cores.{name}_correction": np.full(3, error) for name, error in errors.items()
    }
    shift = cores.extra["loading"] @ np.array(list(errors.values()))
    assert np.ptp(shift) > 0.0
    plain = given(rows, {"cores": replace(cores, value=cores.value - shift)})
    kind = KINDS["rebound"]
    np.testing.assert_allclose(
        kind.log_likelihood(rows, values, kind.data(rows, 2)),
        kind.log_likelihood(plain, deck.VALUES, kind.data(plain, 2)),
        rtol=1e-10,
    )
