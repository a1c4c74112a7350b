"""What options do to a section: years, ages, factors."""

import numpy as np
import pytest

from assess.decisions.options import OPTIONS
from assess.reliability.limit_state import Action, Surroundings
from tests.verification import cases

YEARS = np.arange(2026, 2036)
AGE = np.arange(51.0, 61.0)  # at the end of each year: built at the start of 1976


@pytest.fixture(scope="module")
def spec(make_case):
    return make_case(cases.base(corrosion=True), {}).spec


def action(key: str, spec, **said) -> Action:
    kind = OPTIONS[key]
    entry = kind.form.entry.model_validate({"name": "option", "kind": key, **said})
    return kind.action(entry, spec, YEARS, AGE)


def corroding(found: Action, onset: float) -> np.ndarray:
    here = Surroundings({"onset": np.array([[[onset]]])}, {}, {}, AGE, found)
    return here.corroding()[0, 0]


def test_corrosion_stops_at_the_start_of_the_stated_year(spec):
    found = action("arrest corrosion", spec, **{"from": spec.structure.assessed + 3})
    assert found.arrest_age == 53.0
    years = corroding(found, onset=40.0)
    np.testing.assert_allclose(years, [11.0, 12.0, 13.0, *[13.0] * 7])


def test_what_is_not_stopped_goes_on(spec):
    found = action(
        "arrest corrosion", spec, **{"from": spec.structure.assessed + 3, "efficiency": 0.75}
    )
    years = corroding(found, onset=40.0)
    assert years[2] == pytest.approx(13.0)
    assert years[-1] == pytest.approx(13.0 + 0.25 * 7.0)
    # A bar that begins after the arrest corrodes at the current that is left.
    np.testing.assert_allclose(corroding(found, onset=56.0)[-1], 0.25 * 4.0)


def test_an_option_from_the_first_year_acts_at_once(spec):
    found = action("arrest corrosion", spec, **{"from": spec.structure.assessed})
    np.testing.assert_allclose(corroding(found, onset=40.0), 10.0)


def test_a_load_limit_holds_from_its_year_on(spec):
    found = action("limit load", spec, **{"from": 2029, "factor": 0.7})
    np.testing.assert_array_equal(found.load_factor, [1.0, 1.0, 1.0, *[0.7] * 7])
    assert found.arrest_age == np.inf


@pytest.mark.parametrize(
    ("key", "said", "words"),
    [
        ("arrest corrosion", {"from": 2030, "efficiency": 0.9}, "reduced by 90% from the start"),
        ("limit load", {"from": 2027, "factor": 0.8}, "limited to 0.8 of today's from 2027"),
    ],
)
def test_options_are_described_with_their_numbers(key, said, words):
    kind = OPTIONS[key]
    entry = kind.form.entry.model_validate({"name": "option", "kind": key, **said})
    assert words in kind.describe(entry)
