import hashlib
from collections.abc import Callable
from datetime import date
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from assess.case.distributions import Distribution
from assess.case.forms import EvidenceEntry, EvidenceForm, Table, Vocabulary
from assess.case.reader import CaseReading, load_case, read_case
from assess.case.spec import GradedConcrete, MeasuredConcrete, NominalCover, ScatteredCover
from assess.errors import CaseError, Fault
from assess.vocabulary import vocabulary
from tests.verification import cases

Read = Callable[..., CaseReading]
FaultOf = Callable[..., str]


def said(faults: tuple[Fault, ...]) -> list[str]:
    return [f"{Path(fault.file).name}:{fault.line}" for fault in faults]


def test_sound_case(read: Read) -> None:
    reading = read()
    assert (reading.faults, reading.doubts) == ((), ())
    case = reading.case
    assert case is not None
    spec = case.spec
    assert spec.structure.built == date(1971, 1, 1)
    soffit, deck = spec.zones["soffit"], spec.zones["deck"]
    assert isinstance(soffit.concrete, GradedConcrete)
    assert isinstance(deck.concrete, MeasuredConcrete)
    assert deck.concrete.mean == pytest.approx(5500 * 0.45359237 * 9.80665 / 25.4**2)
    assert deck.concrete.scatter == "unknown"
    assert isinstance(soffit.cover, ScatteredCover)
    assert soffit.cover.mean.marginal().mean == 40.0
    assert isinstance(deck.cover, NominalCover)
    assert deck.cover.nominal == pytest.approx(38.1)
    assert soffit.corrosion is not None
    assert isinstance(soffit.corrosion.onset, Distribution)
    assert deck.corrosion is None
    assert "onset" in soffit.variables()
    assert "onset" not in deck.variables()
    assert spec.steel["main bars"].local_sd == 8.0
    assert spec.dependence[0].measure == "spearman"
    assert spec.dependence[0].coefficient == -0.4
    assert spec.decision.costs is not None
    assert spec.decision.costs.failure == 12e6
    assert (spec.sampling.seed, spec.sampling.chains) == (7, 4)


def test_member_defaults_reach_sections_of_any_limit_state(read: Read) -> None:
    case = read().case
    assert case is not None
    midspan, support = case.spec.sections().values()
    assert midspan.model_dump() == {
        "name": "midspan",
        "zone": "soffit",
        "limit_state": "bending",
        "steel": "main bars",
        "depth": 900.0,
        "width": 400.0,
        "bars": {"count": 6, "diameter": 25.0},
        "dead_load": 820e6,
        "live_load": 410e6,
    }
    assert support.model_dump() == {
        "name": "support",
        "zone": "soffit",
        "limit_state": "shear",
        "depth": 850.0,
        "web": 300.0,
    }


def test_evidence_is_in_order_of_date_with_its_places(read: Read) -> None:
    case = read().case
    assert case is not None
    assert case.stages == (
        ("2014-03-01", date(2014, 3, 1)),
        ("first visit", date(2019, 6, 12)),
    )
    assert [one.kind for one in case.evidence] == ["section_loss", "cores", "cover"]
    loss, cores, cover = case.evidence
    # 43 years and 59 days after 1 January 1971; 43 years hold 15706 days, eleven of them leap days.
    assert loss.age == pytest.approx((43 * 365 + 11 + 59) / 365.25)
    assert loss.zone.tolist() == ["soffit", "soffit"]
    assert cores.section.tolist() == ["", "midspan"]
    assert cores.location.tolist() == ["A1", "A2"]
    assert cover.zone.tolist() == ["deck", "soffit"]
    assert cover.survey == cores.survey == "first visit"
    np.testing.assert_array_equal(cover.table.beyond["cover"], [np.nan, 80.0])


def test_inputs_are_hashed(read: Read) -> None:
    case = read().case
    assert case is not None
    assert list(case.inputs) == ["case.yaml", "cores.csv", "cover.csv", "loss.csv"]
    raw = (case.path.parent / "cores.csv").read_bytes()
    assert case.inputs["cores.csv"] == hashlib.sha256(raw).hexdigest()


