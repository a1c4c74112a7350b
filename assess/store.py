"""The files of a run: written to a temporary folder and moved into place whole; read back."""

import hashlib
import json
import shutil
import tempfile
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import asdict
from pathlib import Path
from typing import Any

import numpy as np

from assess.decisions.results import IndexCurve, RunRecord
from assess.updating.model import Spec
from assess.updating.sampling import Settings, diagnose
from assess.updating.stages import PRIOR, StageDraws

DRAWS = "draws.nc"
RELIABILITY = "reliability.nc"
RUN = "run.json"
SUMMARY = "summary.csv"
REPORT = "report.html"
# What a run may leave; other files in its folder are somebody else's.
FILES = frozenset(
    {DRAWS, RELIABILITY, RUN, SUMMARY, REPORT, "report.docx", "report.pdf", "tables.xlsx"}
)
CURVES = (
    "period",
    "index",
    "low",
    "high",
    "integration_error",
    "mcmc_error",
    "failure_probability",
)


@contextmanager
def whole_folder(target: Path) -> Iterator[Path]:
    """Give a temporary folder that takes the target's place when all went well.

    Files of an earlier run that the new one does not write go; files that are not of a run stay.
    A run that fails leaves the earlier folder as it was.
    """
    target.parent.mkdir(parents=True, exist_ok=True)
    fresh = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.parent))
    try:
        yield fresh
        fresh.chmod(0o755)
        old = None
        if target.exists():
            old = Path(tempfile.mkdtemp(prefix=f".{target.name}-old-", dir=target.parent))
            target.rename(old / target.name)
        fresh.rename(target)
        if old is not None:
            _keep_foreign(old / target.name, target)
            shutil.rmtree(old)
    finally:
        shutil.rmtree(fresh, ignore_errors=True)


def _keep_foreign(old: Path, new: Path) -> None:
    """Carry over what somebody else put into the folder of a run."""
    for entry in old.iterdir():
        if entry.name not in FILES and not (new / entry.name).exists():
            shutil.move(entry, new / entry.name)


def sampling_key(spec: Spec, stages: Sequence[tuple[str, str]], settings: Settings) -> str:
    """Fingerprint of all that the draws depend on: prior, data, settings, sampler versions.

    Options, targets, loads and sections are not in it: changing them does not sample again.
    """
    from importlib.metadata import PackageNotFoundError, version

    digest = hashlib.sha256()
    digest.update(repr([(v.name, repr(v)) for v in spec.prior.variables]).encode())
    digest.update(np.ascontiguousarray(spec.prior.correlation).tobytes())
    for key, rows in sorted(spec.rows.items()):
        arrays = {"value": rows.value, "stage": rows.stage, "zone": rows.zone, "place": rows.place}
        for name, array in sorted((arrays | dict(rows.extra)).items()):
            digest.update(f"{key} {name}".encode())
            digest.update(np.ascontiguousarray(array).tobytes())
        digest.update(repr((rows.zones, rows.places)).encode())
    digest.update(repr((stages, settings)).encode())
    for package in ("pymc", "nutpie", "numpy", "assess"):
        try:
            digest.update(f"{package} {version(package)}".encode())
        except PackageNotFoundError:
            digest.update(f"{package} missing".encode())
    return digest.hexdigest()


def write_draws(
    stages: Sequence[StageDraws], spec: Spec, key: str, sampler: str, path: Path
) -> None:
    """Write the joint draws of all stages as one netCDF file, a group for each stage.

    Parameters
    ----------
    stages : sequence of StageDraws
        Prior and posteriors.
    spec : Spec
        For units and sources of the variables.
    key : str
        From `sampling_key`.
    sampler : str
        Which sampler drew them.
    path : Path
        File to write.
    """
    import xarray as xr

    groups: dict[str, Any] = {}
    for stage in stages:
        coords = {"variable": list(stage.names)}
        groups[f"/{stage.number:02d}"] = xr.Dataset(
            {
                "physical": (("chain", "draw", "variable"), stage.physical),
                "whitened": (("chain", "draw", "variable"), stage.whitened),
                "log_likelihood": (("chain", "draw"), stage.log_likelihood),
            },
            coords=coords,
            attrs={
                "stage": stage.name,
                "date": stage.date,
                "divergences": stage.divergences,
                "retried": int(stage.retried),
            },
        )
    variables = [
        {"name": v.name, "label": v.label, "unit": v.unit, "source": v.source}
        for v in spec.prior.variables
    ]
    tree = xr.DataTree.from_dict(groups)
    tree.attrs = {"key": key, "sampler": sampler, "variables": json.dumps(variables)}
    tree.to_netcdf(path, engine="h5netcdf")


