"""The starter case run once, from its files to its report, and what must hold of the result."""

import csv
import hashlib
import json
import os
import shutil
from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr
from scipy.special import ndtr
from scipy.stats import spearmanr

import assess.report.writer
import assess.updating.stages
from assess import store
from assess.cli import DONE, UNCONVERGED, main
from assess.decisions.options import LEAVE
from assess.decisions.results import RunRecord, SectionResult, Standing
from assess.errors import CaseError, NotConvergedError
from assess.pipeline import RunOptions, case_target, check_case, run_case
from assess.report.summary import COLUMNS
from assess.starter import TABLES, write_starter

AFTER = "survey 2025"
FILES = {store.DRAWS, store.RELIABILITY, store.RUN, store.SUMMARY, store.REPORT}
PAIR = ("girder soffits.onset", "girder soffits.current")
# As few draws as pass the gate, integrated only as exactly as the comparisons below need.
CHANGES = [
    ("  draws: 1000 ", "  draws: 600 "),
    ("integration_error: 0.02", "integration_error: 0.05"),
]


@dataclass(frozen=True)
class Run:
    folder: Path
    record: RunRecord
    sampler: Any  # compiled model of the case

    @property
    def out(self) -> Path:
        return self.folder / "reports" / "b"


class Sampled(Exception):
    """The run went to compile a model."""


def quiet(_what: str, _share: float) -> None:
    pass


def change(folder: Path, *changes: tuple[str, str]) -> Path:
    path = folder / "configs" / "b.yaml"
    text = path.read_text(encoding="utf-8")
    for old, new in changes:
        assert text.count(old) == 1, (old, text.count(old))
        text = text.replace(old, new)
    path.write_text(text, encoding="utf-8")
    return path


def go(folder: Path, **said: Any) -> RunRecord:
    options = RunOptions(folder / "reports" / "b", command="assess run configs/b.yaml", **said)
    return run_case(folder / "configs" / "b.yaml", options, quiet)


@pytest.fixture(scope="module")
def run(tmp_path_factory: pytest.TempPathFactory) -> Run:
    folder = tmp_path_factory.mktemp("starter")
    write_starter("b", folder)
    change(folder, *CHANGES)
    compiled = []
    compile_sampler = assess.updating.stages.compile_sampler

    def keep(*arguments: Any) -> Any:
        compiled.append(compile_sampler(*arguments))
        return compiled[-1]

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(assess.updating.stages, "compile_sampler", keep)
        record = go(folder)
    assert len(compiled) == 1
    return Run(folder, record, compiled[0])


@pytest.fixture
def copy(run: Run, tmp_path: Path) -> Path:
    """Copy the case with what its run left."""
    return Path(shutil.copytree(run.folder, tmp_path / "copy"))


@pytest.fixture
def no_sampling(monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: Any) -> Any:
        raise Sampled

    monkeypatch.setattr(assess.updating.stages, "compile_sampler", refuse)


@pytest.fixture
def compiled(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    """Take the model that is compiled already; the case's data must not change."""
    monkeypatch.setattr(assess.updating.stages, "compile_sampler", lambda *_: run.sampler)


def contents(folder: Path) -> dict[str, bytes]:
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in folder.rglob("*.*")}


def each_section(record: RunRecord, option: str = LEAVE) -> Iterator[SectionResult]:
    for item in record.results:
        if (item.stage, item.option) == (AFTER, option):
            yield item


# What a run leaves ----------------------------------------------------------------------------


def test_files(run: Run) -> None:
    assert {path.name for path in run.out.iterdir()} == FILES
    assert [path.name for path in run.out.parent.iterdir()] == ["b"]  # nothing temporary is left
    text = (run.out / store.REPORT).read_text(encoding="utf-8")
    assert "girder 1 midspan" in text
    assert "girder 1 quarter point" in text


