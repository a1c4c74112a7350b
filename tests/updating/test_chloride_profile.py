"""Chloride profiles: likelihood against SciPy quadrature, local values, simulation, faults."""

from datetime import date

import numpy as np
import pytest
from scipy import integrate, special, stats

from assess.pipeline import check_case
from assess.updating import bounds
from assess.updating.chloride_profile import ChlorideProfile
from assess.updating.prior import joint_prior
from tests.updating import graphs
from tests.verification import cases

KIND = ChlorideProfile()
CHLORIDE = {
    "surface_chloride": {
        "distribution": "lognormal", "mean": "2.5 %", "V": 0.4, "source": "test",
    },
    "surface_chloride_scatter": {
        "distribution": "lognormal", "mean": 0.35, "V": 0.4, "source": "test",
    },
    "diffusion": {
        "distribution": "lognormal", "mean": "150 mm^2/yr", "V": 0.6, "source": "test",
    },
    "diffusion_scatter": {
        "distribution": "lognormal", "mean": 0.4, "V": 0.4, "source": "test",
    },
    "age_exponent": {
        "distribution": "beta", "mean": 0.3, "sd": 0.12, "lower": 0, "upper": 1, "source": "test",
    },
    "reference_age": "0.0767 yr",
    "convection_depth": "8 mm",
    "initial_chloride": "0.05 %",
}  # fmt: skip
FIRST = """location;from [mm];to [mm];chloride [%]
W1;0;8;1,2
W1;8;18;1,7
W1;18;28;0,75
W1;28;40;0,30
W1;40;55;<0,10
W2;8;18;2,1
W2;18;28;1,5
W2;28;40;0,8
"""
SECOND = """location,section,from [cm],to [cm],chloride [%]
W1,,0.8,1.8,0.24
W1,,1.8,2.8,0.115
W1,,2.8,4,0.05
,S1,0.8,2.0,0.31
,S1,3,5,<0.02
"""
BINDER, DENSITY = 320.0, 2350.0
VALUES = {
    "deck.surface_chloride": np.array([0.02, 0.03]),
    "deck.surface_chloride_scatter": np.array([0.3, 0.5]),
    "deck.diffusion": np.array([120.0, 200.0]),
    "deck.diffusion_scatter": np.array([0.4, 0.25]),
    "deck.age_exponent": np.array([0.3, 0.45]),
    "chloride_profile.deck.binder_content": np.array([1.1, 0.95]),
}
AGES = {  # [yr] of 365.25 days
    stage: (date(year, 1, 1) - date(1971, 1, 1)).days / 365.25
    for stage, year in ((1, 2010), (2, 2020))
}
ERROR = {1: 0.1, 2: 0.15}
ABSOLUTE = {1: 0.02, 2: 0.005 * DENSITY / BINDER}  # percent of binder
PLACES = ("deck: W1", "deck: W2", "section S1")
SCORES = [f"chloride_profile.{p}.{q}" for p in PLACES for q in ("surface", "diffusion")]


def raw(first=FIRST, second=SECOND, entry=None, **more):
    surveys = [
        {"date": "2010-01-01", "chloride_profile": {
            "table": "a.csv", "zone": "deck", "basis": "binder", "error": 0.1,
            "absolute_error": "0.02 %"} | (entry or {})},
        {"date": "2020-01-01", "chloride_profile": {
            "table": "b.csv", "zone": "deck", "basis": "concrete", "error": 0.15,
            "binder_content": "320 kg/m^3", "density": "2.35 t/m^3",
            "absolute_error": "0.005 %", "detection_limit": "0.01 %"}},
    ]  # fmt: skip
    case = cases.base(surveys=surveys)
    case["zones"]["deck"]["chloride"] = CHLORIDE
    return case | more, {"a.csv": first, "b.csv": second}


@pytest.fixture(scope="module")
def case(make_case):
    return make_case(*raw())


@pytest.fixture(scope="module")
def rows(case):
    return KIND.rows(case)


def draw(number, scores=0.0):
    """One draw, with all scores the same or given in the order of `SCORES`."""
    scores = np.broadcast_to(scores, len(SCORES))
    common = {name: value[number] for name, value in VALUES.items()}
    return common | dict(zip(SCORES, scores, strict=True))


def expected_content(start, end, age, surface, diffusion, exponent):
    """Mean over an increment of the published profile, in percent, by quadrature."""
    length = 2.0 * np.sqrt(diffusion * (0.0767 / age) ** exponent * age)
    mean = integrate.quad(lambda x: special.erfc((x - 8.0) / length), start, end, epsrel=1e-12)[0]
    return 0.05 + (surface - 0.05) * mean / (end - start)


