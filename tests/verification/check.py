"""One comparison of the verification, and the plain table of all of them."""

from collections.abc import Sequence
from dataclasses import dataclass

MEMORY = "from memory"
RECOMPUTED = "recomputed independently"
SEEN = "read in a secondary source"


@dataclass(frozen=True, slots=True)
class Check:
    """A value that the tool computed beside the one it is to have.

    ``expected`` None stands for a bound: ``computed`` is to lie within ``tolerance`` of zero,
    or above it where ``at_least``.
    """

    source: str
    place: str
    quantity: str
    expected: float | None
    computed: float
    tolerance: float
    origin: str = RECOMPUTED  # of the expected value
    at_least: bool = False
    note: str = ""

    @property
    def difference(self) -> float:
        """Computed less expected."""
        return self.computed - (self.expected or 0.0)

    @property
    def passed(self) -> bool:
        """Whether the comparison holds; a value that is no number never does."""
        if self.at_least:
            return self.computed >= self.tolerance
        return abs(self.difference) <= self.tolerance

    def cells(self) -> tuple[str, ...]:
        """Give the row as text."""
        bound = f"at least {_short(self.tolerance)}" if self.at_least else _short(self.tolerance)
        return (
            "ok" if self.passed else "FAILED",
            self.source,
            self.place,
            self.quantity,
            "" if self.expected is None else _number(self.expected),
            _number(self.computed),
            "" if self.at_least or self.expected is None else _short(self.difference),
            bound,
            self.origin,
            self.note,
        )


HEAD = (
    "",
    "Source",
    "Place",
    "Quantity",
    "Published",
    "Computed",
    "Difference",
    "Tolerance",
    "Published value",
    "Note",
)
NUMBERS = frozenset({4, 5, 6, 7})  # columns set flush right


def _number(value: float) -> str:
    return f"{value:.6g}"


def _short(value: float) -> str:
    return f"{value:.2g}"


def plain_table(checks: Sequence[Check]) -> str:
    """Set all checks as text in aligned columns."""
    rows = [HEAD, *(check.cells() for check in checks)]
    widths = [max(len(row[k]) for row in rows) for k in range(len(HEAD))]
    lines = []
    for row in rows:
        cells = [
            cell.rjust(width) if k in NUMBERS else cell.ljust(width)
            for k, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        lines.append("  ".join(cells).rstrip())
    return "\n".join(lines)
