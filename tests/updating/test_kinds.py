"""The registry of kinds, and a kind that another package brings."""

import os
import subprocess
import sys
from importlib.metadata import EntryPoint
from pathlib import Path

import pytest

import assess
from assess.updating.cores import Cores
from assess.updating.cover import Cover
from assess.updating.kinds import GROUP, KINDS, installed, registry
from tests.verification import cases

# A package as its author would ship it: tension tests of bars' anchorage, say, that read the
# median concrete strength of a zone with a known error.
PLUGIN = '''
"""Evidence: pull-out force over a calibration, as strength."""

import numpy as np
from scipy import stats

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm
from assess.updating.kind import EvidenceKind, build_rows, gather, zone_values


class PullOut(EvidenceKind):
    form = EvidenceForm(
        key="pull_out",
        title="Pull-out strengths",
        entry=EvidenceEntry,
        columns=(Column("strength", "strength by calibration", "MPa", above=0.0),),
        value="strength",
        log_scale=True,
    )
    unit = "MPa"
    log_scale = True
    assumption = "Pull-out strengths scatter by 10 % about the median of their zone."
    carrier = "concrete_mean"

    def rows(self, case):
        items = gather(case, "pull_out")
        if not items:
            return None
        return build_rows(items, [np.log(i.table.numbers["strength"]) for _, i in items], {})

    def data(self, rows, stage):
        return {"pull_out_weight": np.where(rows.stage <= stage, 1.0, 0.0)}

    def log_likelihood(self, rows, values, data):
        mean = op.log(zone_values(rows, values, "concrete_mean"))[..., rows.zone]
        return (data["pull_out_weight"] * -0.5 * ((rows.value - mean) / 0.1) ** 2).sum(axis=-1)

    def simulate(self, rows, values, rng):
        mean = np.log(zone_values(rows, values, "concrete_mean"))[:, rows.zone]
        return mean + 0.1 * rng.standard_normal(mean.shape)

    def local(self, rows, stage, section, zone, values):
        return ()
'''
METADATA = "Metadata-Version: 2.1\nName: assess-pull-out\nVersion: 1.0\n"
SCRIPT = """
import sys
from pathlib import Path
from assess.cli import main
from assess.pipeline import check_case
from assess.updating.model import specify
from assess.updating.sampling import Settings, compile_sampler

path = Path(sys.argv[1])
assert main(["check", str(path)]) == 0
spec = specify(check_case(path).case)
chains = compile_sampler(spec, 1).sample(1, Settings(2, 500, 500, 0.9, 1), lambda _: None)
draws = spec.prior.physical(chains.whitened)
print("MEDIAN", float(draws[..., spec.prior.names.index("deck.concrete_mean")].mean()))
"""


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder that Python takes for one with an installed package."""
    folder = tmp_path_factory.mktemp("site")
    (folder / "pull_out.py").write_text(PLUGIN, encoding="utf-8")
    info = folder / "assess_pull_out-1.0.dist-info"
    info.mkdir()
    (info / "METADATA").write_text(METADATA, encoding="utf-8")
    (info / "entry_points.txt").write_text(
        f"[{GROUP}]\npull_out = pull_out:PullOut\n", encoding="utf-8"
    )
    return folder


def run(site: Path, *arguments: str) -> subprocess.CompletedProcess[str]:
    paths = [str(site), str(Path(assess.__file__).parents[1])]
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(paths)}
    return subprocess.run(
        [sys.executable, *arguments], env=environment, capture_output=True, text=True, check=False
    )


def test_an_installed_package_brings_a_kind_that_teaches_the_model(
    site: Path, tmp_path: Path
) -> None:
    survey = {"date": "2020-01-01", "pull_out": {"table": "a.csv", "zone": "deck"}}
    table = "strength [MPa]\n" + "\n".join(["52"] * 30) + "\n"
    path = cases.write_case(tmp_path, cases.base(surveys=[survey]), {"a.csv": table})
    done = run(site, "-c", SCRIPT, str(path))
    assert done.returncode == 0, done.stderr
    median = float(done.stdout.split("MEDIAN")[1])
    assert median == pytest.approx(52.0, rel=0.05)  # thirty readings outweigh the prior


def test_its_table_is_checked_like_any_other(site: Path, tmp_path: Path) -> None:
    survey = {"date": "2020-01-01", "pull_out": {"table": "a.csv", "zone": "deck"}}
    path = cases.write_case(
        tmp_path, cases.base(surveys=[survey]), {"a.csv": "strength [mm]\n52\n"}
    )
    code = "import sys; from assess.cli import main; sys.exit(main(sys.argv[1:]))"
    done = run(site, "-c", code, "check", str(path))
    assert done.returncode == 2
    assert "does not convert to MPa" in done.stdout + done.stderr


def test_without_the_package_its_key_is_unknown(tmp_path: Path) -> None:
    assert "pull_out" not in KINDS


def test_an_entry_point_must_name_a_kind() -> None:
    point = EntryPoint("wrong", "pathlib:Path", GROUP)
    with pytest.raises(TypeError, match="entry point 'wrong' .* names pathlib:Path"):
        list(installed(iter([point])))


def test_two_kinds_cannot_share_a_key() -> None:
    with pytest.raises(ValueError, match="two kinds of evidence claim the key 'cover'"):
        registry(iter([Cover(), Cores(), Cover()]))


def test_every_kind_of_the_tool_stands_under_its_key() -> None:
    assert all(key == kind.form.key for key, kind in KINDS.items())