def log_density(rows, place, stage, values, surface, diffusion):
    """Log-density of the measurements at a place, given its local values; row by row."""
    total = 0.0
    for row in np.flatnonzero((rows.place == place) & (rows.stage <= stage)):
        survey = int(rows.stage[row])
        start, end = rows.extra["start"][row] + 8.0, rows.extra["end"][row] + 8.0
        content = expected_content(
            start, end, AGES[survey], surface, diffusion, values["deck.age_exponent"]
        )
        if survey == 2:
            content *= values["chloride_profile.deck.binder_content"]
        known = stats.norm(content, np.hypot(ERROR[survey] * content, ABSOLUTE[survey]))
        read = np.isfinite(rows.value[row])
        total += known.logpdf(rows.value[row]) if read else known.logcdf(rows.extra["limit"][row])
    return total


def test_rows_are_in_percent_of_binder_below_the_convection_depth(rows):
    # The first row lies above the convection depth and is left out.
    assert rows.places == PLACES
    to_binder = DENSITY / BINDER
    np.testing.assert_allclose(
        rows.value[[0, 4, 7, 9, 10]], [1.7, 2.1, 0.24 * to_binder, 0.05 * to_binder,
                                       0.31 * to_binder],
    )  # fmt: skip
    assert np.flatnonzero(bounds.is_below(rows.value)).tolist() == [3, 11]
    np.testing.assert_allclose(rows.extra["start"], [0, 10, 20, 32, 0, 10, 20, 0, 10, 20, 0, 22])
    np.testing.assert_allclose(rows.extra["end"][[0, 7, 11]], [10, 10, 42])
    np.testing.assert_allclose(rows.extra["limit"][[0, 3, 7, 11]],
                               [0.1, 0.1, 0.01 * to_binder, 0.02 * to_binder])  # fmt: skip
    np.testing.assert_allclose(rows.extra["absolute"][[0, 7]], list(ABSOLUTE.values()))
    np.testing.assert_allclose(rows.extra["initial"], 0.05)


def test_a_content_read_below_the_stated_limit_is_a_bound(make_case):
    table = HEAD + "W1,10,20,0.03\nW1,20,30,0.05\nW1,30,40,<0.02\n"
    rows = KIND.rows(make_case(*raw(table, entry={"detection_limit": "0.04 %"})))
    assert np.flatnonzero(bounds.is_below(rows.value)).tolist()[:2] == [0, 2]
    np.testing.assert_allclose(rows.extra["limit"][:3], [0.04, 0.04, 0.02])


def test_variables_are_two_scores_for_each_place_and_the_binder_content(case):
    names = [variable.name for variable in KIND.variables(case)]
    assert names == [*SCORES, "chloride_profile.deck.binder_content"]
    prior = joint_prior(case)
    assert set(SCORES) <= set(prior.names)
    z = np.random.default_rng(1).standard_normal((5, len(prior.names)))
    at = [prior.names.index(name) for name in SCORES]
    np.testing.assert_allclose(prior.physical(z)[:, at], z[:, at])


@pytest.mark.parametrize("stage", [1, 2])
@pytest.mark.parametrize("number", [0, 1])
def test_scores_change_variables_exactly(rows, stage, number):
    # Likelihood of the local values times their density in the zone times |dx / d score| over the
    # density of the scores: the Jacobian by differences, the rest row by row.
    data = KIND.data(rows, stage)
    scores = np.random.default_rng(number).standard_normal(len(SCORES))

    def local(at):
        found = KIND.local_values(rows, draw(number, at), data)
        return np.stack([found.log_surface, found.log_diffusion], axis=-1)

    values = draw(number, scores)
    expected = 0.0
    for place, at in enumerate(local(scores)):
        steps = 1e-5 * np.eye(len(SCORES))[2 * place : 2 * place + 2]
        slopes = [(local(scores + step) - local(scores - step))[place] / 2e-5 for step in steps]
        zone = stats.norm(
            np.log([100.0 * values["deck.surface_chloride"], values["deck.diffusion"]]),
            [values["deck.surface_chloride_scatter"], values["deck.diffusion_scatter"]],
        )
        expected += zone.logpdf(at).sum() + np.log(abs(np.linalg.det(slopes)))
        expected -= stats.norm.logpdf(scores[2 * place : 2 * place + 2]).sum()
        expected += log_density(rows, place, stage, values, *np.exp(at))
    found = KIND.log_likelihood(rows, values, data)
    assert found == pytest.approx(expected, rel=1e-8)