def test_tables_are_found_from_the_case_file(tmp_path: Path, vocabulary: Vocabulary) -> None:
    from_root = tmp_path / "data" / "cores.csv"
    from_root.parent.mkdir()
    (tmp_path / "configs").mkdir()
    from_root.write_text("strength [MPa]\n40\n", encoding="utf-8")
    case = tmp_path / "configs" / "case.yaml"
    case.write_text(
        "structure: {name: a, built: 1971-05-01, assessed: 2026, horizon: 1}\n"
        "zones: {z: {concrete: {vague: true}, cover: {nominal: 40, source: drawings}}}\n"
        "surveys: [{date: 2019-05-01, cores: {table: ../data/cores.csv, zone: z}}]\n"
        "members:\n"
        "  - {name: m, sections: [{name: s, zone: z, limit_state: shear, depth: 900, web: 300}]}\n"
        "decision: {target: {index: 3.8, period: 1, source: client}}\n",
        encoding="utf-8",
    )
    reading = read_case(case, vocabulary)
    assert reading.faults == ()
    assert reading.case is not None
    assert list(reading.case.inputs) == ["../data/cores.csv", "case.yaml"]
    # Built on a stated day: 48 years, twelve of them leap years, to the day.
    assert reading.case.evidence[0].age == pytest.approx((48 * 365 + 12) / 365.25)
    assert reading.case.evidence[0].table.path == tmp_path / "data" / "cores.csv"


def test_load_case_raises_with_every_fault(
    write_case: Callable[..., Path], vocabulary: Vocabulary
) -> None:
    path = write_case(("horizon: 30", "horizon: 300"), ("attack: pitting", "attack: rust"))
    with pytest.raises(CaseError, match="horizon: is out of range, given 300") as caught:
        load_case(path, vocabulary)
    assert said(caught.value.faults) == ["case.yaml:1", "case.yaml:13"]
    assert load_case(write_case(), vocabulary).spec.structure.name == "Weir bridge"


# One fault each: what is changed, where it is found and how it reads ------------------------------

