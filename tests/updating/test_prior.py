import copy

import numpy as np
import pytest
from scipy import stats

from assess.updating.prior import joint_prior
from tests.verification import cases


def _draws(case, count=20_000):
    prior = joint_prior(case)
    whitened = np.random.default_rng(4).standard_normal((count, len(prior.names)))
    return dict(zip(prior.names, prior.physical(whitened).T, strict=True))


def test_variables_of_the_example_in_order(example_case):
    assert joint_prior(example_case).names == (
        "deck.concrete_scatter",
        "deck.concrete_mean",
        "deck.cover_mean",
        "deck.cover_scatter",
        "deck.onset",
        "deck.onset_scatter",
        "deck.current",
        "deck.current_scatter",
        "steel.main",
        "cores.length_correction",
        "cores.diameter_correction",
        "cores.moisture_correction",
        "cores.damage_correction",
        "cover_meter_1.bias",
        "cover_meter_2.bias",
    )


def test_stated_dependence_holds_in_the_draws(example_case):
    draws = _draws(example_case)
    spearman = stats.spearmanr(draws["deck.onset"], draws["deck.cover_mean"]).statistic
    assert spearman == pytest.approx(0.6, abs=0.015)  # standard error 0.006
    kendall = stats.kendalltau(draws["deck.onset"], draws["deck.current"]).statistic
    assert kendall == pytest.approx(-0.3, abs=0.015)
    other = stats.spearmanr(draws["deck.cover_mean"], draws["deck.current"]).statistic
    assert other == pytest.approx(0.0, abs=0.03)


def test_pearson_coefficient_holds_in_the_draws(make_case):
    case = cases.base(corrosion=True)
    pair = {"between": ["deck.onset", "deck.current"], "pearson": -0.4, "source": "test"}
    case["dependence"] = [pair]
    draws = _draws(make_case(case), 200_000)
    found = np.corrcoef(draws["deck.onset"], draws["deck.current"])[0, 1]
    assert found == pytest.approx(-0.4, abs=0.01)


@pytest.mark.published(
    source="JCSS Probabilistic Model Code", place="part 3.1, prior parameters for the strength"
)
def test_graded_concrete_is_the_jcss_prior_in_the_structure(make_case):
    # Ready-mixed C35: m 3.85, n 3, s 0.09, nu 10; ln f in the structure is 0.96 ln f.
    draws = _draws(make_case(cases.base()), 200_000)
    scatter = draws["deck.concrete_scatter"] / 0.96
    level = np.log(draws["deck.concrete_mean"]) / 0.96
    assert np.mean(scatter**2) == pytest.approx(0.09**2 * 10 / 8, rel=0.01)
    assert np.mean(level) == pytest.approx(3.85, abs=1e-3)
    assert np.std(level) == pytest.approx(0.09 / np.sqrt(3) * np.sqrt(10 / 8), rel=0.01)
    # Predictive 5 % fractile of the table, 38.925 MPa (recomputed).
    noise = np.random.default_rng(5).standard_normal(len(level))
    assert np.quantile(np.exp(level + scatter * noise), 0.05) == pytest.approx(38.925, rel=0.005)


def test_measured_concrete(make_case):
    concrete = {"mean": "40 MPa", "V": 0.2, "equivalent_tests": 5, "source": "test"}
    draws = _draws(make_case(cases.base(concrete=concrete)), 100_000)
    log_sd = np.sqrt(np.log(1.04))
    level = np.log(draws["deck.concrete_mean"])
    assert np.mean(level) == pytest.approx(np.log(40.0) - 0.5 * log_sd**2, abs=2e-3)
    assert np.median(draws["deck.concrete_scatter"] ** -2.0) == pytest.approx(
        stats.chi2(4).median() / (4 * log_sd**2), rel=0.02
    )
    known = _draws(make_case(cases.base(concrete={**concrete, "scatter": "known"})), 100_000)
    np.testing.assert_allclose(known["deck.concrete_scatter"], log_sd)
    assert np.std(np.log(known["deck.concrete_mean"])) == pytest.approx(
        log_sd / np.sqrt(5.0), rel=0.01
    )