@pytest.mark.parametrize("number", [0, 1])
def test_scores_integrate_to_the_likelihood_of_the_zone(rows, number):
    # Both integrals over two dimensions for each place: over the scores by Gauss-Hermite, over
    # the logarithms of the local values by the trapezoidal rule, independent of any summary.
    data = KIND.data(rows, 2)
    node, weight = np.polynomial.hermite_e.hermegauss(40)
    first, second = np.meshgrid(node, node, indexing="ij")
    both = np.outer(weight, weight).ravel() / (2.0 * np.pi)
    common = draw(number)
    rest = KIND.log_likelihood(rows, common, data)
    for place in range(len(PLACES)):
        values = {name: np.full(len(both), value) for name, value in common.items()}
        values[SCORES[2 * place]] = first.ravel()
        values[SCORES[2 * place + 1]] = second.ravel()
        ratio = both @ np.exp(KIND.log_likelihood(rows, values, data) - rest)
        found = np.log(ratio) + _at_zero(rows, place, common, data)
        assert found == pytest.approx(_marginal(rows, place, common), abs=1e-6)


def _at_zero(rows, place, values, data):
    """Log-likelihood of one place with scores zero."""
    known = KIND.local_values(rows, values, data)
    at = np.exp([known.log_surface[place], known.log_diffusion[place]])
    return known.log_weight[place] + log_density(rows, place, 2, values, *at)


def _marginal(rows, place, values):
    """Likelihood of one place with its two local values integrated out."""
    surface = np.log(100.0 * values["deck.surface_chloride"])
    diffusion = np.log(values["deck.diffusion"])
    z = np.linspace(-9.0, 9.0, 601)
    s = surface + values["deck.surface_chloride_scatter"] * z
    d = diffusion + values["deck.diffusion_scatter"] * z
    log_total = stats.norm.logpdf(z)[:, None] + stats.norm.logpdf(z)
    for row in np.flatnonzero(rows.place == place):
        survey = int(rows.stage[row])
        start, end = rows.extra["start"][row], rows.extra["end"][row]
        age, exponent = AGES[survey], values["deck.age_exponent"]
        length = 2.0 * np.sqrt(np.exp(d) * (0.0767 / age) ** exponent * age)
        x, w = np.polynomial.legendre.leggauss(20)
        depth = 0.5 * (start + end) + 0.5 * (end - start) * x
        mean = 0.5 * special.erfc(depth / length[:, None]) @ w
        content = 0.05 + (np.exp(s)[:, None] - 0.05) * mean
        if survey == 2:
            content = content * values["chloride_profile.deck.binder_content"]
        known = stats.norm(content, np.hypot(ERROR[survey] * content, ABSOLUTE[survey]))
        read = np.isfinite(rows.value[row])
        log_total += (
            known.logpdf(rows.value[row]) if read else known.logcdf(rows.extra["limit"][row])
        )
    step = z[1] - z[0]
    return np.log(np.exp(log_total - log_total.max()).sum() * step**2) + log_total.max()


def test_with_telling_profiles_the_likelihood_hardly_depends_on_the_scores(rows):
    # Measured from where the zone and the profiles put the local values together, a score says
    # nothing more; measured from the zone alone (no summaries) it would have to be found.
    rng = np.random.default_rng(3)
    count = 400
    values = {name: np.full(count, value[0]) for name, value in VALUES.items()}
    values |= {name: rng.standard_normal(count) for name in SCORES[:4]}
    values |= {name: np.zeros(count) for name in SCORES[4:]}
    data = KIND.data(rows, 2)
    blind = data | {
        f"chloride_profile_{name}": 0.0 * data[f"chloride_profile_{name}"]
        for name in ("precision", "linear")
    }
    assert np.std(KIND.log_likelihood(rows, values, data)) < 0.8
    assert np.std(KIND.log_likelihood(rows, values, blind)) > 20.0


