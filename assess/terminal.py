"""What a run shows on the terminal: the part at work, a bar, the table at the end."""

import sys
import threading
from collections.abc import Iterator
from pathlib import Path
from types import TracebackType
from typing import Self

from rich.console import Console, JustifyMethod
from rich.progress import BarColumn, Progress, SpinnerColumn, TextColumn, TimeElapsedColumn
from rich.table import Table

from assess.decisions.options import LEAVE
from assess.decisions.results import RunRecord, SectionResult, Standing
from assess.report import numbers

# Short enough for a table in 100 columns; the report has them in full.
SHORT = {
    Standing.MEETS: "meets target through {last}",
    Standing.MEETS_UNTIL: "meets target until {year}",
    Standing.BELOW_LIMITABLE: "below; load x {factor:.2f} meets it",
    Standing.BELOW: "below target now",
}


class RunScreen:
    """Shows a run; safe to be told things from several threads."""

    def __init__(self) -> None:
        self._console = Console(file=sys.stdout, highlight=False, markup=False)
        self._progress = Progress(
            SpinnerColumn(),
            TextColumn("{task.description:<42}", markup=False),
            BarColumn(bar_width=30),
            TimeElapsedColumn(),
            console=self._console,
            transient=False,
            disable=not self._console.is_terminal,
        )
        self._tasks: dict[str, int] = {}
        self._lock = threading.Lock()

    def __enter__(self) -> Self:
        self._progress.start()
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._progress.stop()

    def observe(self, what: str, share: float) -> None:
        """Take note of what runs and how far it is."""
        with self._lock:
            if what not in self._tasks:
                for task in self._tasks.values():
                    self._progress.update(task, total=1.0, completed=1.0)  # type: ignore[arg-type]
                if not self._console.is_terminal:
                    self._console.print(what)
                if what == "done":
                    return
                self._tasks[what] = self._progress.add_task(what, total=None)
            if share > 0.0:  # until then the bar only shows that something goes on
                self._progress.update(self._tasks[what], total=1.0, completed=share)  # type: ignore[arg-type]

    def show(self, record: RunRecord, report: Path) -> None:
        """Print the verdicts and where the report is."""
        console = self._console
        wanted = record.target
        first, last = record.stages[0].name, record.stages[-1].name
        kept = [r for r in record.results if (r.stage, r.option) == (last, LEAVE)]
        table = Table(title=f"{record.title}: sections, nothing done", title_justify="left")
        surveyed = first != last
        indices = ("before", "after") if surveyed else ("index",)
        headers = ("section", *indices, "5-95 %", "target", "verdict")
        for header in headers:
            side: JustifyMethod = "left" if header in {"section", "verdict"} else "right"
            # Names are folded where there is no room: a shortened one may be another's.
            table.add_column(header, justify=side, overflow="fold", no_wrap=side == "right")
        for item in kept:
            before = record.result(item.section, first) if surveyed else None
            table.add_row(*_row(item, before, wanted.index))
        console.print(table)
        end = f" to {record.assessed + wanted.period - 1}" if wanted.period > 1 else ""
        console.print(
            f"Reliability index of {record.assessed}{end}, "
            f"{'before and after the surveys' if surveyed else 'no survey counted'}; 5-95 %: "
            "range of the index were the variables known that a zone shares."
        )
        console.print(
            f"Target {wanted.index:.2f} for {_years(wanted.period)}: {wanted.set_name}, "
            f"{wanted.class_name}."
        )
        for line in _options(record, last):
            console.print(line)
        if record.accepted_unconverged:
            console.print("NOT CONVERGED: these figures must not be relied on.")
        if record.doubts:
            console.print(f"Doubtful data: {len(record.doubts)}, listed in the report.")
        console.print(f"Report: {report}", soft_wrap=True)


def _years(count: int) -> str:
    return "one year" if count == 1 else f"{count} years"


def _row(item: SectionResult, before: SectionResult | None, target: float) -> list[str]:
    curve = item.reference
    verdict = item.verdict
    words = SHORT[verdict.standing].format(
        # `crossing_year` is the first year below
        year=(verdict.crossing_year or 0) - 1,
        last=int(curve.year[-1]),
        factor=verdict.load_factor or 0.0,
    )
    return [
        item.section,
        *([] if before is None else [f"{before.reference.index[0]:.2f}"]),
        numbers.index_with_error(float(curve.index[0]), float(curve.error[0])).replace(
            numbers.NO_BREAK, " "
        ),
        f"{curve.low[0]:.2f} to {curve.high[0]:.2f}",
        f"{target:.2f}",
        words,
    ]


def _options(record: RunRecord, stage: str) -> Iterator[str]:
    """Say for each option how many sections meet the target."""
    for name in dict.fromkeys(item.option for item in record.results if item.option != LEAVE):
        kept = [item for item in record.results if (item.stage, item.option) == (stage, name)]
        meeting = sum(item.verdict.standing is Standing.MEETS for item in kept)
        yield f"{name}: {meeting} of {len(kept)} sections meet the target through the horizon."