FAULTS = [
    # keys
    (
        ("    cover: {nominal", "    covr: {nominal"),
        "case.yaml:16: zones.deck.covr: unknown key, allowed concrete, cover, corrosion, .* "
        "did you mean 'cover'",
    ),
    (
        ("    steel: main bars\n", "    steell: main bars\n"),
        "case.yaml:32: members.girder 2.steell: unknown key.* did you mean 'steel'",
    ),
    (("bars: {count: 6", "bars: {cuont: 6"), r"midspan.bars.cuont: unknown key.* 'count'"),
    (
        ("horizon: 30, ", ""),
        r"case.yaml:1: structure.horizon: this key is missing, add horizon: \(years",
    ),
    (("        width: 400 mm\n", ""), "case.yaml:34: .*midspan.width: this key is missing"),
    # quantities
    (
        ("mean: 40 mm", "mean: 40 MPa"),
        "case.yaml:6: zones.soffit.cover.mean.mean: .* not convert to mm, given '40 MPa'",
    ),
    (("mean: 40 mm", "mean: -40 mm"), "cover.mean.mean: the mean is out of range, given -40 mm"),
    (("nominal: 1.5 in", "nominal: -1.5 in"), "deck.cover.nominal: .* given -1.5 in"),
    (
        ("V: 0.15", "V: 15"),
        r"case.yaml:15: zones.deck.concrete.V: .* given 15, .*\(in percent\? write 0.15\)",
    ),
    (("discount_rate: 0.03", "discount_rate: 3"), r"case.yaml:47: .*in percent\? write 0.03"),
    (("sd: 5 mm, ", ""), "cover.mean: .* exactly one way, given mean, allowed exactly one"),
    (("sd: 5 mm", "sd: 5 mm, V: 0.1"), "cover.mean: .* exactly one way, given mean and V and sd"),
    (("distribution: normal", "distribution: norml"), "did you mean 'normal'"),
    # sorts of value
    (("name: Weir bridge", "name: 12"), "structure.name: must be text, given 12, put it in quotes"),
    (("assessed: 2026", "assessed: 2026.5"), "must be a whole number, given 2026.5"),
    (("assessed: 2026", "assessed: true"), "a number is wanted, given true"),
    (
        ("discount_rate: 0.03", "discount_rate: 1e25"),
        r"a discount rate is out of all proportion, given 1e\+?25, allowed up to 1e\+20",
    ),
    # what the logarithm is taken of
    (
        ("onset: {distribution: lognormal", "onset: {distribution: normal"),
        "case.yaml:9: .*onset: must be a distribution of positive values only, given normal from "
        "-inf to inf, allowed such as lognormal or gamma, or cut it off with lower: 0",
    ),
    (
        (
            "scatter: {distribution: lognormal, mean: 8 mm, V: 0.3",
            "scatter: {distribution: normal, mean: 8 mm, V: 0.3",
        ),
        "case.yaml:7: .*cover.scatter: must be a distribution of positive values only",
    ),
    # commas between braces
    (
        ("V: 0.3, source: practice}", "V: 0.3, source: practice, sheet 3}"),
        "case.yaml:7: .*cover.scatter.sheet 3: unknown key, .* a text with a comma needs quotes: "
        'source: "practice, sheet 3"',
    ),
    (
        (
            "quantiles: {0.05: 20 yr, 0.95: 60 yr}, source: model}",
            "quantiles: {0.05: 20 yr, 0.95: 60 yr}, drawings, source: model}",
        ),
        "case.yaml:9: .*onset.drawings: unknown key, .* a text with a comma needs quotes; a key",
    ),
    (
        (
            "current_scatter: {distribution: lognormal, mean: 0.6,",
            "current_scatter: {distribution: lognormal, mean: 1,5,",
        ),
        "case.yaml:12: .*current_scatter.5: unknown key, .* a decimal comma. write the number "
        "after mean: with a point",
    ),
    (
        ("invented: true}", "invnted: }"),
        "case.yaml:1: structure.invnted: unknown key, .* did you mean 'invented'",
    ),
    (("invented: true", "invented: perhaps"), "must be true or false, given perhaps"),
    (("sampling: {seed: 7}", "sampling: 7"), "sampling: must be a mapping of keys, given 7"),
    (("sampling: {seed: 7}", "sampling:"), "sampling: has no value, allowed a mapping of keys"),
    (
        ("factor: 0.8", "factor: 80"),
        "signpost.factor: is out of range, given 80, allowed at most 1",
    ),
    (("attack: pitting", "attack: piting"), "given piting, allowed pitting, uniform.* 'pitting'"),
    (("bars: {count: 6, diameter: 25 mm}", "bars: 6"), "bars: must be a mapping of keys, given 6"),
    # forms
    (
        ("{nominal: 1.5 in, source: drawings}", "{nominal: 40, mean: 3}"),
        "deck.cover: exactly one way .* given a mapping with nominal, mean, allowed mean with",
    ),
    (("{mean: 5.5 ksi, V", "{V"), "deck.concrete: exactly one way .* allowed grade or mean with V"),
    (("target: {set: EN 1990", "target: {st: EN 1990"), "target: exactly one way"),
    # kinds
    (("limit_state: bending", "limit_state: bendng"), "case.yaml:31: .* did you mean 'bending'"),
    (("    limit_state: bending\n", ""), "case.yaml:33: .*midspan.limit_state: .*is missing"),
    (("kind: limit load", "kind: limitload"), "signpost.kind: there is no such kind.*'limit load'"),
    (("kind: limit load, ", ""), "signpost.kind: this key is missing, add kind:"),
    # names
    (
        ("zone: soffit\n    depth", "zone: sofit\n    depth"),
        "case.yaml:29: members.girder 2.zone: there is no zone of this name, given sofit, "
        "allowed soffit, deck, did you mean 'soffit'",
    ),
    (("steel: main bars", "steel: man bars"), "case.yaml:32: .*no steel of this name, given man"),
    (("name: support", "name: midspan"), "case.yaml:39: .* section of line 34 has the same name"),
    (("name: signpost", "name: protect"), "case.yaml:46: .* option of line 45 has the same name"),
    (("name: first visit", "name: prior"), "prior is the name of the state before all surveys"),
    (("zones: [soffit]", "zones: [sofit]"), "case.yaml:45: .* given sofit.* 'soffit'"),
    (("grade: C35", "grade: C36"), "grade: there is no published .* given C36.* 'C35'"),
    (("set: EN 1990", "set: EN 1991"), "no such target set, given EN 1991.* 'EN 1990'"),
    (("class: RC2", "class: RC4"), "EN 1990 has no such class, given RC4, allowed RC1, RC2, RC3"),
    # time
    (
        ("2019-06-12", "1969-06-12"),
        "case.yaml:20: surveys.first visit.date: the survey lies before the construction, "
        "given 1969-06-12, allowed 1971-01-01 or later",
    ),
    (("2019-06-12", "2027-06-12"), "after the year of the assessment, given 2027.* up to 2026"),
    (("2019-06-12", "12.06.2019"), "not a date, given 12.06.2019, allowed .* 2019-06-12"),
    (("2019-06-12", "2019-02-30"), "there is no such date, given 2019-02-30"),
    (("built: 1971", "built: 71"), "not a year of construction, given 71, allowed 1800 to 2100"),
    (("from: 2028", "from: 2025"), "case.yaml:45: .* given 2025, allowed 2026 to 2055"),
    (
        ("from: 2028", "from: 2056"),
        "case.yaml:45: .* given 2056, allowed 2026 to 2055, the horizon counts the year of the",
    ),
    # what follows from a wrong horizon or year is not complained of
    (("horizon: 30", "horizon: -5"), "case.yaml:1: structure.horizon: .* given -5, allowed at lea"),
    (
        ("assessed: 2026", "assessed: 1960"),
        "case.yaml:1: structure.assessed: the assessment lies before the construction, given 1960, "
        "allowed 1971 or later",
    ),
    # dependence
    (("soffit.onset,", "sofit.onset,"), "case.yaml:41: .* given sofit.onset, .* 'soffit.onset'"),
    (("soffit.onset,", "deck.onset,"), "zone 'deck' has no corrosion, hence no such variable"),
    (("soffit.onset,", "soffit.current,"), "a variable cannot depend on itself"),
    (("spearman: -0.4", "spearman: -1.4"), "between -1 and 1, given -1.4, allowed more than -1"),
    (("spearman: -0.4", "spearman: -0.4, kendall: -0.3"), "exactly one coefficient, given spear"),
    # For lognormal onset and current no Pearson coefficient comes near to -1.
    (("spearman: -0.4", "pearson: -0.95"), "case.yaml:41: .*pearson: Pearson .* given -0.95"),
    # tables
    (
        ("table: cores.csv", "table: coress.csv"),
        "case.yaml:22: surveys.first visit.cores.table: there is no such table, given .*coress.csv",
    ),
    (("{table: cores.csv, zone: soffit}", "{zone: soffit}"), "cores.table: this key is missing"),
    (("{table: cores.csv, zone: soffit}", "cores.csv"), "cores: must be a list, given cores.csv"),
    (("cores.csv, zone: soffit", "cores.csv, zone: sofit"), "case.yaml:22: .*given sofit"),
]


