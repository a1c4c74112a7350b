"""Benchmarks, `make bench`: ratios measured in one run, with the seconds beside them.

1. A cold `assess run` of the demonstration case over what importing PyMC, compiling and sampling
   the same model alone take. Both in fresh processes, one after the other.
2. The reliability of one section over 30 years with 4,000 draws at an integration error of 0.01.
"""

import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
CASE = ROOT / "configs" / "aldermoor.yaml"

# In a process of its own: nothing but PyMC, the model, and the sampler at every stage.
SAMPLING_ALONE = """
import sys, time
begun = time.perf_counter()
import pymc
imported = time.perf_counter()
from pathlib import Path
from assess.pipeline import _settings, check_case
from assess.updating.model import specify
from assess.updating.sampling import compile_sampler
case = check_case(Path(sys.argv[1])).case
spec = specify(case)
settings = _settings(case, None)
reading = time.perf_counter() - imported
sampler = compile_sampler(spec, len(case.stages))
compiled = time.perf_counter()
for stage in range(1, len(case.stages) + 1):
    sampler.sample(stage, settings, lambda share: None)
ended = time.perf_counter()
print(imported - begun, compiled - imported - reading, ended - compiled)
"""


def _fresh(arguments: list[str], folder: Path) -> tuple[float, str]:
    """Run a process; give its wall time and what it printed."""
    begun = time.perf_counter()
    done = subprocess.run(arguments, cwd=folder, capture_output=True, text=True, check=False)
    if done.returncode:
        raise SystemExit(f"{' '.join(arguments[:3])} failed:\n{done.stdout}\n{done.stderr}")
    return time.perf_counter() - begun, done.stdout


def bench_run() -> str:
    """Compare a cold run of the demonstration with sampling alone."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        alone, said = _fresh([sys.executable, "-c", SAMPLING_ALONE, str(CASE)], folder)
        imported, compiled, sampled = (float(word) for word in said.split()[-3:])
        base = imported + compiled + sampled
        program = "import sys; from assess.cli import main; sys.exit(main(sys.argv[1:]))"
        whole, _ = _fresh(
            [sys.executable, "-c", program, "run", str(CASE), "--out", str(folder / "out")],
            folder,
        )
    return (
        f"cold run of {CASE.name}: {whole:.1f} s; import {imported:.1f} + compile {compiled:.1f} + "
        f"sample {sampled:.1f} = {base:.1f} s alone (process {alone:.1f} s); "
        f"ratio {whole / base:.2f} (asked: at most 1.6)"
    )


def bench_section() -> str:
    """Time one section: 4,000 draws, 30 years, integration error 0.01."""
    from assess.decisions.sections import used_variables
    from assess.pipeline import _settings, check_case
    from assess.reliability.limit_state import Action
    from assess.reliability.problem import section_state
    from assess.reliability.section import Precision, section_reliability
    from assess.updating.model import specify
    from assess.updating.stages import prior_draws

    case = check_case(CASE).case
    if case is None:
        raise SystemExit("the demonstration case has faults")
    spec = specify(case)
    settings = _settings(case, None)
    draws = prior_draws(spec, settings, used_variables(case))
    seconds, worst = [], 0.0
    for entry in case.spec.sections().values():
        begun = time.perf_counter()
        state = section_state(case, spec, entry, 0, draws.values())
        found = section_reliability(
            case, state, Action(), 1, Precision(settings.chains, 0.01, settings.seed)
        )
        seconds.append(time.perf_counter() - begun)
        worst = max(worst, float(found.annual.integration_error.max()))
    return (
        f"one section, {settings.chains * settings.draws} draws, {case.spec.structure.horizon} "
        f"years, {len(seconds)} sections in turn: {min(seconds):.2f} to {max(seconds):.2f} s each, "
        f"largest integration error {worst:.4f} (asked: under 2 s at 0.01)"
    )


if __name__ == "__main__":
    for line in (bench_section(), bench_run()):
        sys.stdout.write(line + "\n")
        sys.stdout.flush()
