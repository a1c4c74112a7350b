"""The house: which package may import which, and what loads nothing heavy."""

import ast
import subprocess
import sys
from collections.abc import Iterator, Mapping
from pathlib import Path

import pytest

import assess
from assess.starter import write_starter

ROOT = Path(assess.__file__).parent
# Each may import those of the lines above it, and itself. Those of one line stay apart.
FLOORS = (
    ("errors", "units", "operations"),
    ("probability", "mechanics"),
    ("case",),
    ("updating",),
    ("reliability",),
    ("decisions",),
    ("report",),
    ("vocabulary", "store", "input_checks", "recording"),
    ("crew",),
    ("pipeline", "starter", "terminal"),
    ("cli",),
)
FLOOR = {name: number for number, names in enumerate(FLOORS) for name in names}
MOST_LINES = 500
HEAVY = ("pymc", "pytensor", "nutpie", "matplotlib", "arviz", "arviz_stats", "xarray")


def sources() -> dict[str, str]:
    """Give the text of every module by its dotted name."""
    found = {}
    for path in sorted(ROOT.rglob("*.py")):
        parts = path.relative_to(ROOT.parent).with_suffix("").parts
        name = ".".join(parts).removesuffix(".__init__")
        found[name] = path.read_text(encoding="utf-8")
    return found


def imported(tree: ast.AST, modules: set[str]) -> Iterator[tuple[int, str]]:
    """Go through what is imported anywhere in a module, in functions too: line, dotted name."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from ((node.lineno, alias.name) for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and not node.level:
            for alias in node.names:
                inner = f"{node.module}.{alias.name}"
                yield node.lineno, inner if inner in modules else str(node.module)


def violations(modules: Mapping[str, str]) -> list[str]:
    """Find everything in modules (text by dotted name) that the house forbids."""
    names = set(modules) | {f"assess.{name}" for name in FLOOR}
    found = []
    for module, text in modules.items():
        if (length := len(text.splitlines())) > MOST_LINES:
            found.append(f"{module}: {length} lines")
        part = module.split(".")[1] if "." in module else ""
        if part and part not in FLOOR:
            found.append(f"{module}: stands on no floor")
            continue
        tree = ast.parse(text)
        for node in ast.walk(tree):
            if isinstance(node, ast.ImportFrom) and node.level:
                found.append(f"{module}:{node.lineno}: relative import")
            if isinstance(node, ast.Name) and node.id == "print":
                found.append(f"{module}:{node.lineno}: print")
        for line, name in imported(tree, names):
            root, _, rest = name.partition(".")
            if root != "assess" or not part:
                continue
            other = rest.split(".")[0]
            if other != part and FLOOR.get(other, len(FLOORS)) >= FLOOR[part]:
                found.append(f"{module}:{line}: imports {name}")
    return found


def test_the_house_stands() -> None:
    assert violations(sources()) == []


def test_all_modules_are_looked_at() -> None:
    modules = sources()
    assert {name.split(".")[1] for name in modules if "." in name} == set(FLOOR)
    assert len(modules) > 80


@pytest.mark.parametrize(
    ("module", "text", "complaint"),
    [
        ("assess.case.x", "import assess.updating.model", "imports assess.updating.model"),
        ("assess.case.x", "from assess.report import html", "imports assess.report"),
        ("assess.mechanics.x", "from assess import probability", "imports assess.probability"),
        ("assess.probability.x", "from assess.mechanics.bending import f", "imports assess.mech"),
        ("assess.store", "from assess.pipeline import run_case", "imports assess.pipeline"),
        ("assess.units", "import assess", "imports assess"),
        (
            "assess.updating.x",
            "def f():\n    from assess.decisions.targets import target",
            "x:2: imports assess.decisions.targets",
        ),
        ("assess.case.x", "from . import spec", "relative import"),
        ("assess.case.x", "from .spec import Zone", "relative import"),
        ("assess.case.x", "def f():\n    print('x')", "x:2: print"),
        ("assess.case.x", "\n" * 501, "501 lines"),
        ("assess.attic", "", "no floor"),
    ],
)
def test_a_violation_is_found(module: str, text: str, complaint: str) -> None:
    (found,) = violations({module: text})
    assert complaint in found


def test_what_is_allowed_is_not_complained_of() -> None:
    text = "import assess.units\nfrom assess import operations\nfrom assess.probability import x"
    assert violations({"assess.case.x": text, "assess.cli": "from assess import store"}) == []


def heavy_after(code: str, folder: Path) -> str:
    """Run code in a fresh interpreter and name the heavy packages that it loaded."""
    code += f"\nimport sys\nsys.stderr.write(','.join(m for m in {HEAVY!r} if m in sys.modules))"
    run = subprocess.run(
        [sys.executable, "-c", code], cwd=folder, capture_output=True, text=True, check=True
    )
    return run.stderr


def test_help_and_check_load_nothing_heavy(tmp_path: Path) -> None:
    write_starter("bridge", tmp_path)
    code = """
from assess.cli import main
try:
    main(["--help"])
except SystemExit as end:
    assert end.code == 0
assert main(["check", "configs/bridge.yaml"]) == 0
assert main(["schema", "--out", "schema.json"]) == 0
"""
    assert heavy_after(code, tmp_path) == ""


def test_formulas_load_nothing_heavy(tmp_path: Path) -> None:
    parts = ("assess.mechanics.", "assess.probability.")
    modules = [name for name in sources() if name.startswith(parts)]
    assert len(modules) > 12
    assert heavy_after("\n".join(f"import {name}" for name in modules), tmp_path) == ""


def test_heavy_packages_are_noticed(tmp_path: Path) -> None:
    assert heavy_after("import xarray", tmp_path) == "xarray"
