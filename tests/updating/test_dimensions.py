"""Dimensions as built: conditional deviations in closed form, zone-wide learning, faults."""

import numpy as np
import pytest
from scipy import stats

from assess.pipeline import check_case
from assess.reliability.limit_state import Action
from assess.reliability.problem import (
    build_problem,
    common_names,
    dimensions,
    section_state,
    without_dependence,
)
from assess.updating.dimensions import Dimensions
from assess.updating.model import specify
from assess.updating.prior import joint_prior
from tests.updating import graphs
from tests.verification import cases

KIND = Dimensions()
FIRST = """section,location,dimension,measured [mm],nominal [mm]
S1,,depth,1008,
S1,,depth,1003,1000
S1,,width,322,
S1,,flange thickness,171,180
,A,depth,905,900
,A,depth,909,900
,B,depth,898,900
,,depth,493,500
"""
SECOND = """section,location,dimension,measured [mm],nominal [mm]
S1,,depth,1010,
,B,depth,901,900
S2,,width,316,
"""
ZONE = {
    "depth_deviation": {"distribution": "normal", "mean": "-2 mm", "sd": "6 mm", "source": "test"},
    "depth_scatter": {"distribution": "lognormal", "mean": "6 mm", "V": 0.3, "source": "test"},
}
VALUES = {
    "deck.depth_deviation": np.array([2.0, -4.0]),
    "deck.depth_scatter": np.array([5.0, 9.0]),
}
# JCSS part 3.10: mean 0.003 X up to 3 mm, standard deviation 4 + 0.006 X up to 10 mm.
WIDTH, FLANGE, DEPTH = (0.96, 5.92), (0.54, 5.08), (3.0, 10.0)
ERRORS = (3.0, 2.0)


def raw(first=FIRST, second=SECOND, *, zone=True):
    surveys = [
        {"date": "2010-01-01", "dimensions": {"table": "a.csv", "zone": "deck"}},
        {"date": "2020-01-01", "dimensions": {"table": "b.csv", "zone": "deck", "error": "2 mm"}},
    ]
    case = cases.base(surveys=surveys)
    if zone:
        case["zones"]["deck"]["dimensions"] = ZONE
    return case, {"a.csv": first, "b.csv": second}


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(*raw())


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


# By hand: (survey, dimension, place, deviation, population or None for the zone's depths).
READINGS = [
    (0, "depth", "S1", 8.0, None), (0, "depth", "S1", 3.0, None),
    (0, "width", "S1", 2.0, WIDTH), (0, "flange", "S1", -9.0, FLANGE),
    (0, "depth", "A", 5.0, None), (0, "depth", "A", 9.0, None),
    (0, "depth", "B", -2.0, None), (0, "depth", "c", -7.0, None),
    (1, "depth", "S1", 10.0, None), (1, "depth", "B", 1.0, None),
    (1, "width", "S2", -4.0, WIDTH),
]  # fmt: skip


def joint(draw, stage=2):
    """Mean, covariance and values of all readings."""
    mine = [r for r in READINGS if r[0] < stage]
    zone = tuple(VALUES[f"deck.depth_{name}"][draw] for name in ("deviation", "scatter"))
    population = [r[4] or zone for r in mine]
    same = np.array([[a[1:3] == b[1:3] for b in mine] for a in mine])
    covariance = same * np.array([p[1] for p in population])[:, None] ** 2
    error = np.array([ERRORS[r[0]] for r in mine])
    mean = np.array([p[0] for p in population])
    return mean, covariance + np.diag(error**2), np.array([r[3] for r in mine]), error, mine


@pytest.mark.parametrize("stage", [1, 2])
def test_likelihood_is_the_joint_normal_density(rows, stage):
    found = KIND.log_likelihood(rows, VALUES, KIND.data(rows, stage))
    for draw in range(2):
        mean, covariance, value, error, _ = joint(draw, stage)
        density = stats.multivariate_normal(mean, covariance).logpdf(value)
        density += np.sum(np.log(error) + 0.5 * np.log(2.0 * np.pi))
        assert found[draw] == pytest.approx(density, rel=1e-9)


def test_later_surveys_are_switched_off(rows):
    assert np.all(KIND.log_likelihood(rows, VALUES, KIND.data(rows, 0)) == 0.0)