def test_summary_says_what_the_record_says(run: Run) -> None:
    with (run.out / store.SUMMARY).open(encoding="utf-8", newline="") as stream:
        reader = csv.DictReader(stream)
        rows = list(reader)
    assert tuple(reader.fieldnames or ()) == COLUMNS
    for item in run.record.results:
        mine = {
            (int(row["year"]), int(row["period"])): row
            for row in rows
            if (row["section"], row["stage"], row["option"])
            == (item.section, item.stage, item.option)
        }
        assert len(mine) == 30 + 29  # each year, and each longer period from 2026
        for curve in (item.annual, item.cumulative):
            for k, key in enumerate(zip(curve.year.tolist(), curve.period.tolist(), strict=True)):
                row = mine[key]
                index = float(row["reliability_index"])
                assert index == pytest.approx(curve.index[k], abs=6e-5)
                # four digits of the probability, four decimals of the index
                assert float(row["failure_probability"]) == pytest.approx(ndtr(-index), rel=5e-4)
                assert (row["target"] == "3.70") == (key[1] == 1)


def test_inputs_are_hashed(run: Run) -> None:
    said = json.loads((run.out / store.RUN).read_text(encoding="utf-8"))["provenance"]["inputs"]
    configs = run.folder / "configs"
    found = {
        name: hashlib.sha256((configs / name).read_bytes()).hexdigest()
        for name in ("b.yaml", *(f"../case_data/b/{table}" for table in TABLES.values()))
    }
    assert said == found


def test_run_json_says_how_to_have_the_run_again(run: Run) -> None:
    said = json.loads((run.out / store.RUN).read_text(encoding="utf-8"))
    assert said["provenance"]["seed"] == 20260901
    assert said["provenance"]["command"] == "assess run configs/b.yaml"
    assert {"python", "numpy", "scipy", "pymc"} <= said["provenance"]["versions"].keys()
    assert "sampling" in said["provenance"]["timings"]
    assert len(said["verdicts"]) == len(run.record.results) == 2 * (2 + 2)
    assert not said["accepted_unconverged"]


def test_chains_passed_the_gate(run: Run) -> None:
    prior, after = run.record.stages
    assert (prior.name, after.name) == ("prior", AFTER)
    assert after.passed
    assert after.rhat_max <= 1.01
    assert min(after.ess_bulk_min, after.ess_tail_min) >= 400
    assert after.divergences == 0


def test_draws_stay_joint_in_their_file(run: Run) -> None:
    with xr.open_datatree(run.out / store.DRAWS, engine="h5netcdf") as tree:
        for number, stage in enumerate(run.record.stages):
            node = tree[f"{number:02d}"]
            names = [str(name) for name in node["variable"].to_numpy()]
            kept = np.stack([v.draws[stage.name] for v in run.record.variables], axis=-1)
            assert names == [variable.name for variable in run.record.variables]
            assert np.array_equal(node["physical"].to_numpy(), kept)
            flat = node["physical"].to_numpy().reshape(-1, len(names))
            assert np.array_equal(
                np.corrcoef(flat, rowvar=False),
                np.corrcoef(kept.reshape(-1, len(names)), rowvar=False),
            )


def test_dependence_is_that_of_the_case_and_then_of_the_data(run: Run) -> None:
    onset, current = (v for v in run.record.variables if v.name in PAIR)
    before, after = (
        spearmanr(onset.draws[stage].ravel(), current.draws[stage].ravel()).statistic
        for stage in ("prior", AFTER)
    )
    # 2400 independent draws: standard error of a rank correlation about 1/sqrt(2400) = 0.02
    assert before == pytest.approx(-0.3, abs=0.07)
    # Early and slow explains a measured loss as well as late and fast: a ridge of positive
    # dependence, opposite to the prior's.
    assert after > 0.1


def test_each_data_set_names_its_table(run: Run) -> None:
    named = {(item.kind, item.path) for item in run.record.data}
    assert named == {
        ("cores", "cores_2025.csv"),
        ("cover", "cover_2025.csv"),
        ("section_loss", "section_loss_2025.csv"),
    }


