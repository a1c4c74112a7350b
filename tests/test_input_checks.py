"""Checks beyond reading, through `assess check`: each fault in its line, none by a traceback."""

import re
from collections.abc import Callable
from pathlib import Path

import pytest

from assess.input_checks import further_faults
from assess.pipeline import check_case
from assess.starter import TABLES, write_starter

CASE = "configs/b.yaml"
CORES, COVER, LOSS = (f"case_data/b/{TABLES[k]}" for k in ("cores", "cover", "section_loss"))
Check = Callable[..., tuple[list[str], list[str]]]


@pytest.fixture
def check(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Check:
    """Spoil the starter case and check it: faults and doubts as text."""
    write_starter("b", tmp_path)
    monkeypatch.chdir(tmp_path)

    def spoil_and_check(*changes: tuple[str, str, str]) -> tuple[list[str], list[str]]:
        for name, old, new in changes:
            text = Path(name).read_text(encoding="utf-8")
            assert text.count(old) == 1, (name, old, text.count(old))
            Path(name).write_text(text.replace(old, new), encoding="utf-8")
        reading = check_case(Path(CASE))
        assert (reading.case is None) == bool(reading.faults)
        return [str(one) for one in reading.faults], [str(one) for one in reading.doubts]

    return spoil_and_check


OWN_TARGET = (
    (CASE, "set: JCSS PMC ", "index: 3.8 #"),
    (CASE, "class: large consequences, high cost of safety", "source: agreed"),
)
PAIR = "dependence:\n  - {{between: [girder soffits.{}, girder soffits.{}], {}, source: x}}\n"


def pair(first: str, second: str, coefficient: str) -> tuple[str, str, str]:
    return (CASE, "dependence:\n", PAIR.format(first, second, coefficient))


BAD = {
    "core too thick": (
        [(CORES, "39.8,94,188", "39.8,200,400")],
        r"cores_2025.csv:4: the core's diameter is outside .* given 200 mm, allowed 47.5 to 157.5",
    ),
    "depth": (
        [
            (CASE, "depth: 1000 mm", "depth: 10 cm"),
            (CASE, "nominal: 55 mm", "nominal: 90 mm"),
            (CASE, "thickness: 180 mm", "thickness: 80 mm"),
        ],
        r"b.yaml:105: members.girder 1.depth: the tension bars would lie outside the section, "
        r"given 100 mm, allowed more than 116 mm",
    ),
    "narrow flange": (
        [(CASE, "flange: {width: 1800 mm", "flange: {width: 180 mm")],
        r"b.yaml:107: members.girder 1.flange.width: the flange is narrower than the web",
    ),
    "thick flange": (
        [(CASE, "thickness: 180 mm", "thickness: 1800 mm")],
        r"b.yaml:107: members.girder 1.flange.thickness: the flange is thicker",
    ),
    "bars of the member": (
        [(CASE, "count: 7 ", "count: 17 ")],
        r"b.yaml:110: members.girder 1.bars.count: bars of 32 mm in one layer do not fit into the "
        r"width, given 17, allowed at most 10",
    ),
    "bars of one section": (
        [(CASE, "count: 5, diameter", "count: 15, diameter")],
        r"b.yaml:128: members.girder 1.sections.girder 1 quarter point.bars.count: .* given 15",
    ),
    "no variable load": (
        [(CASE, "{mean: 460 kN*m, V: 0.12}", "{mean: 0 kN*m, V: 0.12}")],
        r"b.yaml:123: .*midspan.loads.variable.annual_maximum.mean: the variable load is nothing",
    ),
    "grade of the other production": (
        [(CASE, "grade: C35", "grade: C55")],
        r"b.yaml:30: zones.girder soffits.concrete.grade: there is no published strength prior of "
        r"this grade, ready-mixed, given C55, allowed C15, C25, C35, C45, or say mean",
    ),
    "period the document has not": (
        [(CASE, "period: 1 ", "period: 2 ")],
        r"b.yaml:150: decision.target.period: JCSS PMC, large .* has no target of this reference "
        r"period, given 2, allowed 1, targets are not converted",
    ),
    "period beyond the horizon": (
        [*OWN_TARGET, (CASE, "period: 1 ", "period: 31 ")],
        r"b.yaml:150: decision.target.period: .* whole years .*, given 31, allowed 1 to 30",
    ),
    "period of half a year": (
        [*OWN_TARGET, (CASE, "period: 1 ", "period: 0.5 ")],
        r"b.yaml:150: decision.target.period: .* whole years .*, given 0.5, allowed 1 to 30",
    ),
    # The two are exp of normal scores, hence never perfectly linear in each other.
    "Pearson that the true marginals do not allow": (
        [pair("concrete_scatter", "cover_scatter", "pearson: 0.999")],
        r"b.yaml:142: dependence.#1.pearson: Pearson correlation .* given 0.999, allowed strictly",
    ),
    "Pearson of what has no marginal": (
        [pair("concrete_mean", "cover_mean", "pearson: 0.3")],
        r"b.yaml:142: dependence.#1.pearson: a Pearson coefficient needs .* given girder "
        r"soffits.concrete_mean .*, state a rank correlation",
    ),
}


@pytest.mark.parametrize(("changes", "wanted"), BAD.values(), ids=BAD.keys())
def test_a_fault_is_said_once_in_its_line(
    check: Check, changes: list[tuple[str, str, str]], wanted: str
) -> None:
    (fault,), _ = check(*changes)
    assert re.search(wanted, fault), fault


def test_the_period_may_be_the_horizon(check: Check) -> None:
    assert check(*OWN_TARGET, (CASE, "period: 1 ", "period: 30 ")) == ([], [])


def both_with_scatter(pearson: float) -> tuple[str, str, str]:
    lines = "".join(
        f"  - {{between: [girder soffits.{name}, girder soffits.concrete_scatter],"
        f" pearson: {pearson}, source: x}}\n"
        for name in ("onset", "current")
    )
    return (CASE, "dependence:\n", "dependence:\n" + lines)


# With the onset and the current, score coefficient 2 sin(-0.3 pi/6) = -0.313 between them. The
# scatter of a graded concrete is skewed like these two and so asks for smaller scores than a normal
# variable would: with that, 0.55 makes scores 0.575 and 0.599 and a determinant of
# 1 - 0.575² - 0.599² - 0.313² - 2 * 0.575 * 0.599 * 0.313 = -0.003.
def test_a_matrix_is_judged_with_the_true_marginals(check: Check) -> None:
    assert check(both_with_scatter(0.55)) == ([], [])


def test_a_matrix_that_the_true_marginals_do_not_allow(check: Check) -> None:
    (fault,), _ = check(both_with_scatter(0.6))
    assert "b.yaml:141: dependence: these coefficients cannot hold together" in fault
    assert "nearest that hold" in fault


# Both are skewed to the right: near comonotone they are almost linear in each other, near
# antimonotone they are not. A normal variable in place of one allows 0.979 either way, which
# is sqrt(ln(1 + V²))/V for the lognormal one with V 0.3.
def test_a_pearson_coefficient_is_judged_with_the_true_marginals(check: Check) -> None:
    assert check(pair("onset_scatter", "concrete_scatter", "pearson: 0.99")) == ([], [])


def test_a_negative_pearson_coefficient_of_skewed_variables(check: Check) -> None:
    (fault,), _ = check(pair("onset_scatter", "concrete_scatter", "pearson: -0.97"))
    assert re.search(r"b.yaml:142: dependence.#1.pearson: .* given -0.97, allowed strictly", fault)


def test_faults_beyond_reading_come_with_those_of_faulty_tables(check: Check) -> None:
    faults, _ = check(
        (CORES, "39.8", "forty"),
        (LOSS, "32,31.3", "32,33.3"),
        (CASE, "count: 7 ", "count: 17 "),
        (CASE, "period: 1 ", "period: 2 "),
    )
    assert [fault.split(": ")[0] for fault in faults] == [
        f"{CORES}:4",
        f"{LOSS}:4",
        f"{CASE}:110",
        f"{CASE}:150",
    ]


def test_a_coefficient_of_variation_of_evidence_is_doubted_above_one(check: Check) -> None:
    faults, (doubt,) = check((CASE, "error: 0.15 ", "error: 1.5 "))
    assert faults == []
    assert f"{CASE}:97: surveys.survey 2025.section_loss.error: a coefficient of" in doubt


def test_a_sound_case_has_no_further_faults(check: Check) -> None:
    assert check() == ([], [])
    case = check_case(Path(CASE)).case
    assert case is not None
    assert further_faults(case) == []