@pytest.mark.parametrize(("change", "message"), FAULTS, ids=lambda value: str(value)[:60])
def test_fault(read: Read, change: tuple[str, str], message: str) -> None:
    reading = read(change)
    assert reading.case is None
    text = "\n".join(map(str, reading.faults))
    assert len(reading.faults) == 1, text
    with pytest.raises(ValueError, match=message):
        raise ValueError(text)


TABLE_FAULTS = [
    (b"", "cores.csv: the table is empty, given 0 bytes"),
    ("strength [MPa]\n", "cores.csv:1: the table has a header but no rows"),
    (b"\x89PNG\r\n\x1a\n\x00", "cores.csv:.* not text"),
    ("strength [MPa]\n4300\n5000\n", "cores.csv:1: .* looks like psi under a MPa header"),
    ("strength [mm]\n40\n", "cores.csv:1: .* does not convert to MPa, given 'mm'"),
    ("strength [MPa]\n40\nNaN\n", "cores.csv:3: .* not a finite number, given 'NaN'"),
    ("strength [MPa]\n40\nhigh\n", "cores.csv:3: .* text where a number is wanted, given 'high'"),
    (
        "strength [MPa],zone\n40,soffit\n41,dek\n",
        "cores.csv:3: there is no zone of this name, given 'dek', allowed soffit, deck, .* 'deck'",
    ),
    (
        "strength [MPa],section\n40,\n41,mid span\n",
        "cores.csv:3: there is no section of this name, given 'mid span'.*'midspan'",
    ),
    (
        "strength [MPa],zone,section\n40,deck,midspan\n",
        "cores.csv:2: section 'midspan' lies in another zone, given 'deck', allowed 'soffit'",
    ),
]


