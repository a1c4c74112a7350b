"""Costs of options against sums done by hand."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import norm

from assess.decisions.economics import failure_cost, option_results
from assess.decisions.options import LEAVE
from assess.decisions.results import IndexCurve, SectionResult, Standing, Verdict
from tests.verification import cases

YEARS = np.arange(2026, 2056)


def cumulative(annual: np.ndarray) -> IndexCurve:
    """Curve of failing up to each year for given hazards."""
    probability = 1.0 - np.cumprod(1.0 - annual)
    zero = np.zeros(len(annual))
    index = norm.isf(probability)
    years = YEARS[: len(annual)]
    return IndexCurve(
        years, np.arange(1, len(annual) + 1), index, index, index, zero, zero, probability
    )


def test_a_failure_is_discounted_from_the_middle_of_its_year():
    # Two years: 1 % in the first, then 2 % of the 99 % left; 8 % a year.
    found = failure_cost(cumulative(np.array([0.01, 0.02])), 1000.0, 0.08)
    by_hand = 1000.0 * (0.01 / 1.08**0.5 + 0.99 * 0.02 / 1.08**1.5)
    assert found == pytest.approx(by_hand, rel=1e-12)


def test_a_constant_hazard_costs_the_geometric_series():
    # Present value of a cost at a constant yearly risk p: C p / sqrt(q) sum ((1-p)/q)^k, a
    # textbook annuity (geometric series).
    p, q = 0.003, 1.03
    ratio = (1.0 - p) / q
    by_series = 5e6 * p * q**-0.5 * (1.0 - ratio**30) / (1.0 - ratio)
    assert failure_cost(cumulative(np.full(30, p)), 5e6, q - 1.0) == pytest.approx(by_series)


def test_without_discount_the_cost_is_the_probability_over_the_horizon():
    curve = cumulative(np.full(30, 0.01))
    assert failure_cost(curve, 2.0, 0.0) == pytest.approx(2.0 * (1.0 - 0.99**30))


def test_certain_failure_costs_once():
    assert failure_cost(cumulative(np.array([1.0, 1.0, 1.0])), 7.0, 0.05) == pytest.approx(
        7.0 / 1.05**0.5
    )


OPTIONS = [
    {"name": "paint", "kind": "arrest corrosion", "from": 2030, "cost": 100.0},
    {"name": "sign", "kind": "limit load", "from": 2026, "factor": 0.8, "members": ["G1"]},
]


@pytest.fixture(scope="module")
def case(make_case):
    raw = cases.base(corrosion=True)
    raw["structure"]["horizon"] = 30
    raw["decision"]["options"] = OPTIONS
    raw["decision"]["costs"] = {"currency": "EUR", "failure": 1e6, "discount_rate": 0.05}
    return make_case(raw, {})


def result(section: str, option: str, crossing: int | None, hazard: float) -> SectionResult:
    curve = cumulative(np.full(30, hazard))
    standing = Standing.MEETS if crossing is None else Standing.MEETS_UNTIL
    return SectionResult(
        section, "girder", "deck", "after 2020", option, curve, curve, curve, None,
        Verdict(standing, crossing, crossing, crossing, 0.1, 1.0, "x"), None, {}, 0,
    )  # fmt: skip


RESULTS = [
    result("A", LEAVE, 2031, 0.004),
    result("B", LEAVE, None, 0.001),
    result("A", "paint", 2042, 0.002),
    result("B", "paint", None, 0.001),
    result("A", "sign", None, 0.001),
    result("B", "sign", 2050, 0.003),
]


def test_options_are_summed_up_over_sections(case):
    leave, paint, sign = option_results(case, RESULTS, "after 2020")
    assert (leave.option, paint.option, sign.option) == (LEAVE, "paint", "sign")
    assert leave.cost == 0.0
    # The structure of these cases is assessed in 2026.
    assert paint.cost == pytest.approx(100.0 * 1.05 ** -(2030 - case.spec.structure.assessed))
    assert sign.cost is None
    assert (leave.sections_below, paint.sections_below, sign.sections_below) == (1, 1, 1)
    expected = sum(
        failure_cost(cumulative(np.full(30, hazard)), 1e6, 0.05) for hazard in (0.002, 0.001)
    )
    assert paint.expected_failure_cost == pytest.approx(expected)


def test_years_gained_count_from_the_crossing_when_nothing_is_done(case):
    _, paint, sign = option_results(case, RESULTS, "after 2020")
    end = case.spec.structure.assessed + case.spec.structure.horizon
    assert paint.years_gained == {"A": 11, "B": 0}
    assert sign.years_gained == {"A": end - 2031, "B": 0}


def test_other_stages_do_not_count(case):
    other = [replace(item, stage="prior") for item in RESULTS]
    found = option_results(case, [*other, *RESULTS], "after 2020")
    assert found == option_results(case, RESULTS, "after 2020")


def test_without_costs_there_is_no_money(make_case):
    raw = cases.base(corrosion=True)
    raw["structure"]["horizon"] = 30
    raw["decision"]["options"] = OPTIONS
    leave, paint, _ = option_results(make_case(raw, {}), RESULTS, "after 2020")
    assert leave.expected_failure_cost is None
    assert paint.cost == 100.0


def test_descriptions_say_who_is_meant(case):
    leave, paint, sign = option_results(case, RESULTS, "after 2020")
    assert leave.description == "Nothing is done."
    assert paint.description == "Corrosion stopped from the start of 2030."
    assert sign.description.endswith("taken as obeyed. Members: G1.")