def test_nominal_cover_and_sound_zone(make_case):
    case = copy.deepcopy(cases.base())
    case["zones"]["deck"]["cover"] = {"nominal": "45 mm", "source": "test"}
    draws = _draws(make_case(case))
    assert np.mean(draws["deck.cover_mean"]) == pytest.approx(45.0, abs=0.2)
    assert 5.0 < np.median(draws["deck.cover_scatter"]) < 10.0  # JCSS PMC part 3.10
    assert "deck.onset" not in draws


def test_quantities_have_a_mean_and_where_stated_a_scatter(make_case):
    case = cases.base()
    level = {"distribution": "normal", "mean": "24 kN/m^3", "V": 0.03, "source": "test"}
    scatter = {"distribution": "lognormal", "mean": "0.5 kN/m^3", "V": 0.3, "source": "test"}
    case["quantities"] = {
        "deck": {"of": "weight density", "level": level, "scatter": scatter},
        "fill": {"of": "weight density", "level": level},
    }
    case["dependence"] = [
        {"between": ["quantity.deck", "quantity.fill"], "spearman": 0.5, "source": "test"}
    ]
    made = make_case(case)
    draws = _draws(made, 100_000)
    assert np.mean(draws["quantity.deck"]) == pytest.approx(24.0, rel=1e-3)
    assert np.std(draws["quantity.fill"]) == pytest.approx(0.72, rel=0.01)
    assert np.mean(draws["quantity.deck.scatter"]) == pytest.approx(0.5, rel=0.01)
    assert "quantity.fill.scatter" not in draws
    spearman = stats.spearmanr(draws["quantity.deck"], draws["quantity.fill"]).statistic
    assert spearman == pytest.approx(0.5, abs=0.02)
    (variable,) = (one for one in joint_prior(made).variables if one.name == "quantity.deck")
    assert (variable.unit, variable.label) == ("kN/m³", "mean weight density, deck")


def test_the_scatter_of_a_steel_may_be_uncertain(make_case):
    case = cases.base()
    case["steel"]["main"]["local_sd"] = {"catalogue": "yield strength scatter of one melt"}
    case["dependence"] = [
        {"between": ["steel.main", "steel.main.scatter"], "kendall": 0.2, "source": "test"}
    ]
    draws = _draws(make_case(case), 100_000)
    # JCSS part 3.2: 8 MPa within a melt.
    assert np.mean(draws["steel.main.scatter"]) == pytest.approx(8.0, rel=0.01)
    kendall = stats.kendalltau(draws["steel.main"], draws["steel.main.scatter"]).statistic
    assert kendall == pytest.approx(0.2, abs=0.015)


def test_only_stated_deviations_of_dimensions_are_variables(make_case):
    case = cases.base()
    case["zones"]["deck"]["dimensions"] = {
        "depth_deviation": {
            "catalogue": "deviation of dimensions of 1000 mm and more in a zone",
        },
        "depth_scatter": {"catalogue": "scatter of dimensions of 1000 mm and more in a zone"},
    }
    draws = _draws(make_case(case), 100_000)
    total = draws["deck.depth_deviation"] + draws["deck.depth_scatter"] * np.random.default_rng(
        1
    ).standard_normal(100_000)
    # JCSS part 3.10 for 1000 mm: mean 3 mm, standard deviation 10 mm (a little more here, as the
    # scatter is uncertain itself: 10 sqrt(1 + 0.09/2)).
    assert np.mean(total) == pytest.approx(3.0, abs=0.15)
    assert np.std(total) == pytest.approx(10.22, rel=0.02)
    assert "deck.width_deviation" not in draws