def test_reliability_file_holds_every_curve(run: Run) -> None:
    with xr.open_datatree(run.out / store.RELIABILITY, engine="h5netcdf") as tree:
        for kind in ("annual", "cumulative", "reference", "independent"):
            items = [item for item in run.record.results if getattr(item, kind) is not None]
            assert items
            assert tree[kind].sizes["result"] == len(items)
            for row, item in enumerate(items):
                curve = getattr(item, kind)
                node = tree[kind].isel(result=row)
                assert np.array_equal(node["index"].to_numpy(), curve.index)
                assert np.array_equal(node["year"].to_numpy(), curve.year)
                named = tuple(str(node[name].to_numpy()) for name in ("section", "stage", "option"))
                assert named == (item.section, item.stage, item.option)


# What must hold of the numbers ----------------------------------------------------------------


def test_starter_is_a_sensible_example(run: Run) -> None:
    for item in each_section(run.record):
        assert np.all((item.reference.index > 2.5) & (item.reference.index < 5.0))
        assert np.all(item.reference.error < 0.1)
    assert {item.verdict.standing for item in each_section(run.record)} == {
        Standing.MEETS,
        Standing.MEETS_UNTIL,
    }


def test_the_survey_changes_the_index(run: Run) -> None:
    for item in each_section(run.record):
        before = run.record.result(item.section, "prior").reference
        apart = np.abs(item.reference.index - before.index)[-1]
        assert apart > 3.0 * np.hypot(item.reference.error, before.error)[-1]


def test_cumulative_probability_lies_between_its_bounds(run: Run) -> None:
    # Failure in a period contains failure in each of its years and is contained in their union.
    for item in run.record.results:
        annual, cumulative = item.annual.failure_probability, item.cumulative.failure_probability
        assert np.all(cumulative >= np.maximum.accumulate(annual) * (1.0 - 1e-9))
        assert np.all(cumulative <= np.cumsum(annual) * (1.0 + 1e-9))
        assert np.all(item.cumulative.index <= item.annual.index + 1e-9)
        assert cumulative[-1] < 0.999 * np.sum(annual)  # the same bridge every year


def test_loss_never_comes_back(run: Run) -> None:
    for item in run.record.results:
        if item.option == LEAVE:
            assert np.all(np.diff(item.annual.index) <= 1e-9)


def test_arresting_corrosion_never_lowers_the_index(run: Run) -> None:
    for item in each_section(run.record, "cathodic protection"):
        leave = run.record.result(item.section, AFTER).annual
        gain = item.annual.index - leave.index
        error = np.hypot(item.annual.integration_error, leave.integration_error)
        assert np.all(gain >= -4.0 * error)
        assert np.all(np.abs(gain[:2]) <= 4.0 * error[:2])  # 2026 and 2027: not begun
        assert gain[-1] > 0.1


def test_limiting_the_load_raises_the_index(run: Run) -> None:
    for item in each_section(run.record, "weight limit"):
        leave = run.record.result(item.section, AFTER).annual
        gain = item.annual.index - leave.index
        error = np.hypot(item.annual.integration_error, leave.integration_error)
        assert abs(gain[0]) <= 4.0 * error[0]  # from 2027
        assert np.all(gain[1:] > 0.1)


def test_reference_period_of_one_year_is_the_annual_curve(run: Run) -> None:
    for item in run.record.results:
        assert np.array_equal(item.reference.index, item.annual.index)


# The same again -------------------------------------------------------------------------------


@pytest.mark.usefixtures("no_sampling")
def test_second_run_reads_the_draws_back(run: Run, copy: Path) -> None:
    record = go(copy)
    summary = (copy / "reports" / "b" / store.SUMMARY).read_bytes()
    assert summary == (run.out / store.SUMMARY).read_bytes()
    assert record.stages == run.record.stages
    assert record.conflicts == run.record.conflicts
    assert {path.name for path in (copy / "reports" / "b").iterdir()} == FILES