def test_later_surveys_are_switched_off(rows, make_case):
    none = KIND.data(rows, 0)
    assert KIND.log_likelihood(rows, draw(0, 1.3), none) == 0.0
    known = KIND.local_values(rows, draw(0, 1.3), none)
    np.testing.assert_allclose(known.log_surface, np.log(2.0) + 0.3 * 1.3)
    np.testing.assert_allclose(known.log_diffusion, np.log(120.0) + 0.4 * 1.3)
    case, tables = raw()
    case["surveys"] = case["surveys"][:1]
    alone = KIND.rows(make_case(case, tables))
    ours = KIND.log_likelihood(rows, draw(0, 0.4), KIND.data(rows, 1))
    theirs = KIND.log_likelihood(alone, draw(0, 0.4), KIND.data(alone, 1))
    assert ours == pytest.approx(theirs, rel=1e-10)


def test_order_of_rows_does_not_matter(rows, make_case):
    def backwards(table):
        head, *body = table.splitlines()
        return "\n".join([head, *reversed(body)]) + "\n"

    other = KIND.rows(make_case(*raw(backwards(FIRST), backwards(SECOND))))
    assert other.places != rows.places
    scores = np.linspace(-1.0, 1.0, len(SCORES))
    ours = KIND.log_likelihood(rows, draw(1, scores), KIND.data(rows, 2))
    theirs = KIND.log_likelihood(other, draw(1, scores), KIND.data(other, 2))
    assert theirs == pytest.approx(ours, rel=1e-10)


def test_increments_above_the_convection_depth_say_nothing(rows, make_case):
    more = FIRST + "W1;0;8;9,9\nW2;0;4;0,2\nW2;5;12;7,0\n"
    other = KIND.rows(make_case(*raw(more)))
    assert len(other.value) == len(rows.value)
    ours = KIND.log_likelihood(rows, draw(1), KIND.data(rows, 2))
    assert KIND.log_likelihood(other, draw(1), KIND.data(other, 2)) == ours


def test_basis_of_the_contents_does_not_matter(make_case):
    # The same contents by mass of concrete and of binder, the binder content as stated.
    share = BINDER / DENSITY
    by_concrete = "location,from [mm],to [mm],chloride [%]\n" + "".join(
        f"W1,{a},{b},{share * c}\n" for a, b, c in ((8, 18, 1.7), (18, 28, 0.9))
    )
    by_binder = "location,from [mm],to [mm],chloride [%]\nW1,8,18,1.7\nW1,18,28,0.9\n"
    entry = {"basis": "concrete", "binder_content": "320 kg/m^3", "density": "2350 kg/m^3",
             "absolute_error": f"{0.02 * share} %"}  # fmt: skip
    found = []
    for table, said in ((by_binder, {}), (by_concrete, entry)):
        case, tables = raw(table, entry=said)
        case["surveys"] = case["surveys"][:1]
        rows = KIND.rows(make_case(case, tables))
        values = draw(0) | {"chloride_profile.deck.binder_content": 1.0}
        found.append(KIND.log_likelihood(rows, values, KIND.data(rows, 1)))
    assert found[1] == pytest.approx(found[0], rel=1e-9)


def test_two_ages_of_one_place_tell_the_age_exponent(make_case):
    # Contents of one place at 10 and 40 years, free of error, that have an exponent of 0.5 and a
    # coefficient far from the zone's median, as places that differ much may have.
    def table(age):
        body = [
            f"W1,{a},{b},{expected_content(a, b, age, 2.0, 600.0, 0.5)}"
            for a, b in ((8, 18), (18, 28), (28, 40))
        ]
        return "location,from [mm],to [mm],chloride [%]\n" + "\n".join(body) + "\n"

    case, tables = raw(table(10.0), table(40.0))
    case["surveys"][0]["date"], case["surveys"][1]["date"] = "1981-01-01", "2011-01-01"
    entry = {**case["surveys"][0]["chloride_profile"], "error": 0.02, "absolute_error": "0.005 %"}
    for survey, name in zip(case["surveys"], tables, strict=True):
        survey["chloride_profile"] = {**entry, "table": name}
    rows = KIND.rows(make_case(case, tables))
    node, weight = np.polynomial.hermite_e.hermegauss(24)
    first, second = (part.ravel() for part in np.meshgrid(node, node))
    both = np.outer(weight, weight).ravel()
    grid = np.linspace(0.05, 0.95, 37)

    def width(stage):
        data, found = KIND.data(rows, stage), []
        for exponent in grid:
            values = {name: np.full(len(both), value[0]) for name, value in VALUES.items()}
            values["deck.age_exponent"] = np.full(len(both), exponent)
            values["deck.diffusion_scatter"] = np.full(len(both), 2.0)
            values["chloride_profile.deck: W1.surface"] = first
            values["chloride_profile.deck: W1.diffusion"] = second
            found.append(np.log(both @ np.exp(KIND.log_likelihood(rows, values, data))))
        share = np.exp(found - np.max(found))
        mean = np.average(grid, weights=share)
        return mean, np.sqrt(np.average((grid - mean) ** 2, weights=share))

    alone, (mean, together) = width(1)[1], width(2)
    assert alone > 0.2
    assert together < 0.08
    assert mean == pytest.approx(0.5, abs=0.04)