@pytest.mark.parametrize(("content", "message"), TABLE_FAULTS)
def test_table_fault(fault_of: FaultOf, content: str | bytes, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        raise ValueError(fault_of(tables={"cores.csv": content}))


def test_rows_without_a_zone_are_refused_unless_their_section_tells(read: Read) -> None:
    text = "strength [MPa],section\n40,midspan\n41,\n"
    no_zone = ("{table: cores.csv, zone: soffit}", "{table: cores.csv}")
    (fault,) = read(no_zone, tables={"cores.csv": text}).faults
    assert "cores.csv:3: the row names no zone, allowed soffit, deck, add zone:" in str(fault)
    case = read(no_zone, tables={"cores.csv": "strength [MPa],section\n40,midspan\n"}).case
    assert case is not None
    assert case.evidence[1].zone.tolist() == ["soffit"]


def test_faults_of_file_and_tables_come_at_once_with_their_lines(read: Read) -> None:
    reading = read(
        ("horizon: 30", "horizon: 300"),
        ("    cover: {nominal", "    covr: {nominal"),
        ("2014-03-01", "1964-03-01"),
        ("width: 400 mm", "width: 400 MPa"),
        ("class: RC2", "class: RC9"),
        tables={
            "cores.csv": "strength [MPa],zone\n40,dek\nx,deck\n",
            "loss.csv": "original diameter [mm]\n25\n",
        },
    )
    assert reading.case is None
    assert said(reading.faults) == [
        "case.yaml:1",
        "case.yaml:16",
        "case.yaml:25",
        "case.yaml:35",
        "case.yaml:43",
        "cores.csv:2",
        "cores.csv:3",
        "loss.csv:1",
    ]


def test_matrix_that_is_not_positive_definite(fault_of: FaultOf) -> None:
    old = "spearman: -0.4, source: judgement}\n"
    new = (
        "spearman: -0.9, source: a}\n"
        "  - {between: [soffit.onset, soffit.cover_mean], kendall: 0.8, source: b}\n"
        "  - {between: [soffit.current, soffit.cover_mean], spearman: 0.8, source: c}\n"
    )
    fault = fault_of((old, new))
    assert fault.startswith("case.yaml:40: dependence: these coefficients cannot hold together")
    assert "not positive definite, given soffit.onset with soffit.current -0.9; " in fault
    assert "nearest that hold: soffit.onset with soffit.current -0." in fault


def test_dependence_stated_twice(read: Read) -> None:
    old = "spearman: -0.4, source: judgement}\n"
    new = old + "  - {between: [soffit.current, soffit.onset], kendall: -0.3, source: b}\n"
    (fault,) = read((old, new)).faults
    assert "case.yaml:42: dependence.#2: the dependence of line 41 is between the same" in str(
        fault
    )


def test_dependence_with_steel_and_a_pearson_coefficient(read: Read) -> None:
    new = "[soffit.concrete_mean, steel.main bars], pearson: 0.3"
    reading = read(("[soffit.onset, soffit.current], spearman: -0.4", new))
    assert reading.faults == ()


def test_names_that_differ_in_capitals_only(read: Read) -> None:
    extra = (
        "  Deck:\n    concrete: {vague: true}\n    cover: {nominal: 40, source: drawings}\nsteel:\n"
    )
    (fault,) = read(("steel:\n", extra)).faults
    assert "zones.Deck: the name differs from 'deck' only in capitals or blanks" in str(fault)


def test_zone_names_without_dots(read: Read) -> None:
    cover = "cover [mm],zone\n40,soffit\n"
    (fault,) = read(("  deck:\n", "  deck.east:\n"), tables={"cover.csv": cover}).faults
    assert "case.yaml:14: zones.deck.east: a name must not have a dot" in str(fault)


def test_steel_called_like_a_zone(read: Read) -> None:
    more = "steel:\n  deck: {mean: 460, sd: 30, source: drawings}\n"
    (fault,) = read(("steel:\n", more)).faults
    assert "case.yaml:18: steel.deck: a zone has the same name" in str(fault)


def test_unreadable_yaml_is_one_fault(fault_of: FaultOf) -> None:
    assert fault_of(("steel:\n", "steel\n")).startswith("case.yaml:18: this is not valid YAML")


def test_missing_case_file(tmp_path: Path, vocabulary: Vocabulary) -> None:
    reading = read_case(tmp_path / "none.yaml", vocabulary)
    assert reading.case is None
    assert "none.yaml: there is no such file" in str(reading.faults[0])


def test_a_path_that_no_file_system_takes_is_a_missing_table(fault_of: FaultOf) -> None:
    fault = fault_of(("table: cores.csv", f"table: {'x' * 5000}"))
    assert fault.startswith("case.yaml:22: surveys.first visit.cores.table: there is no such table")
    assert len(fault) < 300
    assert "\\x00" in fault_of(("table: cores.csv", r'table: "a\0b"'))


def test_what_can_be_checked_further_is_kept_beside_faulty_tables(read: Read) -> None:
    reading = read(tables={"cores.csv": "strength [MPa]\nforty\n"})
    assert reading.case is None
    assert reading.readable is not None
    assert [one.kind for one in reading.readable.evidence] == ["section_loss", "cover"]
    assert read(("zones: [soffit]", "zones: [sofit]")).readable is None


def test_an_option_may_start_in_the_last_year_looked_at(read: Read) -> None:
    assert read(("from: 2028", "from: 2055")).faults == ()


def test_evidence_knows_its_place_in_the_case_file(read: Read) -> None:
    case = read().case
    assert case is not None
    # A list of one may stand without the list: cover does not, the others do.
    assert [one.keys for one in case.evidence] == [
        ("surveys", 1, "section_loss"),
        ("surveys", 0, "cores"),
        ("surveys", 0, "cover", 0),
    ]
    assert [case.document.line(one.keys) for one in case.evidence] == [26, 22, 24]


# Doubts -------------------------------------------------------------------------------------------


def test_survey_in_the_future_is_doubted(read: Read) -> None:
    reading = read(today=date(2018, 1, 1))
    assert reading.case is not None
    (doubt,) = reading.doubts
    assert "case.yaml:20: surveys.first visit.date: the survey lies in the future" in str(doubt)


def test_outliers_are_judged_zone_by_zone(read: Read) -> None:
    # 62 is far from the soffit's 40 and near the deck's 60; 41 the other way round.
    soffit, deck = [38, 39, 40, 40.5, 41, 42, 40.2, 39.5, 62], [58, 59, 60, 61, 60.5, 62, 59.5, 41]
    rows = [f"soffit,{v}" for v in soffit] + [f"deck,{v}" for v in deck]
    reading = read(tables={"cover.csv": "zone,cover [mm]\n" + "\n".join(rows)})
    doubts = [str(doubt) for doubt in reading.doubts]
    assert [":".join(doubt.split(":")[1:2]) for doubt in doubts] == ["10", "18"]
    assert "around a median of 40.2 mm in 'soffit', given 62 mm" in doubts[0]
    assert "around a median of 59.75 mm in 'deck', given 41 mm" in doubts[1]


def test_a_coefficient_of_variation_above_one_is_doubted(read: Read) -> None:
    reading = read(("V: 0.15", "V: 1.5"))
    assert reading.case is not None
    (doubt,) = reading.doubts
    assert str(doubt).endswith(
        "case.yaml:15: zones.deck.concrete.V: a coefficient of variation is out of the usual "
        "range, given 1.5, allowed usually up to 1, in percent? write 0.015"
    )


def test_table_used_twice_is_doubted(read: Read) -> None:
    more = "section_loss: {table: loss.csv, zone: soffit}\n  - date: 2012-01-01\n    "
    reading = read(("section_loss: {table", f"{more}section_loss: {{table"))
    assert reading.case is not None
    (doubt,) = reading.doubts
    assert "the table of line 26 is used a second time, given loss.csv" in str(doubt)


def test_doubts_of_the_kind_itself(write_case: Callable[..., Path], vocabulary: Vocabulary) -> None:
    def slender(_entry: EvidenceEntry, table: Table) -> list[Fault]:
        return [Fault(str(table.path), int(table.lines[0]), "slender core")]

    cores = vocabulary.evidence["cores"]
    doubting = EvidenceForm(
        cores.key, cores.title, cores.entry, cores.columns, cores.value, doubts=slender
    )
    more = Vocabulary(
        {**vocabulary.evidence, "cores": doubting},
        vocabulary.limit_states,
        vocabulary.options,
        vocabulary.targets,
        vocabulary.concrete_grades,
    )
    reading = read_case(write_case(), more, date(2026, 1, 1))
    assert [doubt.what for doubt in reading.doubts] == ["slender core"]


# Whatever is in the file --------------------------------------------------------------------------

VALUES = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.sampled_from(["mm", "soffit", ""]),
    lambda inner: (
        st.lists(inner, max_size=3)
        | st.dictionaries(
            st.sampled_from(["mean", "name", "zone", "table", "x"]), inner, max_size=3
        )
    ),
    max_leaves=5,
)
PLACES = [
    "structure",
    "zones",
    "steel",
    "surveys",
    "members",
    "dependence",
    "decision",
    "sampling",
]


