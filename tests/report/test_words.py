from dataclasses import replace

import pytest
from scipy.special import ndtr

from assess.decisions.results import RunRecord, Standing, Verdict
from assess.report import words


def test_target_sentence_states_document_period_and_probability(record: RunRecord) -> None:
    sentence = words.target_sentence(record.target)
    assert "EN 1990:2002, Annex B, Table B2" in sentence
    assert "reference period of 1 year" in sentence
    assert float(ndtr(-3.3)) == pytest.approx(4.8e-4, rel=0.01)
    assert "4.8\u00a0×\u00a010⁻⁴" in sentence


@pytest.mark.parametrize(
    ("standing", "year", "factor", "shown"),
    [
        (Standing.MEETS, None, None, "meets the target through 2055"),
        (Standing.MEETS_UNTIL, 2041, None, "meets the target until 2040"),
        (Standing.BELOW, 2026, None, "below the target now"),
        (Standing.BELOW_LIMITABLE, 2026, 0.724, "limited to 0.72 of today\u2019s"),
    ],
)
def test_verdict_words(
    standing: Standing, year: int | None, factor: float | None, shown: str
) -> None:
    verdict = Verdict(standing, year, year, None, 0.4, factor, "mean cover")
    assert words.verdict_words(verdict, 2055).endswith(shown)


def test_prior_is_described_without_chains(record: RunRecord) -> None:
    text = words.stage_diagnosis(record, record.stages[0])
    assert text.startswith("Before (prior): 4\u202f000 draws")
    assert "R-hat" not in text


def test_a_survey_named_after_something_is_not_said_after_twice(record: RunRecord) -> None:
    named = replace(record.stages[-1], name="after 2025")
    renamed = replace(record, stages=[*record.stages[:-1], named])
    assert words.stage_words(renamed, "after 2025") == "after 2025"
    assert words.stage_words(renamed, "spring visit") == "after spring visit"


def test_power_scaling_says_what_decides_a_variable(record: RunRecord) -> None:
    said = {item.variable: words.power_scaling_words(item) for item in record.power_scaling}
    assert said == {
        "onset": "prior and data both felt; may disagree",
        "rate": "rests on its prior; mind its source",
        "cover_mean": "settled by data",
        "pit": "hardly moved by either",
    }
