"""The verification as one self-contained page."""

from collections.abc import Sequence
from html import escape

from tests.verification.check import HEAD, NUMBERS, Check

_STYLE = """
body { font: 15px/1.45 system-ui, sans-serif; color: #1f2a33; margin: 2rem auto; max-width: 86rem;
  padding: 0 1rem; }
h1 { font-size: 1.5rem; } h2 { font-size: 1.15rem; margin: 2rem 0 .4rem; }
p { max-width: 46rem; }
div { overflow-x: auto; }
table { border-collapse: collapse; font-size: .82rem; font-variant-numeric: tabular-nums; }
th, td { text-align: left; padding: .22rem .8rem .22rem 0; vertical-align: top;
  border-bottom: 1px solid #dde3e8; }
thead th { border-bottom: 1.5px solid #1f2a33; vertical-align: bottom; }
.n { text-align: right; white-space: nowrap; }
.memory { font-style: italic; }
.bad td { background: #fdf1ec; color: #7a2b1d; font-weight: 600; }
"""


def page(groups: Sequence[tuple[str, Sequence[Check], float]]) -> str:
    """Set all groups (title, checks, seconds) as a page."""
    checks = [check for _, group, _ in groups for check in group]
    failed = sum(not check.passed for check in checks)
    memory = sum(check.origin == "from memory" for check in checks)
    parts = [
        "<!doctype html>",
        '<html lang="en"><head><meta charset="utf-8"><title>Verification</title>',
        '<meta name="viewport" content="width=device-width, initial-scale=1">',
        f"<style>{_STYLE}</style></head><body><h1>Verification</h1>",
        f"<p><strong>{len(checks) - failed} passed, {failed} failed.</strong> Every row compares "
        "a value that the tool computed with a published or an independently computed one.</p>",
        f"<p>In {memory} rows, set in italics, the published value was written down from memory: "
        "the number is as safe as the independent computation beside it, its place in the source "
        "wants a look before anybody cites it. “Recomputed independently” means by another "
        "formula or another program than the tool’s; no source prints it.</p>",
    ]
    for title, group, seconds in groups:
        parts.append(f"<h2>{escape(title)}</h2><p>{len(group)} rows, {seconds:.0f} s.</p>")
        parts.append(_table(group))
    parts.append("</body></html>\n")
    return "\n".join(parts)


def _table(checks: Sequence[Check]) -> str:
    head = "".join(
        f'<th scope="col"{_mark(k)}>{escape(name or "Result")}</th>' for k, name in enumerate(HEAD)
    )
    rows = []
    for check in checks:
        kind = [] if check.passed else ["bad"]
        kind += ["memory"] if check.origin == "from memory" else []
        mark = f' class="{" ".join(kind)}"' if kind else ""
        cells = "".join(f"<td{_mark(k)}>{escape(c)}</td>" for k, c in enumerate(check.cells()))
        rows.append(f"<tr{mark}>{cells}</tr>")
    return (
        f"<div><table><thead><tr>{head}</tr></thead><tbody>\n" + "\n".join(rows) + "\n"
        "</tbody></table></div>"
    )


def _mark(column: int) -> str:
    return ' class="n"' if column in NUMBERS else ""
