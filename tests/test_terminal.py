"""What a run shows, from a record made by hand; its figures are invented."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from assess.decisions.results import (
    IndexCurve,
    Provenance,
    RunRecord,
    SectionResult,
    StageRecord,
    Standing,
    Target,
    Verdict,
)
from assess.terminal import SHORT, RunScreen

YEARS = np.arange(2026, 2056)
REPORT = Path("reports") / "a-name-that-goes-on-and-on-beyond-what-a-line-holds" / "report.html"


def curve(now: float, end: float, period: int = 1) -> IndexCurve:
    index = np.linspace(now, end, 31 - period)
    small = np.full(len(index), 0.03)
    return IndexCurve(
        YEARS[period - 1 :],
        np.full(len(index), period),
        index,
        index - 0.3,
        index + 0.4,
        small,
        4.0 / 3.0 * small,
        np.exp(-index),
    )


def result(
    section: str, stage: str, option: str, now: float, end: float, verdict: Verdict
) -> SectionResult:
    one = curve(now, end)
    return SectionResult(
        *(section, "girder", "soffit", stage, option, one, one, one, None, verdict, None),
        *({}, 0),
    )


MEETS = Verdict(Standing.MEETS, None, None, None, 0.0, 1.4, "")
UNTIL = Verdict(Standing.MEETS_UNTIL, 2041, 2030, None, 0.3, 1.1, "")
LIMITABLE = Verdict(Standing.BELOW_LIMITABLE, 2026, 2026, 2040, 0.9, 0.83, "")
BELOW = Verdict(Standing.BELOW, 2026, 2026, 2026, 1.0, None, "")


@pytest.fixture
def record() -> RunRecord:
    stages = [
        StageRecord(name, date, 4, 1000, 1.0, 2000.0, 2000.0, 0, "x", False, True, ())
        for name, date in (("prior", ""), ("survey 2019", "2019-06-12"))
    ]
    after = [("A", 4.44, 4.11, MEETS), ("B", 4.02, 3.16, UNTIL), ("C", 3.21, 2.5, LIMITABLE),
             ("D", 1.53, 0.5, BELOW)]  # fmt: skip
    results = [result(s, "prior", "leave", now - 0.51, end, BELOW) for s, now, end, _ in after]
    results += [result(s, "survey 2019", "leave", now, end, v) for s, now, end, v in after]
    results += [result(s, "survey 2019", "strengthen", 6.0, 5.9, MEETS) for s in "ABC"]
    results += [result("D", "survey 2019", "strengthen", 3.0, 2.0, BELOW)]
    return RunRecord(
        title="Weir bridge",
        description="",
        built=1971,
        assessed=2026,
        horizon=30,
        invented=True,
        target=Target(3.7, 1, "JCSS PMC", "large consequences", ""),
        stages=stages,
        variables=[],
        data=[],
        results=results,
        options=[],
        doubts=[],
        conflicts=[],
        assumptions=[],
        currency="",
        discount_rate=None,
        failure_cost=None,
        provenance=Provenance("", "", 0, {}, {}, {}, ""),
    )


@pytest.fixture
def shown(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> "Shown":
    monkeypatch.setenv("COLUMNS", "100")
    return Shown(capsys)


class Shown:
    """Shows a record on a terminal 100 columns wide and gives the text."""

    def __init__(self, capsys: pytest.CaptureFixture[str]) -> None:
        self._capsys = capsys

    def __call__(self, record: RunRecord) -> str:
        RunScreen().show(record, REPORT)
        return self._capsys.readouterr().out


def cells(text: str, section: str) -> list[str]:
    (line,) = [line for line in text.splitlines() if line.startswith(f"│ {section} ")]
    return [cell.strip() for cell in line.strip("│").split("│")]


def test_every_section_has_a_row(record: RunRecord, shown: Shown) -> None:
    text = shown(record)
    # error: hypot(0.03, 0.04)
    assert cells(text, "A") == [
        *("A", "3.93", "4.44 ± 0.05", "4.14 to 4.84", "3.70", "meets target through 2055"),
    ]
    assert cells(text, "B")[-1] == "meets target until 2040"  # 2041 is the first year below
    assert cells(text, "C")[-1] == "below; load x 0.83 meets it"
    assert cells(text, "D")[-1] == "below target now"


def test_names_are_shown_as_they_are(record: RunRecord, shown: Shown) -> None:
    results = [replace(item, section=f"{item.section} [east] [/2]") for item in record.results]
    assert cells(shown(replace(record, results=results)), "A [east] [/2]")[0] == "A [east] [/2]"
    screen = RunScreen()
    with screen:
        screen.observe("sampling survey [/2]", 0.5)


def test_an_error_is_never_shown_as_zero(record: RunRecord, shown: Shown) -> None:
    first, *others = record.results
    small = replace(
        first.reference,
        integration_error=np.full(len(first.reference.year), 0.001),
        mcmc_error=np.full(len(first.reference.year), 0.002),
    )
    results = [replace(item, reference=small) for item in (first, *others)]
    assert cells(shown(replace(record, results=results)), "A")[2].endswith("± 0.002")


def test_a_run_without_surveys_has_one_index(record: RunRecord, shown: Shown) -> None:
    results = [item for item in record.results if item.stage == record.stages[0].name]
    alone = replace(record, stages=record.stages[:1], results=results)
    text = " ".join(shown(alone).split())
    assert "no survey counted" in text
    assert "before" not in text


def test_what_the_figures_are_stands_beside_them(record: RunRecord, shown: Shown) -> None:
    text = " ".join(shown(record).split())
    assert "Reliability index of 2026, before and after the surveys" in text
    assert "Target 3.70 for one year: JCSS PMC, large consequences." in text
    assert "safe" not in text


def test_longer_reference_periods_say_their_years(record: RunRecord, shown: Shown) -> None:
    longer = [replace(item, reference=curve(3.0, 2.0, 10)) for item in record.results]
    target = replace(record.target, period=10)
    text = " ".join(shown(replace(record, results=longer, target=target)).split())
    assert "Reliability index of 2026 to 2035" in text
    assert "for 10 years" in text


def test_options_are_summed_up(record: RunRecord, shown: Shown) -> None:
    text = shown(record)
    assert "strengthen: 3 of 4 sections meet the target through the horizon.\n" in text
    assert "leave:" not in text


def test_table_fits_a_hundred_columns(record: RunRecord, shown: Shown) -> None:
    lines = [line for line in shown(record).splitlines() if not line.startswith("Report: ")]
    assert max(len(line) for line in lines) <= 100


def test_path_of_the_report_is_not_broken(record: RunRecord, shown: Shown) -> None:
    assert f"Report: {REPORT}\n" in shown(record)


def test_warnings_stand_only_where_they_belong(record: RunRecord, shown: Shown) -> None:
    sound = shown(record)
    assert "NOT CONVERGED" not in sound
    assert "Doubtful" not in sound
    text = shown(replace(record, accepted_unconverged=True, doubts=["one", "two"]))
    assert "NOT CONVERGED: these figures must not be relied on.\n" in text
    assert "Doubtful data: 2, listed in the report.\n" in text


def test_every_verdict_has_words() -> None:
    assert set(SHORT) == set(Standing)


def test_without_a_terminal_each_part_is_named_once(capsys: pytest.CaptureFixture[str]) -> None:
    with RunScreen() as screen:
        for what, share in (("reading", 0.0), ("sampling", 0.0), ("sampling", 0.5), ("done", 1.0)):
            screen.observe(what, share)
    assert capsys.readouterr().out.split() == ["reading", "sampling", "done"]
