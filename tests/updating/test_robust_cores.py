"""Cores: the choice of rule, bars, Student-t errors, what the codes would have."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.mechanics.characteristic_strength import characteristic_strength_en
from assess.updating.core_values import CORRECTIONS
from assess.updating.kinds import KINDS
from assess.updating.local import SCORES
from assess.updating.model import specify
from tests.updating.graphs import graph, numbers
from tests.verification import cases

CORES = KINDS["cores"]
HEAD = "location,section,strength [MPa],diameter [mm],length [mm],moisture"
PLAIN = "a,,40,100,200,soaked\nb,,36,100,100,soaked\n,S1,38,100,150,soaked\n,S1,21,100,150,soaked\n"


@pytest.fixture
def make(make_case):
    def build(rows, head=HEAD, **entry):
        entry = {"table": "cores.csv", "zone": "deck", **entry}
        case = cases.base(surveys=[{"date": "2020-01-01", "cores": entry}])
        return make_case(case, {"cores.csv": f"{head}\n{rows}"})

    return build


def test_the_european_rule_corrects_shape_alone(make):
    rows = CORES.rows(make(PLAIN, correction="EN 13791"))
    assert np.exp(rows.value[:2]) == pytest.approx([40.0, 36.0 * 0.82])
    assert rows.extra["loading"][1].tolist() == pytest.approx([0.025, 0, 0, 0, 0])


def test_bars_in_a_core_are_corrected_with_an_error_of_their_own(make):
    head = HEAD + ",bar diameter [mm],bar distance [mm]"
    case = make("a,,40,100,200,soaked,12,50\nb,,40,100,200,soaked,,\n", head, correction="EN 13791")
    rows = CORES.rows(case)
    factor = 1.0 + 1.5 * 12.0 * 50.0 / 20_000.0
    assert np.exp(rows.value) == pytest.approx([40.0 * factor, 40.0])
    assert rows.extra["loading"][:, CORRECTIONS.index("bar")] == pytest.approx([0.5 * 0.045, 0.0])
    assert [v.name for v in CORES.variables(case)] == ["cores.bar_correction"]


@pytest.mark.parametrize(
    ("row", "message"),
    [
        ("a,,40,100,200,soaked,12,", ":2: .* diameter and its distance .* only bar diameter"),
        ("a,,40,100,200,soaked,,30", ":2: .* only bar distance, give both"),
        ("a,,40,100,200,soaked,12,130", ":2: .* given 130 mm, allowed at most 100 mm"),
    ],
)
def test_bars_that_cannot_be_are_faults(make, row, message):
    (fault,) = CORES.faults(make(row + "\n", HEAD + ",bar diameter [mm],bar distance [mm]"))
    with pytest.raises(ValueError, match=message):
        raise ValueError(str(fault))


def test_the_range_of_the_chosen_rule_counts(make):
    thin = "a,,40,60,120,soaked\n"
    (fault,) = CORES.faults(make(thin, correction="EN 13791"))
    assert "outside what EN 13791 corrects" in str(fault)
    assert list(CORES.faults(make(thin))) == []


def test_student_errors_are_the_same_in_the_graph_and_in_numbers(make):
    case = make(PLAIN, errors="Student-t")
    prior, rows = specify(case).prior, CORES.rows(case)
    at = np.random.default_rng(2).normal(size=len(prior.names))
    for here in (at, 3.0 * at):
        value, gradient = graph(CORES, rows, prior, 1)(here)
        assert value == pytest.approx(numbers(CORES, rows, prior, 1, here), abs=1e-8)
        assert np.all(np.isfinite(gradient))


def test_an_outlier_counts_for_little_with_student_errors(make):
    values = {
        "deck.concrete_mean": np.array([38.0]),
        "deck.concrete_scatter": np.array([0.15]),
    }
    rows = CORES.rows(make(PLAIN, errors="Student-t", correction="none"))
    (local,) = CORES.local(rows, 1, "S1", "deck", values)
    found = local.values(np.array([[[0.0]]]), np.array([0]))["strength"].item()
    scale = np.sqrt(np.log1p(0.05**2))

    def weight(u, power):
        density = stats.norm.pdf(u, np.log(38.0), 0.15)
        for y in (38.0, 21.0):
            density *= stats.t(4).pdf((np.log(y) - u) / scale)
        return density * (u <= power)

    whole = integrate.quad(weight, 2.5, 4.5, args=(9.0,), points=[np.log(38), np.log(21)])[0]
    below = integrate.quad(weight, 2.5, 4.5, args=(np.log(found),), points=[np.log(found)])[0]
    assert below / whole == pytest.approx(0.5, abs=2e-3)
    # Normal errors would put the section half way between its two cores.
    (plain,) = CORES.local(CORES.rows(make(PLAIN, correction="none")), 1, "S1", "deck", values)
    middle = plain.values(np.array([[[0.0]]]), np.array([0]))["strength"].item()
    assert middle == pytest.approx(29.0, abs=1.0)
    assert found > 36.0
    assert len(SCORES) > 2


def test_simulated_student_errors_have_their_tails(make):
    rows = CORES.rows(make("a,,40,100,200,soaked\n", errors="Student-t", correction="none"))
    draws = 200_000
    values = {
        "deck.concrete_mean": np.full(draws, 38.0),
        "deck.concrete_scatter": np.full(draws, 1e-6),
    }
    error = CORES.simulate(rows, values, np.random.default_rng(5))[:, 0] - np.log(38.0)
    scaled = error * np.sqrt(rows.extra["precision"][0])
    assert np.mean(np.abs(scaled) > 4.0) == pytest.approx(2 * stats.t(4).sf(4.0), rel=0.1)


def test_codes_get_one_value_for_each_place(make):
    rows = CORES.rows(
        make("".join(f"L{k % 8},,{30 + k},100,200,soaked\n" for k in range(9)), correction="none")
    )
    first, *others = CORES.code_strengths(rows)
    places = np.array([(30.0 + 38.0) / 2, *range(31, 38)])
    assert (first.code, first.count) == ("EN 13791:2019", 8)
    assert first.value == pytest.approx(characteristic_strength_en(places))
    assert [item.code for item in others] == [
        "ACI 214.4R-10, confidence 75 %",
        "ACI 214.4R-10, confidence 95 %",
    ]
    few = CORES.code_strengths(CORES.rows(make(PLAIN)))
    assert few[0].value is None
    assert few[0].note == "asks for 8 places or more"