def test_the_sampler_sees_the_same_likelihood_with_a_gradient(case, rows):
    graphs.check(KIND, rows, joint_prior(case), 2)


def test_data_sets_are_of_one_dimension(rows):
    assert rows.zones[rows.zone[0]] == "deck"
    assert {rows.zones[k] for k in rows.zone} == {"deck", "deck, width", "deck, flange thickness"}


def test_neither_order_nor_a_split_table_nor_the_unit_changes_anything(make_case, rows):
    head, *lines = FIRST.splitlines(keepends=True)
    case, tables = raw(first=head + "".join(reversed(lines)))
    turned = KIND.rows(make_case(case, tables))
    entry = case["surveys"][0]["dimensions"]
    case["surveys"][0]["dimensions"] = [entry, {**entry, "table": "c.csv"}]
    parts = {"a.csv": head + "".join(lines[:5]), "c.csv": head + "".join(lines[5:])}
    split = KIND.rows(make_case(case, parts | {"b.csv": SECOND}))
    inches = "section,location,dimension,measured [in],nominal [mm]\n" + "".join(
        ",".join([*cells[:3], f"{float(cells[3]) / 25.4:.10f}", cells[4]])
        for cells in (line.split(",") for line in lines)
    )
    other = KIND.rows(make_case(*raw(first=inches)))
    first = KIND.log_likelihood(rows, VALUES, KIND.data(rows, 2))
    for again in (turned, split, other):
        found = KIND.log_likelihood(again, VALUES, KIND.data(again, 2))
        assert found == pytest.approx(first, rel=1e-8)


def test_places_read_alike_are_one_group(make_case):
    many = "dimension,measured [mm],nominal [mm]\n" + "".join(
        f"depth,{900 + 0.001 * i},900\n" for i in range(3000)
    )
    few = "dimension,measured [mm],nominal [mm]\ndepth,901,900\ndepth,902,900\n"
    data = [KIND.data(KIND.rows(make_case(*raw(first=one))), 2) for one in (many, few)]
    assert all(data[0][name].shape == data[1][name].shape for name in data[0])


def test_simulation_has_the_moments_of_the_model(rows):
    values = {name: np.full(60_000, array[1]) for name, array in VALUES.items()}
    drawn = KIND.simulate(rows, values, np.random.default_rng(3))
    mean, covariance, *_ = joint(1)
    sd = np.sqrt(np.diag(covariance))
    np.testing.assert_allclose(drawn.mean(axis=0), mean, atol=0.025 * sd.max())
    np.testing.assert_allclose(
        np.cov(drawn.T) / np.outer(sd, sd), covariance / np.outer(sd, sd), atol=0.03
    )


def locals_of(kind_rows, stage, section):
    found = KIND.local(kind_rows, stage, section, "deck", VALUES)
    return {model.names[0]: model for model in found}


@pytest.mark.parametrize("stage", [1, 2])
@pytest.mark.parametrize(
    ("name", "dimension"),
    [("depth", "depth"), ("width", "width"), ("flange thickness", "flange")],
)
def test_a_measured_section_has_the_conditional_deviation(rows, stage, name, dimension):
    local = locals_of(rows, stage, "S1")[f"{name} deviation"]
    for draw in range(2):
        mean, covariance, value, error, mine = joint(draw, stage)
        own = np.array([r[1:3] == (dimension, "S1") for r in mine])
        prior_sd2 = (covariance[own][:, own] - np.diag(error[own] ** 2))[0, 0]
        cross = np.where(own, prior_sd2, 0.0)
        gain = np.linalg.solve(covariance, cross)
        prior = mean[own][0]
        assert local.mean[draw] == pytest.approx(prior + gain @ (value - mean), rel=1e-9)
        assert local.sd[draw] == pytest.approx(np.sqrt(prior_sd2 - gain @ cross), rel=1e-8)


def test_other_sections_follow_what_their_zone_states(rows):
    before, after = locals_of(rows, 1, "S2"), locals_of(rows, 2, "S2")
    assert set(before) == {"depth deviation"}  # its width is measured later
    assert set(after) == {"depth deviation", "width deviation"}
    np.testing.assert_array_equal(before["depth deviation"].mean, VALUES["deck.depth_deviation"])
    np.testing.assert_array_equal(before["depth deviation"].sd, VALUES["deck.depth_scatter"])
    assert set(locals_of(None, 0, "S2")) == {"depth deviation"}


