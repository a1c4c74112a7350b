"""Run the whole verification: `python -m tests.verification`, or `make verify`.

Prints every comparison, writes reports/verification.html, and fails if any comparison does.
"""

import sys
import tempfile
import time
from pathlib import Path

from tests.verification.check import Check, plain_table
from tests.verification.groups import GROUPS
from tests.verification.page import page

REPORT = Path(__file__).resolve().parents[2] / "reports" / "verification.html"


def main() -> int:
    """Run all groups; 0 if every check passed, else 1."""
    done: list[tuple[str, list[Check], float]] = []
    with tempfile.TemporaryDirectory() as folder:
        for number, (title, group) in enumerate(GROUPS.items()):
            begun = time.perf_counter()
            checks = list(group(Path(folder) / str(number)))
            seconds = time.perf_counter() - begun
            done.append((title, checks, seconds))
            _say(f"\n{title} ({seconds:.0f} s)\n\n{plain_table(checks)}")
    REPORT.parent.mkdir(exist_ok=True)
    REPORT.write_text(page(done), encoding="utf-8")
    failed = sum(not check.passed for _, checks, _ in done for check in checks)
    passed = sum(len(checks) for _, checks, _ in done) - failed
    _say(f"\nreport: {REPORT.relative_to(REPORT.parents[1])}")
    _say(f"{passed} passed, {failed} failed")
    return 1 if failed else 0


def _say(text: str) -> None:
    sys.stdout.write(text + "\n")
    sys.stdout.flush()


if __name__ == "__main__":
    sys.exit(main())
