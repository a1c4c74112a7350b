import json
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from assess import store
from assess.case.reader import Case
from assess.decisions.sections import used_variables
from assess.pipeline import check_case
from assess.starter import TABLES, write_starter
from assess.updating.model import Spec, specify
from assess.updating.sampling import Settings, diagnose
from assess.updating.stages import StageDraws, prior_draws, stage_list

SETTINGS = Settings(chains=4, draws=250, tune=100, target_accept=0.9, seed=5)


@dataclass(frozen=True)
class Known:
    case: Case
    spec: Spec
    used: list[str]
    stages: list[StageDraws]
    key: str


def read(folder: Path) -> tuple[Case, Spec]:
    case = check_case(folder / "configs" / "b.yaml").case
    assert case is not None
    return case, specify(case)


@pytest.fixture
def known(tmp_path: Path) -> Known:
    """Draws of the prior, and others that stand in for those after a survey."""
    write_starter("b", tmp_path)
    case, spec = read(tmp_path)
    used = used_variables(case)
    prior = prior_draws(spec, SETTINGS, used)
    rng = np.random.default_rng(11)
    whitened = rng.standard_normal(prior.whitened.shape)
    physical = spec.prior.physical(whitened)
    after = StageDraws(
        *("survey 2025", "2025-09-16", 1, prior.names, whitened, physical),
        *(rng.standard_normal(physical.shape[:2]), 2, True),
        diagnose(physical, prior.names, used, 2),
    )
    key = store.sampling_key(spec, stage_list(case), SETTINGS)
    return Known(case, spec, used, [prior, after], key)


@pytest.fixture
def file(known: Known, tmp_path: Path) -> Path:
    path = tmp_path / store.DRAWS
    store.write_draws(known.stages, known.spec, known.key, "NUTS of old", path)
    return path


# Draws ----------------------------------------------------------------------------------------


def test_draws_come_back_as_they_were(known: Known, file: Path) -> None:
    found = store.read_draws(file, known.key, known.used)
    assert found is not None
    stages, sampler = found
    assert sampler == "NUTS of old"
    assert len(stages) == 2
    for kept, draws in zip(known.stages, stages, strict=True):
        assert (draws.name, draws.date, draws.number) == (kept.name, kept.date, kept.number)
        assert draws.names == kept.names
        assert (draws.divergences, draws.retried) == (kept.divergences, kept.retried)
        for name in ("whitened", "physical", "log_likelihood"):
            assert np.array_equal(getattr(draws, name), getattr(kept, name)), name
        assert draws.diagnostics == kept.diagnostics


def test_the_gate_judges_anew_what_is_read_back(known: Known, file: Path) -> None:
    found = store.read_draws(file, known.key, known.used)
    assert found is not None
    prior, after = found[0]
    assert prior.diagnostics.passed  # nothing to converge
    assert after.diagnostics.failures == ("2 divergent transitions",)


def test_correlations_survive_the_file(known: Known, file: Path) -> None:
    names = known.stages[0].names
    onset, current = (names.index(f"girder soffits.{name}") for name in ("onset", "current"))
    with xr.open_datatree(file, engine="h5netcdf") as tree:
        kept = tree["00/physical"].to_numpy().reshape(-1, len(names))
    log_draws = np.log(kept[:, [onset, current]])
    # Both are lognormal: Pearson's coefficient of the logarithms is 2 sin(pi/6 * Spearman's),
    # for -0.3 about -0.313; 1000 draws give it to 0.03.
    wanted = 2.0 * np.sin(np.pi / 6.0 * -0.3)
    assert np.corrcoef(log_draws, rowvar=False)[0, 1] == pytest.approx(wanted, abs=0.1)


def test_file_explains_its_variables(known: Known, file: Path) -> None:
    with xr.open_datatree(file, engine="h5netcdf") as tree:
        variables = json.loads(tree.attrs["variables"])
    assert [variable["name"] for variable in variables] == list(known.stages[0].names)
    onset = next(v for v in variables if v["name"] == "girder soffits.onset")
    assert onset["unit"] == "yr"
    assert onset["source"] == "placeholder, judgement from the exposure"


def test_draws_of_another_question_are_not_taken(known: Known, file: Path) -> None:
    assert store.read_draws(file, known.key[::-1], known.used) is None


def test_no_file_is_no_earlier_run(known: Known, tmp_path: Path) -> None:
    assert store.read_draws(tmp_path / "none.nc", known.key, known.used) is None


@pytest.mark.parametrize("share", [0.0, 0.5, 0.95])
def test_damaged_file_is_no_earlier_run(known: Known, file: Path, share: float) -> None:
    raw = file.read_bytes()
    file.write_bytes(raw[: int(share * len(raw))])
    assert store.read_draws(file, known.key, known.used) is None


def test_file_of_another_kind_is_no_earlier_run(known: Known, file: Path) -> None:
    file.write_bytes(b"section,stage\n")
    assert store.read_draws(file, known.key, known.used) is None


# The key --------------------------------------------------------------------------------------


def test_key_is_the_same_for_the_same_case(known: Known, tmp_path: Path) -> None:
    write_starter("b", tmp_path / "again")
    case, spec = read(tmp_path / "again")
    assert store.sampling_key(spec, stage_list(case), SETTINGS) == known.key


@pytest.mark.parametrize(
    ("field", "value"),
    [("chains", 5), ("draws", 251), ("tune", 101), ("target_accept", 0.91), ("seed", 6)],
)
def test_every_setting_is_in_the_key(known: Known, field: str, value: float) -> None:
    other = replace(SETTINGS, **{field: value})
    assert store.sampling_key(known.spec, stage_list(known.case), other) != known.key