def sections_only(table):
    return "\n".join(line for line in table.splitlines() if not line.startswith(",")) + "\n"


@pytest.fixture(scope="module")
def plain(make_case):
    """A zone that states nothing of dimensions: each section by itself."""
    return make_case(*raw(sections_only(FIRST), sections_only(SECOND), zone=False))


def test_without_a_zone_variable_the_published_deviation_is_conditioned(plain):
    rows = KIND.rows(plain)
    values = {"deck.concrete_mean": np.ones(3)}
    assert KIND.local(rows, 0, "S1", "deck", values) == ()
    assert KIND.local(None, 0, "S1", "deck", values) == ()
    found = {m.names[0]: m for m in KIND.local(rows, 2, "S1", "deck", values)}
    weight = np.array([1 / 9, 1 / 9, 1 / 4])
    total = DEPTH[1] ** -2 + weight.sum()
    expected = (DEPTH[0] / DEPTH[1] ** 2 + weight @ [8.0, 3.0, 10.0]) / total
    np.testing.assert_allclose(found["depth deviation"].mean, expected, rtol=1e-12)
    np.testing.assert_allclose(found["depth deviation"].sd, total**-0.5, rtol=1e-12)


def test_a_stated_depth_sd_is_conditioned_in_place_of_the_published_one(make_case):
    case, tables = raw(sections_only(FIRST), sections_only(SECOND), zone=False)
    case["members"][0]["depth_sd"] = "4 mm"
    rows = KIND.rows(make_case(case, tables))
    found = {m.names[0]: m for m in KIND.local(rows, 1, "S1", "deck", {"x": np.ones(1)})}
    total = 4.0**-2 + 2.0 / 9.0
    np.testing.assert_allclose(found["depth deviation"].mean, (8.0 + 3.0) / 9.0 / total)


def test_the_likelihood_tells_no_common_variable_where_sections_are_by_themselves(plain):
    graphs.check(KIND, KIND.rows(plain), joint_prior(plain), 2)
    rows = KIND.rows(plain)
    values = {name: np.array(1.0) for name in joint_prior(plain).names}
    first = KIND.log_likelihood(rows, values, KIND.data(rows, 2))
    values["deck.concrete_mean"] = np.array(2.0)
    assert KIND.log_likelihood(rows, values, KIND.data(rows, 2)) == first


def draws_of(case, count=4000):
    prior = joint_prior(case)
    z = np.random.default_rng(5).standard_normal((count, len(prior.names)))
    return dict(zip(prior.names, prior.physical(z).T, strict=True))


def slope(case, state, name):
    """Change of the log-hazard with one more standard deviation of a normal."""
    names = list(dimensions(state))
    problem = build_problem(case, state, Action())
    z = np.zeros((3, 1, len(names)))
    low = problem.log_hazard(z, np.arange(3), np.array([0]))
    z[..., names.index(name)] = 1.0
    return problem.log_hazard(z, np.arange(3), np.array([0])) - low


def test_bending_takes_the_measured_deviations(plain):
    values, entries = draws_of(plain), plain.spec.sections()
    spec = specify(plain)
    measured, other = (section_state(plain, spec, entries[s], 1, values) for s in ("S1", "S2"))
    assert measured.measured == {"dimensions"}
    extra = set(dimensions(measured)) - set(dimensions(other))
    assert extra == {"width deviation", "flange thickness deviation"}
    assert dimensions(measured)["depth deviation"] == "cover and depth"
    # A deeper section carries more; two readings leave less of its depth open than JCSS does.
    tight, loose = slope(plain, measured, "depth deviation"), slope(plain, other, "depth deviation")
    assert np.all((loose < tight) & (tight < 0.0))
    assert np.all(slope(plain, measured, "flange thickness deviation") <= 0.0)
    # The stress block lies in the flange: the web's width does not count.
    np.testing.assert_allclose(slope(plain, measured, "width deviation"), 0.0, atol=1e-12)