def test_other_readings_keep_the_shapes_that_were_compiled(rows):
    first = KIND.data(rows, 2)
    count = len(rows.value)
    # 0 % and 19 % at every depth, all below detection: as far from a profile as contents can be.
    for value in (np.full(count, -0.01), np.full(count, 19.0), np.full(count, bounds.BELOW)):
        data = KIND.data(KIND.observed(rows, value), 2)
        assert {k: v.shape for k, v in data.items()} == {k: v.shape for k, v in first.items()}
        assert all(np.isfinite(array).all() for array in data.values())
        assert np.isfinite(KIND.log_likelihood(rows, draw(0), data))


def test_simulation_follows_the_model(rows):
    count = 40_000
    values = {name: np.full(count, value[0]) for name, value in VALUES.items()}
    values["deck.surface_chloride_scatter"] = np.full(count, 0.2)
    values["deck.diffusion_scatter"] = np.full(count, 1e-9)
    drawn = KIND.simulate(rows, values, np.random.default_rng(1))
    share = [
        expected_content(8.0, 18.0, AGES[s], 1.05, 120.0, 0.3) - 0.05 for s in (1, 2)
    ]  # of the step from 0.05 %
    spread = 2.0 * np.exp(0.02) * np.sqrt(np.expm1(0.04))  # of the lognormal surface content
    mean = 0.05 + (2.0 * np.exp(0.02) - 0.05) * share[0]
    assert drawn[:, 0].mean() == pytest.approx(mean, rel=0.01)
    square = mean**2 + (spread * share[0]) ** 2
    assert drawn[:, 0].var() == pytest.approx(
        (spread * share[0]) ** 2 + 0.01 * square + 0.02**2, rel=0.04
    )
    # W1 at both ages has one surface content; W2 another. The later contents carry the binder.
    covariance = np.cov(drawn[:, [0, 7, 4]].T)
    assert covariance[0, 1] == pytest.approx(spread**2 * share[0] * 1.1 * share[1], rel=0.05)
    assert abs(covariance[0, 2]) < 0.01 * covariance[0, 0]
    # The fourth row lies deep: its share below detection, given its local content.
    surface = 2.0 * np.exp(0.2 * np.random.default_rng(2).standard_normal(4_000))
    deep = expected_content(40.0, 55.0, AGES[1], 1.05, 120.0, 0.3) - 0.05
    content = 0.05 + (surface - 0.05) * deep
    below = stats.norm.cdf((0.1 - content) / np.hypot(0.1 * content, 0.02)).mean()
    assert bounds.is_below(drawn[:, 3]).mean() == pytest.approx(below, abs=0.02)
    assert not np.isnan(drawn[:, 4]).any()


def test_spread_of_simulated_diffusion_is_that_of_the_zone(rows):
    # With one surface content everywhere a content tells the place's coefficient.
    count = 20_000
    values = {name: np.full(count, value[0]) for name, value in VALUES.items()}
    values["deck.surface_chloride_scatter"] = np.full(count, 1e-9)
    exact = {name: 1e-9 * rows.extra[name] for name in ("variation", "absolute")}
    quiet = type(rows)(
        rows.value, rows.stage, rows.zone, rows.place, rows.place_zone, rows.zones, rows.places,
        {**rows.extra, **exact},
    )  # fmt: skip
    drawn = KIND.simulate(quiet, values, np.random.default_rng(4))[:, 2]
    grid = np.exp(np.linspace(-2.0, 2.0, 201))
    content = [expected_content(28.0, 40.0, AGES[1], 2.0, 120.0 * g, 0.3) for g in grid]
    log_diffusion = np.interp(drawn, content, np.log(grid))
    assert stats.kstest(log_diffusion, stats.norm(0.0, 0.4).cdf).pvalue > 1e-3


def test_graph_numbers_and_gradient_agree(case, rows):
    graphs.check(KIND, rows, joint_prior(case), 2)


def test_no_local_variable_is_of_chloride(rows):
    assert KIND.local(rows, 2, "S1", "deck", VALUES) == ()


