"""Run the verification: `python -m tests.verification [WORDS...]`, or `make verify` for all of it.

Prints every comparison and fails if any comparison does. Words pick the groups whose title has
one of them; the whole verification writes reports/verification.html.
"""

import sys
import tempfile
import time
from collections.abc import Sequence
from pathlib import Path

from tests.verification.check import Check, plain_table
from tests.verification.groups import GROUPS, SLOW
from tests.verification.page import page

REPORT = Path(__file__).resolve().parents[2] / "reports" / "verification.html"


def main(words: Sequence[str] = ()) -> int:
    """Run the groups that the words pick, or all; 0 if every check passed, else 1."""
    chosen = {
        title: group
        for title, group in GROUPS.items()
        if (any(word.lower() in title.lower() for word in words) if words else title not in SLOW)
    }
    if not chosen:
        _say("no group has one of these words; groups: " + "; ".join(GROUPS))
        return 2
    done: list[tuple[str, list[Check], float]] = []
    with tempfile.TemporaryDirectory() as folder:
        for number, (title, group) in enumerate(chosen.items()):
            begun = time.perf_counter()
            checks = list(group(Path(folder) / str(number)))
            seconds = time.perf_counter() - begun
            done.append((title, checks, seconds))
            _say(f"\n{title} ({seconds:.0f} s)\n\n{plain_table(checks)}")
    if not words:
        for title in sorted(SLOW):
            _say(f"not run, slow; ask for it by name: {title}")
        REPORT.parent.mkdir(exist_ok=True)
        REPORT.write_text(page(done), encoding="utf-8")
        _say(f"\nreport: {REPORT.relative_to(REPORT.parents[1])}")
    failed = sum(not check.passed for _, checks, _ in done for check in checks)
    passed = sum(len(checks) for _, checks, _ in done) - failed
    _say(f"{passed} passed, {failed} failed")
    return 1 if failed else 0


def _say(text: str) -> None:
    sys.stdout.write(text + "\n")
    sys.stdout.flush()


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
