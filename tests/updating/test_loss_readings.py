"""Loss of radius from diameters, masses and pits."""

import numpy as np
import pytest
from scipy import integrate, stats

from assess.mechanics.corrosion import pitting_factor_distribution
from assess.pipeline import check_case
from assess.updating.kinds import KINDS
from assess.updating.loss_readings import pitting_factor_logarithm
from tests.verification import cases

LOSS = KINDS["section_loss"]
HEAD = "location,original diameter [mm],residual diameter [mm],residual mass [kg/m],pit depth [mm]"


def read(make_case, *lines, **entry):
    survey = {"date": "2020-01-01", "section_loss": cases.loss_entry("a.csv") | entry}
    case = make_case(
        cases.base(corrosion=True, surveys=[survey]), {"a.csv": "\n".join([HEAD, *lines]) + "\n"}
    )
    return LOSS.rows(case)


def test_a_mass_leaves_its_diameter(make_case):
    # 7.85 g/cm³: a sound 32 mm bar has 6.313 kg/m (handbook value); 30 mm are left of 5.549 kg/m.
    rows = read(make_case, "B1,32,,5.549,", "B2,32,30,,")
    assert np.exp(rows.value) == pytest.approx([1.0, 1.0], abs=2e-3)
    sound = read(make_case, "B1,32,,6.313,")
    assert np.isnan(sound.value[0])  # a loss below the limit: none found


def test_the_logarithm_of_the_pitting_factor_has_its_moments():
    location, inverse_scale = pitting_factor_distribution(16.0, 100.0)
    drawn = stats.gumbel_r(location, 1.0 / inverse_scale).rvs(400_000, random_state=1)
    mean, variance = pitting_factor_logarithm(16.0, 100.0)
    logs = np.log(np.maximum(drawn, 1.0))
    assert mean == pytest.approx(logs.mean(), abs=1e-3)
    assert variance == pytest.approx(logs.var(), rel=0.01)


def test_a_pit_reads_the_mean_loss_through_its_factor(make_case):
    rows = read(make_case, "B1,16,,,3.0", pit_length="100 mm")
    mean, variance = pitting_factor_logarithm(16.0, 100.0)
    assert rows.value[0] == pytest.approx(np.log(3.0) - mean)
    assert rows.extra["precision"][0] == pytest.approx(1.0 / (np.log1p(0.15**2) + variance))
    assert np.exp(rows.value[0]) == pytest.approx(3.0 / 6.0, rel=0.05)  # factors about 6


def test_the_scatter_of_a_pit_is_close_to_the_exact_one():
    # Density of ln(pit) given the mean loss: lognormal error times Gumbel factor, by quadrature,
    # against the normal that the likelihood takes for it.
    location, inverse_scale = pitting_factor_distribution(16.0, 100.0)
    factor = stats.gumbel_r(location, 1.0 / inverse_scale)
    mean, variance = pitting_factor_logarithm(16.0, 100.0)
    error = np.sqrt(np.log1p(0.15**2))
    normal = stats.norm(mean, np.hypot(error, np.sqrt(variance)))
    for score in (-2.0, -1.0, 0.0, 1.0, 2.0):
        x = normal.mean() + score * normal.std()

        def integrand(r, x=x):
            return factor.pdf(r) * stats.norm.pdf(x, np.log(r), error)

        exact = integrate.quad(integrand, 1.0, 40.0, limit=200)[0]
        assert normal.pdf(x) == pytest.approx(exact, rel=0.16)


def test_a_row_with_both_brings_two_readings_of_one_place(make_case):
    rows = read(make_case, "B1,16,15,,3.0", "B2,16,none,,", "B3,16,14.5,,")
    assert len(rows.value) == 4
    assert rows.extra["row"].tolist() == [0.0, 1.0, 2.0, 0.0]
    first, pit = np.flatnonzero(rows.place == rows.place[0])
    assert (first, pit) == (0, 3)
    values = {
        "deck.onset": np.float64(30.0), "deck.onset_scatter": np.float64(0.3),
        "deck.current": np.float64(2.0), "deck.current_scatter": np.float64(0.4),
    }  # fmt: skip
    both = LOSS.log_likelihood(rows, values, LOSS.data(rows, 1))
    assert np.isfinite(both)


@pytest.mark.parametrize(
    ("line", "words"),
    [
        ("B1,32,,,", "the row says nothing of the bar's loss"),
        ("B1,32,31,6.0,", "both a residual diameter and a residual mass"),
        ("B1,32,,9.0,", "residual mass exceeds that of the sound bar"),
        ("B1,32,,,33", "the pit is deeper than the bar is thick"),
        ("B1,32,33,,", "residual diameter exceeds the original one"),
    ],
)
def test_impossible_rows_are_named(tmp_path, line, words):
    survey = {"date": "2020-01-01", "section_loss": cases.loss_entry("a.csv")}
    path = cases.write_case(
        tmp_path,
        cases.base(corrosion=True, surveys=[survey]),
        {"a.csv": f"{HEAD}\nB0,32,31,,\n{line}\n"},
    )
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault and "a.csv:3" in fault for fault in faults), faults