@given(st.sampled_from(PLACES), VALUES)
@settings(
    max_examples=120, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
def test_any_value_in_any_place_is_read_or_refused(
    write_case: Callable[..., Path], vocabulary: Vocabulary, place: str, value: object
) -> None:
    import yaml

    path = write_case()
    data = yaml.safe_load(path.read_text(encoding="utf-8"))
    data[place] = value
    path.write_text(yaml.safe_dump(data), encoding="utf-8")
    reading = read_case(path, vocabulary, date(2026, 1, 1))
    assert (reading.case is None) == bool(reading.faults)


def test_surveys_of_one_date_lead_to_one_state(make_case):
    cover = {"table": "c.csv", "zone": "deck", "meter": {"name": "A", "bias": 0, "scatter": 2}}
    cover["meter"]["scatter"] = "2 mm"
    surveys = [
        {"date": "2019-06-12", "name": "scan", "cover": cover},
        {"date": "2014-03-01", "cover": cover},
        {"date": "2019-06-12", "cover": cover},
        {"date": "2019-06-12", "name": "second scan", "cover": cover},
    ]
    case = make_case(cases.base(surveys=surveys), {"c.csv": "cover [mm]\n40\n44\n"})
    assert [name for name, _ in case.stages] == ["2014-03-01", "scan and second scan"]
    assert [item.survey for item in case.evidence] == [
        "2014-03-01", "scan and second scan", "scan and second scan", "scan and second scan",
    ]  # fmt: skip


def test_a_key_that_stands_twice_hides_no_other_fault(tmp_path):
    case = cases.base()
    case["structure"]["horizon"] = -5
    path = cases.write_case(tmp_path, case)
    text = path.read_text(encoding="utf-8")
    path.write_text(text + "steel: {}\n", encoding="utf-8")
    reading = read_case(path, vocabulary())
    said = [str(fault) for fault in reading.faults]
    assert reading.case is None
    assert any("key 'steel' stands twice" in one for one in said)
    assert any("horizon" in one and "given -5" in one for one in said)
    assert len(said) == 2