def test_stages_are_in_the_key(known: Known) -> None:
    other = [("prior", ""), ("survey 2025", "2025-09-17")]
    assert store.sampling_key(known.spec, other, SETTINGS) != known.key


@pytest.mark.parametrize("kind", ["cores", "cover", "section_loss"])
def test_rows_are_in_the_key(known: Known, kind: str) -> None:
    rows = known.spec.rows[kind]
    changed = [
        replace(rows, value=rows.value + 1e-9),
        replace(rows, stage=rows.stage + 1),
        replace(rows, place=rows.place[::-1]),
        replace(rows, places=("elsewhere", *rows.places[1:])),
        *(
            replace(rows, extra={**rows.extra, k: np.where(np.isfinite(v), v + 1e-9, 7.0)})
            for k, v in rows.extra.items()
        ),
    ]
    for other in changed:
        spec = replace(known.spec, rows={**known.spec.rows, kind: other})
        assert store.sampling_key(spec, stage_list(known.case), SETTINGS) != known.key


@pytest.mark.parametrize(
    ("old", "new", "same"),
    [
        ("effect: 620 kN*m", "effect: 630 kN*m", True),
        ("factor: 0.7 ", "factor: 0.8 ", True),
        ("failure: 8e6", "failure: 9e6", True),
        ("description: simply", "description: not simply", True),
        ("mean: 460 MPa", "mean: 450 MPa", False),
        ("grade: C35", "grade: C25", False),
        ("0.95: 80 yr", "0.95: 81 yr", False),
        ("bias: 2 mm", "bias: 3 mm", False),
        ("scatter: 2 mm", "scatter: 3 mm", False),
        ("within_location: 0.05", "within_location: 0.06", False),
    ],
)
def test_key_hangs_on_what_the_draws_hang_on(
    known: Known, tmp_path: Path, old: str, new: str, same: bool
) -> None:
    path = tmp_path / "configs" / "b.yaml"
    text = path.read_text(encoding="utf-8")
    assert text.count(old) == 1
    path.write_text(text.replace(old, new), encoding="utf-8")
    case, spec = read(tmp_path)
    assert (store.sampling_key(spec, stage_list(case), SETTINGS) == known.key) == same


def test_layout_of_a_table_is_not_in_the_key(known: Known, tmp_path: Path) -> None:
    table = tmp_path / "case_data" / "b" / TABLES["section_loss"]
    text = table.read_text(encoding="utf-8")
    table.write_text("# a remark\n" + text.replace(",bright bar", ","), encoding="utf-8")
    case, spec = read(tmp_path)
    assert store.sampling_key(spec, stage_list(case), SETTINGS) == known.key


# The folder -----------------------------------------------------------------------------------


def names(folder: Path) -> list[str]:
    return sorted(path.relative_to(folder).as_posix() for path in folder.rglob("*"))


def test_folder_comes_whole(tmp_path: Path) -> None:
    target = tmp_path / "reports" / "b"
    with store.whole_folder(target) as fresh:
        (fresh / "run.json").write_text("new", encoding="utf-8")
        assert not target.exists()
    assert names(tmp_path) == ["reports", "reports/b", "reports/b/run.json"]


def test_new_folder_takes_the_place_of_the_old_one(tmp_path: Path) -> None:
    target = tmp_path / "b"
    target.mkdir()
    for name in ("run.json", "report.docx"):
        (target / name).write_text("old", encoding="utf-8")
    with store.whole_folder(target) as fresh:
        (fresh / "run.json").write_text("new", encoding="utf-8")
        assert (target / "run.json").read_text(encoding="utf-8") == "old"
    assert names(tmp_path) == ["b", "b/run.json"]
    assert (target / "run.json").read_text(encoding="utf-8") == "new"


def test_files_of_others_stay_and_stale_files_of_a_run_go(tmp_path: Path) -> None:
    target = tmp_path / "b"
    (target / "photos").mkdir(parents=True)
    (target / "photos" / "pier.jpg").write_text("picture", encoding="utf-8")
    (target / "notes.txt").write_text("mine", encoding="utf-8")
    (target / store.SUMMARY).write_text("stale", encoding="utf-8")
    with store.whole_folder(target) as fresh:
        (fresh / store.RUN).write_text("new", encoding="utf-8")
    assert names(tmp_path) == ["b", "b/notes.txt", "b/photos", "b/photos/pier.jpg", "b/run.json"]


@pytest.mark.parametrize("error", [ValueError("spoilt"), KeyboardInterrupt("stopped")])
def test_failure_leaves_the_old_folder(tmp_path: Path, error: BaseException) -> None:
    target = tmp_path / "b"
    target.mkdir()
    (target / "run.json").write_text("old", encoding="utf-8")

    def fail() -> None:
        with store.whole_folder(target) as fresh:
            (fresh / "run.json").write_text("half", encoding="utf-8")
            raise error

    with pytest.raises(type(error), match=str(error)):
        fail()
    assert names(tmp_path) == ["b", "b/run.json"]
    assert (target / "run.json").read_text(encoding="utf-8") == "old"


def test_failure_of_a_first_run_leaves_nothing(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="spoilt"), store.whole_folder(tmp_path / "b"):
        raise ValueError("spoilt")
    assert names(tmp_path) == []


def test_others_may_read_the_folder(tmp_path: Path) -> None:
    with store.whole_folder(tmp_path / "b"):
        pass
    assert (tmp_path / "b").stat().st_mode & 0o555 == 0o555