HEAD = "location,from [mm],to [mm],chloride [%]\n"
SOUND = HEAD + "W1,10,20,1.1\n"


@pytest.mark.parametrize(
    ("table", "entry", "words"),
    [
        ("location,from [mm],chloride [%]\nW1,1,1\n", {}, "a.csv:1: column 'to' is missing"),
        (HEAD.replace("%", "MPa") + "W1,10,20,1\n", {}, "a.csv:1: .* does not convert to a pure"),
        (HEAD.replace("%", "-") + "W1,10,20,1.1\n", {},
         "a.csv:1: column 'chloride' looks like % under a dimensionless header"),
        (HEAD.replace("from [mm]", "from") + "W1,10,20,1\n", {}, "a.csv:1: .*'from' has no unit"),
        (SOUND + "W1,20,30,-0.1\n", {}, "a.csv:3: column 'chloride': is out of range, given -0.1"),
        (SOUND + "W1,20,30,>0.1\n", {}, "a.csv:3: column 'chloride': cannot be a bound"),
        (SOUND + "W1,30,20,0.1\n", {}, "a.csv:3: the increment ends before it begins, given 30 to"),
        (SOUND + "W1,-5,20,0.1\n", {}, "a.csv:3: the increment begins above the surface, given -5"),
        (SOUND + ",20,30,0.1\n", {}, "a.csv:3: the increment names neither a location nor a"),
        (SOUND + "W2,0,7,2\nW2,7,14,2\n", {},
         "a.csv:3: no increment of this profile begins below the convection depth, given W2, down "
         "from 7 mm, allowed at least 8 mm"),
        (HEAD, {}, "a.csv:1: the table has a header but no rows"),
        (SOUND, {"zone": "roof"}, "there is no zone of this name, given roof"),
        (SOUND, {"zone": "wall"},
         "a.csv:2: chlorides were measured in a zone without chloride, given wall"),
        (SOUND, {"basis": "cement"}, "basis"),
        (SOUND, {"basis": "concrete", "density": "2300 kg/m^3"},
         "contents by mass of concrete need both binder_content and density, given density"),
        (SOUND, {"density": "2300 kg/m^3"}, "contents by mass of binder need no conversion"),
        (SOUND, {"basis": "concrete", "density": "2300 kg/m^3", "binder_content": "400 kg/m^3"},
         "zone 'deck' has another share of binder in line"),
        (SOUND, {"absolute_error": "0 %"}, "a chloride content is out of range"),
        (SOUND, {"error": 15}, "a coefficient of variation is out of range"),
    ],
)  # fmt: skip
def test_faults_are_said_with_their_place(tmp_path, table, entry, words):
    case, tables = raw(table, entry=entry)
    case["zones"]["wall"] = cases.base()["zones"]["deck"]
    faults = [str(f) for f in check_case(cases.write_case(tmp_path, case, tables)).faults]
    with pytest.raises(ValueError, match=words):
        raise ValueError("\n".join(faults))


@pytest.mark.parametrize(
    ("more", "words"),
    [
        ({"priors": {"chloride_profile.deck: W1.surface": {
            "distribution": "normal", "mean": 0, "sd": 2, "source": "x"}}},
         "priors.* the local values of a profile have the zone's distribution and no other"),
        ({"dependence": [{"between": ["chloride_profile.deck: W1.surface", "deck.diffusion"],
                          "spearman": 0.3, "source": "x"}]},
         "the local values of a profile have the zone's distribution and no other"),
        ({"priors": {"chloride_profile.deck.binder_content": {
            "distribution": "normal", "mean": 1, "sd": 0.1, "source": "x"}}},
         "chloride_profile.deck.binder_content must be a distribution of positive values only"),
    ],
)  # fmt: skip
def test_what_a_case_may_not_restate(tmp_path, more, words):
    case, tables = raw(**more)
    faults = [str(f) for f in check_case(cases.write_case(tmp_path, case, tables)).faults]
    with pytest.raises(ValueError, match=words):
        raise ValueError("\n".join(faults))


def test_another_prior_of_the_binder_content_is_taken(make_case):
    stated = {"distribution": "lognormal", "mean": 1.0, "V": 0.03, "source": "batch records"}
    case = make_case(*raw(priors={"chloride_profile.deck.binder_content": stated}))
    variable = next(v for v in joint_prior(case).variables if v.name.endswith("binder_content"))
    assert variable.source == "batch records"
    assert variable.marginal.sd == pytest.approx(0.03, rel=1e-6)
