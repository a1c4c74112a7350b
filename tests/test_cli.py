"""The command line as a user meets it: sound input, bad input, and how each ends."""

import json
import os
import re
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import jsonschema
import pytest

import assess.pipeline
from assess.case.yamlfile import read_yaml
from assess.cli import DONE, FAILED, FAULTY, UNCONVERGED, main
from assess.errors import AssessError, NotConvergedError
from assess.starter import TABLES, write_starter
from assess.store import whole_folder

ROOT = Path(__file__).parents[1]
CASE = "configs/b.yaml"
CORES, COVER, LOSS = (f"case_data/b/{TABLES[k]}" for k in ("cores", "cover", "section_loss"))
Changes = dict[str, list[tuple[str, str]] | bytes]


@pytest.fixture(autouse=True)
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Work in a folder that holds the starter case."""
    write_starter("b", tmp_path)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def spoil(changes: Changes) -> None:
    for name, change in changes.items():
        path = Path(name)
        if isinstance(change, bytes):
            path.write_bytes(change)
            continue
        text = path.read_text(encoding="utf-8")
        for old, new in change:
            assert text.count(old) == 1, (name, old, text.count(old))
            text = text.replace(old, new)
        path.write_text(text, encoding="utf-8")


def line_of(name: str, text: str) -> int:
    lines = Path(name).read_text(encoding="utf-8").splitlines()
    (number,) = [n for n, line in enumerate(lines, start=1) if text in line]
    return number


# Sound input ----------------------------------------------------------------------------------


def test_check_of_a_sound_case(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", CASE]) == DONE
    said = capsys.readouterr()
    counts = "zones 1, sections 2, surveys 1, measurements 57"
    assert said.out == f"{CASE}: no faults; {counts}\n"
    assert said.err == ""


def test_check_shows_doubts_and_ends_well(capsys: pytest.CaptureFixture[str]) -> None:
    spoil({CORES: [("39.8", "138")]})
    assert main(["check", CASE]) == DONE
    out = capsys.readouterr().out
    assert out.startswith("doubtful data, used as they stand: 2\n")
    assert f"  {CORES}:4: column 'strength' is out of the usual range, given 138 MPa" in out
    assert f"  {CORES}:4: strength lies far from the others: modified z-score" in out
    assert out.endswith("measurements 57\n")


def test_new_writes_and_says_what_is_next(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["new", "weir"]) == DONE
    out = capsys.readouterr().out
    assert "wrote configs/weir.yaml\n" in out
    assert out.endswith("next: assess run configs/weir.yaml\n")
    assert main(["check", "configs/weir.yaml"]) == DONE


def test_schema_is_one_and_accepts_the_cases(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["schema"]) == DONE
    schema = json.loads(capsys.readouterr().out)
    jsonschema.Draft202012Validator.check_schema(schema)
    checker = jsonschema.Draft202012Validator(schema)
    cases = [Path(CASE), *sorted((ROOT / "configs").glob("*.yaml"))]
    for path in cases:
        document, _ = read_yaml(path)
        assert document is not None, path
        assert [error.message for error in checker.iter_errors(document.data)] == [], path


def test_schema_to_a_file(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["schema", "--out", "s.json"]) == DONE
    assert capsys.readouterr().out == "wrote s.json\n"
    assert Path("s.json").read_text() == Path("configs/assess-case.schema.json").read_text()


def test_help_says_the_exit_codes_and_the_caution(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit, match="0"):
        main(["--help"])
    out = capsys.readouterr().out
    assert "0 done; 2 faulty input; 3 the sampler has not converged; 1 anything else" in out
    assert "licensed engineer" in out
    assert "safe" not in out.lower()


# Bad input ------------------------------------------------------------------------------------

SPEARMAN = "    spearman: -0.3 "
BAD: dict[str, tuple[Changes, str]] = {
    "unknown key": (
        {CASE: [("horizon: 30", "horizn: 30")]},
        r"{CASE}:21: structure.horizn: unknown key, allowed .*horizon.*did you mean 'horizon'\?",
    ),
    "missing key": (
        {CASE: [("  assessed: 2026 ", "  # ")]},
        r"{CASE}:17: structure.assessed: this key is missing, add assessed: \(year of the",
    ),
    "missing table": (
        {CASE: [("cores_2025", "core_2025")]},
        r"{CASE}:81: .*cores.table: there is no such table, given case_data/b/core_2025.csv, "
        "paths start from the case file's folder",
    ),
    "wrong unit": (
        {CASE: [("nominal: 55 mm", "nominal: 55 MPa")]},
        r"{CASE}:40: .*cover.nominal: a unit that does not convert to mm, given '55 MPa', allowed "
        "mm, cm, m, in, ft",
    ),
    "unknown unit": (
        {CASE: [("nominal: 55 mm", "nominal: 55 inchez")]},
        r"{CASE}:40: .*nominal: unknown unit, given '55 inchez', allowed mm, cm, m, in, ft",
    ),
    "percent for a fraction": (
        {CASE: [("discount_rate: 0.03", "discount_rate: 3")]},
        r"decision.costs.discount_rate: a discount rate is out of range, given 3, allowed at "
        r"least 0 and less than 0.5, \(in percent\? write 0.03\)",
    ),
    "percent for V": (
        {CASE: [("effect: 620 kN*m, V: 0.05", "effect: 620 kN*m, V: 5")]},
        r"self weight.V: a coefficient of variation is out of range, given 5, .*write 0.05",
    ),
    "negative cover": (
        {COVER: [("G1-M02,,", "G1-M02,,-")]},
        r"{COVER}:5: column 'cover': is out of range, given -60, allowed more than 0 and less "
        "than 400 mm",
    ),
    "ksi under MPa": (
        {
            CORES: [
                (old, f"{float(old) / 6.894757:.2f}")
                for old in (
                    *("39.8", "42.5", "35.1", "37.4", "44.0", "33.6", "40.9", "36.2", "41.7"),
                )
            ]
        },
        r"{CORES}:3: column 'strength' looks like ksi under a MPa header, given a median of "
        r"5\.77 MPa, allowed usually 8 to 110 MPa, correct the header's unit",
    ),
    "psi under MPa": (
        {CORES: [("39.8", "5770")]},
        r"{CORES}:4: column 'strength': is out of range, given 5770, allowed more than 0 and less "
        "than 300 MPa",
    ),
    "no positive definite matrix": (
        {
            CASE: [
                (
                    "dependence:\n",
                    "dependence:\n"
                    "  - {between: [girder soffits.onset, girder soffits.cover_mean],"
                    " spearman: 0.9, source: x}\n"
                    "  - {between: [girder soffits.current, girder soffits.cover_mean],"
                    " spearman: 0.9, source: x}\n",
                )
            ]
        },
        r"dependence: these coefficients cannot hold together: their matrix is not positive "
        r"definite, given .*current -0.3.*, nearest that hold: .*cover_mean 0\.\d",
    ),
    "survey before construction": (
        {CASE: [("2025-09-16", "1965-09-16")]},
        r"{CASE}:78: .*date: the survey lies before the construction, given 1965-09-16, allowed "
        "1974-01-01 or later",
    ),
    "survey after the assessment": (
        {CASE: [("2025-09-16", "2027-09-16")]},
        r"{CASE}:78: .*date: the survey lies after the year of the assessment, given 2027-09-16, "
        "allowed up to 2026",
    ),
    "date of another country": (
        {CASE: [("2025-09-16", "16.09.2025")]},
        r"{CASE}:78: .*date: this is not a date, given 16.09.2025, allowed a date as year-month",
    ),
    "header only": (
        {CORES: b"location,strength [MPa],diameter [mm],length [mm],moisture\n"},
        r"{CORES}:1: the table has a header but no rows",
    ),
    "empty table": ({CORES: b""}, r"{CORES}: the table is empty, given 0 bytes"),
    "NaN": (
        {CORES: [("39.8", "NaN")]},
        r"{CORES}:4: column 'strength': not a finite number, given 'NaN', allowed a number, leave",
    ),
    "text in a number column": (
        {CORES: [("39.8", "forty")]},
        r"{CORES}:4: column 'strength': text where a number is wanted, given 'forty', allowed",
    ),
    "unit in the cell": (
        {CORES: [("39.8", "39.8 MPa")]},
        r"{CORES}:4: .*given '39.8 MPa', allowed a number, put the unit in the header",
    ),
    "header without unit": (
        {CORES: [("strength [MPa]", "strength")]},
        r"{CORES}:3: column 'strength' has no unit, allowed MPa, psi, .*write strength \[MPa\]",
    ),
    "section in no zone": (
        {CASE: [("zone: girder soffits\n    limit", "zone: girder sofits\n    limit")]},
        r"{CASE}:103: members.girder 1.zone: there is no zone of this name, given girder sofits, "
        r"allowed girder soffits, did you mean 'girder soffits'\?",
    ),
    "row at no section": (
        {CORES: [("girder 1 midspan", "girder 1 mid span")]},
        r"{CORES}:4: there is no section of this name, given 'girder 1 mid span', allowed girder "
        r"1 midspan, girder 1 quarter point, did you mean 'girder 1 midspan'\?",
    ),
    "steel that is not there": (
        {CASE: [("steel: main bars     #", "steel: stirrups #")]},
        r"{CASE}:112: .*steel: there is no steel of this name, given stirrups, allowed main bars",
    ),
    "no YAML": (
        {CASE: [("zones:\n", "zones: [\n")]},
        r"{CASE}:29: this is not valid YAML: .*check the indentation, colons and quotes",
    ),
    "tab in YAML": (
        {CASE: [("  assessed:", "\tassessed:")]},
        r"{CASE}:20: this is not valid YAML: .*indent with spaces, not tabs",
    ),
    "key twice": (
        {CASE: [("  assessed: 2026", "  built: 1975\n  assessed: 2026")]},
        r"{CASE}:20: key 'built' stands twice, first in line 19, keep one of the two",
    ),
    "empty case": ({CASE: b""}, r"{CASE}: the file is empty, given 0 bytes"),
    "case of bytes": ({CASE: bytes(range(256))}, r"{CASE}: the file is not text, allowed UTF-8"),
    "table of bytes": ({CORES: bytes(range(256))}, r"{CORES}:1: the file is not text, save it as"),
    "case is a list": ({CASE: b"- a\n"}, r"{CASE}:1: a case file is a mapping of keys, given a"),
    "target beyond the horizon": (
        {
            CASE: [
                ("set: JCSS PMC ", "index: 3.8 #"),
                ("class: large consequences, high cost of safety", "source: agreed"),
                ("period: 1 ", "period: 50 "),
            ]
        },
        r"{CASE}:150: decision.target.period: the reference period must be whole years within the "
        "horizon, "
        "given 50, allowed 1 to 30, take a target of another period or a longer horizon",
    ),
    "target of no such period": (
        {CASE: [("period: 1 ", "period: 2 ")]},
        r"{CASE}:150: decision.target.period: .*no target of this reference period, given 2, "
        "allowed 1, targets are not converted",
    ),
    "target class unknown": (
        {CASE: [("class: large consequences, high", "class: huge consequences, high")]},
        r"{CASE}:149: decision.target.class: JCSS PMC has no such class, given huge.*did you mean",
    ),
    "option for no member": (
        {CASE: [("kind: limit load", "kind: limit load\n      members: [girder 9]")]},
        r"{CASE}:160: decision.options.weight limit.members.#1: there is no member of this name, "
        "given girder 9, allowed girder 1",
    ),
    "option of no kind": (
        {CASE: [("kind: limit load", "kind: limit the load")]},
        r"{CASE}:159: .*there is no such kind, given limit the load, allowed arrest corrosion, "
        "limit load",
    ),
    "bar that grew": (
        {LOSS: [("32,31.3", "32,33.3")]},
        r"{LOSS}:4: residual diameter exceeds the original one, given 33.3 of 32 mm, allowed at "
        "most the original diameter, write 'none' where no loss was found",
    ),
    "two ways to say a target": (
        {CASE: [("period: 1 ", "index: 3.8\n    period: 1 ")]},
        r"{CASE}:147: decision.target: exactly one way of saying it is wanted, .*allowed set with "
        "class or index",
    ),
}


@pytest.mark.parametrize(("changes", "wanted"), BAD.values(), ids=BAD.keys())
def test_one_fault_is_said_once_with_its_place(
    changes: Changes, wanted: str, capsys: pytest.CaptureFixture[str]
) -> None:
    spoil(changes)
    assert main(["check", CASE]) == FAULTY
    said = capsys.readouterr()
    *faults, count = said.err.splitlines()
    for name, path in (("CASE", CASE), ("CORES", CORES), ("COVER", COVER), ("LOSS", LOSS)):
        wanted = wanted.replace(f"{{{name}}}", re.escape(path))
    assert len(faults) == 1, faults
    assert re.search(wanted, faults[0]), faults[0]
    assert count == "1 fault; nothing was computed"
    assert "Traceback" not in said.err


def test_loss_that_healed(capsys: pytest.CaptureFixture[str]) -> None:
    later = Path("case_data/b/later.csv")
    later.write_text(
        "location,original diameter [mm],residual diameter [mm]\nG2-B1,32,none\n", encoding="utf-8"
    )
    survey = (
        "  - date: 2026-03-01\n    section_loss: {table: ../case_data/b/later.csv, zone: girder "
        "soffits, detection_limit: 0.1 mm, error: 0.15}\n"
    )
    spoil({CASE: [("surveys:\n", "surveys:\n" + survey)]})
    assert main(["check", CASE]) == FAULTY
    err = capsys.readouterr().err
    assert "loss was found at a place and none at a later survey, given " in err
    assert "G2-B1" in err
    assert "give the two break-outs different locations, or mend the table" in err


def test_all_faults_are_said_at_once_in_order(capsys: pytest.CaptureFixture[str]) -> None:
    spoil(
        {
            CASE: [("horizon: 30", "horizn: 30"), ("nominal: 55 mm", "nominal: 55 MPa")],
            CORES: [("39.8", "forty"), ("44.0", "NaN")],
            COVER: [("G1-M02,,", "G1-M02,,-")],
        }
    )
    assert main(["check", CASE]) == FAULTY
    *faults, count = capsys.readouterr().err.splitlines()
    assert count == "5 faults; nothing was computed"
    assert [fault.split(": ")[0] for fault in faults] == [
        *(f"{CORES}:4", f"{CORES}:8", f"{COVER}:5", f"{CASE}:21", f"{CASE}:40")
    ]


@pytest.mark.parametrize("command", ["check", "run"])
def test_case_that_is_not_there(command: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main([command, "nowhere.yaml"]) == FAULTY
    assert "nowhere.yaml: there is no such file, check the path\n" in capsys.readouterr().err


@pytest.mark.parametrize("command", ["check", "run"])
def test_case_that_is_a_folder(command: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main([command, "configs"]) == FAULTY
    assert "configs: this is a folder, not a case file\n" in capsys.readouterr().err


def test_table_that_is_a_folder(capsys: pytest.CaptureFixture[str]) -> None:
    Path(CORES).unlink()
    Path(CORES).mkdir()
    assert main(["check", CASE]) == FAULTY
    assert f"{CORES}: this is a folder, not a table\n" in capsys.readouterr().err


def test_faulty_run_writes_nothing() -> None:
    spoil({COVER: [("G1-M02,,", "G1-M02,,-")]})
    assert main(["run", CASE]) == FAULTY
    assert not Path("reports").exists()


def test_new_refuses_to_overwrite(capsys: pytest.CaptureFixture[str]) -> None:
    before = Path(CASE).read_bytes()
    assert main(["new", "b"]) == FAULTY
    assert f"{CASE}: the file exists already, take another name" in capsys.readouterr().err
    assert Path(CASE).read_bytes() == before


def test_new_refuses_odd_names(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["new", "../b"]) == FAULTY
    assert "a case cannot have this name, given '../b', allowed" in capsys.readouterr().err


@pytest.mark.parametrize("seed", ["-1", "1.5", "x", str(2**63)])
def test_seeds_that_the_case_would_refuse(seed: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit, match="2"):
        main(["run", CASE, f"--seed={seed}"])
    assert f"given '{seed}', allowed a whole number from 0" in capsys.readouterr().err


def test_run_does_not_take_the_place_of_other_files(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["run", CASE, "--out", "case_data"]) == FAULTY
    err = capsys.readouterr().err
    assert "case_data: the folder holds something other than a run, which would be lost" in err
    assert main(["run", CASE, "--out", CASE]) == FAULTY
    assert f"{CASE}: there is a file where" in capsys.readouterr().err
    assert Path(CORES).is_file()


# How a run ends -------------------------------------------------------------------------------


def ending(monkeypatch: pytest.MonkeyPatch, error: BaseException) -> Callable[[list[str]], int]:
    def run_case(*_: Any) -> None:
        raise error

    monkeypatch.setattr(assess.pipeline, "run_case", run_case)
    return lambda words: main(["run", CASE, *words])


def test_defect_of_the_tool(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    assert ending(monkeypatch, ZeroDivisionError("in the works"))([]) == FAILED
    err = capsys.readouterr().err
    assert "ZeroDivisionError: in the works" in err
    assert err.endswith("this is a defect of the tool, not of your input; please report it\n")


@pytest.mark.parametrize(
    ("error", "words"),
    [
        (AssessError("explained"), "explained\n"),
        (KeyboardInterrupt(), "stopped\n"),
        (PermissionError(13, "Permission denied", "reports"), "reports: Permission denied\n"),
    ],
)
def test_explained_failures_show_no_traceback(
    error: BaseException,
    words: str,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    assert ending(monkeypatch, error)([]) == FAILED
    assert capsys.readouterr().err == words


def test_chains_that_have_not_converged(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    error = NotConvergedError("survey 2025", ["soffit.onset: bulk ESS 210 below 400"])
    assert ending(monkeypatch, error)([]) == UNCONVERGED
    first, second, *rest = capsys.readouterr().err.splitlines()
    assert first == "not converged: stage 'survey 2025'; no index is reported"
    assert second == "  soffit.onset: bulk ESS 210 below 400"
    assert "sampling.draws" in rest[0]
    assert "--accept-unconverged" in rest[-1]


# As a process ---------------------------------------------------------------------------------


def assess_process(*words: str) -> "subprocess.CompletedProcess[str]":
    return subprocess.run(
        [sys.executable, "-m", "assess.cli", *words],
        capture_output=True,
        text=True,
        check=False,
        env={**os.environ, "PYTHONUTF8": "1"},
    )


def test_process_ends_with_the_code_of_faulty_input() -> None:
    spoil({CASE: [("horizon: 30", "horizn: 30")]})
    run = assess_process("check", CASE)
    assert run.returncode == FAULTY
    assert run.stderr.startswith(f"{CASE}:21: structure.horizn: unknown key")
    assert run.stdout == ""


def test_process_without_words_shows_its_use() -> None:
    run = assess_process()
    assert run.returncode == FAULTY
    assert run.stderr.startswith("usage: assess")


def test_the_folder_of_a_run_may_be_replaced(folder: Path) -> None:
    from assess.cli import _require_replaceable

    with whole_folder(folder / "reports" / "b") as fresh:
        (fresh / "run.json").write_text("{}", encoding="utf-8")
    _require_replaceable(folder / "reports" / "b")
    _require_replaceable(folder / "reports" / "new")