@pytest.mark.usefixtures("no_sampling")
def test_numbers_and_report_do_not_depend_on_threads(
    run: Run, copy: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    pages = []
    for cores in (1, 8):
        monkeypatch.setattr(os, "cpu_count", lambda cores=cores: cores)
        record = go(copy)
        summary = (copy / "reports" / "b" / store.SUMMARY).read_bytes()
        assert summary == (run.out / store.SUMMARY).read_bytes()
        page = copy / f"{cores}.html"
        same = replace(record.provenance, started="", timings={})
        assess.report.writer.write_report(replace(record, provenance=same), page)
        pages.append(page.read_bytes())
    assert pages[0] == pages[1]


@pytest.mark.usefixtures("compiled")
def test_same_seed_sampled_anew_gives_the_same_numbers(run: Run, copy: Path) -> None:
    shutil.rmtree(copy / "reports")
    go(copy)
    summary = (copy / "reports" / "b" / store.SUMMARY).read_bytes()
    assert summary == (run.out / store.SUMMARY).read_bytes()


@pytest.mark.usefixtures("no_sampling")
def test_target_and_options_are_changed_without_sampling(copy: Path) -> None:
    change(
        copy,
        ("set: JCSS PMC ", "index: 4.6 # "),
        ("class: large consequences, high cost of safety", "source: agreed"),
    )
    record = go(copy)
    assert (record.target.index, record.target.period) == (4.6, 1)
    assert record.target.source == "agreed"
    verdicts = {item.section: item.verdict for item in each_section(record)}
    verdict = verdicts["girder 1 midspan"]
    assert verdict.standing is Standing.BELOW_LIMITABLE
    assert verdict.load_factor is not None
    assert verdict.load_factor < 1.0
    # The load factor is solved on the sample of today's load; the option integrates anew.
    change(
        copy,
        ("from: 2027\n      factor: 0.7", f"from: 2026\n      factor: {verdict.load_factor:.6f}"),
    )
    limited = go(copy).result("girder 1 midspan", AFTER, "weight limit").annual
    leave = record.result("girder 1 midspan", AFTER).annual
    error = np.hypot(limited.integration_error, leave.integration_error)[0]
    assert abs(limited.index[0] - 4.6) < 4.0 * error


@pytest.mark.parametrize(
    "changes",
    [
        [("effect: 620 kN*m", "effect: 610 kN*m")],
        [("horizon: 30", "horizon: 20")],
        [("  count: 7 ", "  count: 6 ")],
        [("integration_error: 0.05", "integration_error: 0.09")],
    ],
    ids=["load", "horizon", "bars", "integration"],
)
def test_what_the_draws_do_not_depend_on(copy: Path, changes: list[tuple[str, str]]) -> None:
    case = check_case(change(copy, *changes)).case
    assert case is not None
    key = key_of(case)
    assert store.read_draws(copy / "reports" / "b" / store.DRAWS, key, PAIR) is not None


def key_of(case: Any) -> str:
    from assess.pipeline import _settings
    from assess.updating.model import specify

    stages = assess.updating.stages.stage_list(case)
    return store.sampling_key(specify(case), stages, _settings(case, None))


@pytest.mark.usefixtures("no_sampling")
@pytest.mark.parametrize(
    "changes",
    [
        [("seed: 20260901", "seed: 20260902")],
        [("draws: 600", "draws: 700")],
        [("nominal: 55 mm", "nominal: 50 mm")],
        [("spearman: -0.3", "spearman: -0.2")],
        [("detection_limit: 0.1 mm", "detection_limit: 0.2 mm")],
        [("date: 2025-09-16", "date: 2024-09-16")],
    ],
    ids=["seed", "draws", "prior", "dependence", "detection limit", "date"],
)
def test_what_the_draws_depend_on_is_sampled_anew(
    copy: Path, changes: list[tuple[str, str]]
) -> None:
    change(copy, *changes)
    with pytest.raises(Sampled):
        go(copy)


@pytest.mark.usefixtures("no_sampling")
@pytest.mark.parametrize(
    ("kind", "old", "new"),
    [("cores", "39.8", "39.9"), ("cover", ">80", ">79"), ("section_loss", "31.3", "31.2")],
)
def test_another_measurement_is_sampled_anew(kind: str, old: str, new: str, copy: Path) -> None:
    table = copy / "case_data" / "b" / TABLES[kind]
    text = table.read_text(encoding="utf-8")
    assert old in text
    table.write_text(text.replace(old, new), encoding="utf-8")
    with pytest.raises(Sampled):
        go(copy)


@pytest.mark.usefixtures("no_sampling")
def test_seed_of_the_command_line_is_another_question(copy: Path) -> None:
    with pytest.raises(Sampled):
        go(copy, seed=1)


# Runs that fail -------------------------------------------------------------------------------


@pytest.mark.usefixtures("no_sampling")
def test_failing_run_leaves_the_earlier_one_whole(
    copy: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    before = contents(copy)

    def fail(*_: Any) -> None:
        raise OSError(28, "No space left on device", "report.html")

    monkeypatch.setattr(assess.report.writer, "write_report", fail)
    with pytest.raises(OSError, match="No space left"):
        go(copy)
    assert contents(copy) == before
    assert [path.name for path in (copy / "reports").iterdir()] == ["b"]


def test_faulty_case_is_not_run(tmp_path: Path) -> None:
    write_starter("b", tmp_path)
    change(tmp_path, ("period: 1 ", "period: 2 "))
    with pytest.raises(CaseError, match="has no target of this reference period"):
        go(tmp_path)
    assert not (tmp_path / "reports").exists()


def test_target_of_a_case(run: Run) -> None:
    case = check_case(run.folder / "configs" / "b.yaml").case
    assert case is not None
    # JCSS PMC part 1, table 1: large consequences, high relative cost of safety measures.
    assert (case_target(case).index, case_target(case).period) == (3.7, 1)


@pytest.fixture
def short(copy: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Sample so little that the gate cannot pass: 400 draws have no 400 effective ones."""
    change(copy, ("  draws: 600 ", "  tune: 100\n  draws: 100 "))
    monkeypatch.chdir(copy)
    return copy


@pytest.mark.usefixtures("compiled")
def test_unconverged_run_reports_nothing(short: Path, capsys: pytest.CaptureFixture[str]) -> None:
    before = contents(short / "reports")
    assert main(["run", "configs/b.yaml"]) == UNCONVERGED
    said = capsys.readouterr()
    assert f"not converged: stage '{AFTER}'; no index is reported\n" in said.err
    assert "girder soffits." in said.err
    assert "ESS" in said.err
    assert "before" not in said.out  # no table of indices
    assert contents(short / "reports") == before


@pytest.fixture
def accepted(short: Path, compiled: None, capsys: pytest.CaptureFixture[str]) -> Path:
    assert main(["run", "configs/b.yaml", "--accept-unconverged"]) == DONE
    assert "NOT CONVERGED: these figures must not be relied on." in capsys.readouterr().out
    return short


def test_accepted_run_is_marked_and_not_accepted_twice(
    accepted: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    out = accepted / "reports" / "b"
    said = json.loads((out / store.RUN).read_text(encoding="utf-8"))
    assert said["accepted_unconverged"]
    assert said["provenance"]["command"].endswith("--accept-unconverged")
    page = (out / store.REPORT).read_text(encoding="utf-8")
    assert "did not pass the convergence gate" in page
    # Reading the same draws back asks the same question again.
    before = contents(out)
    monkeypatch.setattr(assess.updating.stages, "compile_sampler", None)
    assert main(["run", "configs/b.yaml"]) == UNCONVERGED
    assert contents(out) == before
    with pytest.raises(NotConvergedError, match=AFTER):
        go(accepted)


def test_accepted_run_is_marked_in_the_summary(accepted: Path) -> None:
    with (accepted / "reports" / "b" / store.SUMMARY).open(encoding="utf-8", newline="") as stream:
        rows = [row for row in csv.DictReader(stream) if row["stage"] == AFTER and row["target"]]
    assert all("not converged" in row["verdict"] for row in rows)