def read_draws(path: Path, key: str, used: Sequence[str]) -> tuple[list[StageDraws], str] | None:
    """Read the draws of an earlier run back if they belong to the same question.

    Parameters
    ----------
    path : Path
        ``draws.nc`` of an earlier run; may be missing.
    key : str
        From `sampling_key`.
    used : sequence of str
        Variables that limit states use; the gate judges them anew.

    Returns
    -------
    tuple or None
        The stages and the sampler's name; None where there is nothing to read back.
    """
    if not path.is_file():
        return None
    import xarray as xr

    try:
        with xr.open_datatree(path, engine="h5netcdf") as tree:
            if tree.attrs.get("key") != key:
                return None
            stages = [_stage(tree[name], used) for name in sorted(tree.children)]
            return stages, str(tree.attrs["sampler"])
    except (OSError, KeyError, ValueError):
        # A file that cannot be read is no earlier run: sample again.
        return None


def _stage(node: Any, used: Sequence[str]) -> StageDraws:
    """Rebuild one stage from its group."""
    names = tuple(str(name) for name in node["variable"].to_numpy())
    physical = node["physical"].to_numpy()
    number = int(node.name)
    divergences = int(node.attrs["divergences"])
    diagnostics = diagnose(physical, names, used, divergences)
    name = str(node.attrs["stage"])
    if number == 0 and name == PRIOR:
        diagnostics = diagnostics.without_judgement()
    return StageDraws(
        name,
        str(node.attrs["date"]),
        number,
        names,
        node["whitened"].to_numpy(),
        physical,
        node["log_likelihood"].to_numpy(),
        divergences,
        bool(node.attrs["retried"]),
        diagnostics,
    )


def write_reliability(record: RunRecord, path: Path) -> None:
    """Write all index curves of a run as one netCDF file.

    Parameters
    ----------
    record : RunRecord
        What was found.
    path : Path
        File to write: one group for each kind of curve (``annual``, ``cumulative``,
        ``reference``, and ``independent`` with the dependence dropped), its arrays over
        ``result`` (a section at a stage under an option, named by coordinates) and ``year``.
    """
    import xarray as xr

    groups: dict[str, Any] = {}
    for kind in ("annual", "cumulative", "reference", "independent"):
        chosen = [item for item in record.results if getattr(item, kind) is not None]
        if not chosen:
            continue
        curves: list[IndexCurve] = [getattr(item, kind) for item in chosen]
        groups[f"/{kind}"] = xr.Dataset(
            {
                name: (("result", "year"), np.stack([getattr(curve, name) for curve in curves]))
                for name in CURVES
            },
            coords={
                "year": curves[0].year,
                **{
                    name: ("result", [getattr(item, name) for item in chosen])
                    for name in ("section", "stage", "option")
                },
            },
        )
    xr.DataTree.from_dict(groups).to_netcdf(path, engine="h5netcdf")


def write_run(record: RunRecord, path: Path) -> None:
    """Write how the run came about: inputs, versions, seed, diagnostics, timings, verdicts."""
    content: Mapping[str, Any] = {
        "title": record.title,
        "target": asdict(record.target),
        "provenance": asdict(record.provenance),
        "accepted_unconverged": record.accepted_unconverged,
        "stages": [asdict(stage) for stage in record.stages],
        "verdicts": [
            {
                "section": item.section,
                "stage": item.stage,
                "option": item.option,
                "index_now": float(item.reference.index[0]),
                "error": float(item.reference.error[0]),
                **asdict(item.verdict),
                "sensitivities": dict(item.sensitivities),
                "capacity_evaluations": item.evaluations,
                "note": item.note,
            }
            for item in record.results
        ],
        "doubts": list(record.doubts),
        "conflicts": [asdict(conflict) for conflict in record.conflicts],
    }
    path.write_text(json.dumps(content, indent=2, default=_plain) + "\n", encoding="utf-8")


def _plain(value: object) -> object:
    """Turn what JSON does not know into what it does."""
    if isinstance(value, np.generic):
        return value.item()
    if isinstance(value, Mapping):
        return dict(value)
    return str(value)