def test_before_any_reading_a_section_is_as_if_there_were_none(plain, make_case):
    bare = make_case(cases.base())
    values = draws_of(bare)
    one, two = (
        section_state(c, specify(c), c.spec.sections()["S1"], 0, values) for c in (plain, bare)
    )
    assert dimensions(one) == dimensions(two)
    for name in ("depth deviation", "yield strength"):
        np.testing.assert_array_equal(slope(plain, one, name), slope(bare, two, name))


def test_a_zone_s_deviation_is_a_common_variable_of_its_sections(case):
    entry = case.spec.sections()["S2"]
    names = common_names(case.spec, entry)
    assert {"deck.depth_deviation", "deck.depth_scatter"} <= set(names)
    assert "deck.width_deviation" not in names
    state = section_state(case, specify(case), entry, 1, draws_of(case))
    torn = without_dependence(state, 3)
    assert dimensions(torn) == dimensions(state)
    (kept,) = (m for m in torn.locals if m.names == ("depth deviation",))
    np.testing.assert_array_equal(kept.mean, torn.common["deck.depth_deviation"])


def test_a_rectangle_wider_than_its_flange_is_no_error(make_case):
    table = "section,dimension,measured [mm]\nS1,width,345\n"
    case, tables = raw(table, sections_only(SECOND), zone=False)
    case["members"][0]["flange"]["width"] = "330 mm"
    made = make_case(case, tables)
    state = section_state(made, specify(made), made.spec.sections()["S1"], 1, draws_of(made))
    assert np.all(np.isfinite(slope(made, state, "width deviation")))


def _with_sd(case):
    case["members"][0]["depth_sd"] = "0 mm"
    del case["zones"]["deck"]["dimensions"]


def _with_both(case):
    case["members"][0]["depth_sd"] = "5 mm"


def _rectangle(case):
    del case["members"][0]["flange"]


def _no_zone(case):
    del case["zones"]["deck"]["dimensions"]


def _nothing(_case):
    pass


HEAD = "section,dimension,measured [mm],nominal [mm]\n"


@pytest.mark.parametrize(
    ("change", "table", "words"),
    [
        (
            _nothing,
            HEAD + ",depth,905,\n",
            "a.csv:2: the row names no section and no nominal depth",
        ),
        (_no_zone, HEAD + ",depth,905,900\n", "a.csv:2: zone 'deck' does not state how its depth"),
        (_nothing, HEAD + ",width,305,300\n", "a.csv:2: zone 'deck' does not state how its width"),
        (_rectangle, HEAD + "S1,flange thickness,180,\n", "section 'S1' has no flange thickness"),
        (_nothing, HEAD + "S1,depth,1000,900\n", "the nominal depth is not that of section 'S1'"),
        (_with_sd, HEAD + "S1,depth,1000,\n", "the depth of section 'S1' is stated as exactly kno"),
        (
            _with_both,
            HEAD + "S1,depth,1000,\n",
            "depth_sd: the zone states how depths deviate, and",
        ),
        (_nothing, HEAD + "S1,depth,320,\n", "a.csv:2: the measured depth contradicts the nominal"),
        (_nothing, HEAD + ",depth,90,900\n", "a.csv:2: the measured depth contradicts the nominal"),
        (
            _nothing,
            HEAD + "S1,height,1000,\n",
            "column 'dimension': no such choice, given 'height'",
        ),
        (_nothing, HEAD + "S9,depth,1000,\n", "a.csv:2: there is no section of this name"),
        (_nothing, HEAD.replace("[mm]", "[MPa]") + "S1,depth,1,\n", "does not convert to mm"),
        (_nothing, HEAD + "S1,depth,-5,\n", "column 'measured': is out of range"),
        (_nothing, "section,measured [mm]\nS1,1000\n", "column 'dimension' is missing"),
        (_nothing, HEAD, "no rows"),
    ],
)
def test_faults_are_said_with_their_place(tmp_path, change, table, words):
    case, tables = raw(table)
    case["surveys"] = case["surveys"][:1]
    change(case)
    path = cases.write_case(tmp_path, case, tables)
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault for fault in faults), faults


def test_a_hint_where_only_half_of_a_dimension_is_stated(tmp_path):
    case, tables = raw()
    case["zones"]["deck"]["dimensions"] = {"depth_scatter": ZONE["depth_scatter"]}
    (fault,) = check_case(cases.write_case(tmp_path, case, tables)).faults
    assert "the depth has depth_scatter without depth_deviation, state both" in str(fault)
