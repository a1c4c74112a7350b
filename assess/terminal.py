"""What a run shows on the terminal: the part at work, a bar, the table at the end."""

import sys
import threading
from pathlib import Path
from types import TracebackType
from typing import Self

from rich.console import Console
from rich.progress import BarColumn, Progress, SpinnerColumn, TextColumn, TimeElapsedColumn
from rich.table import Table

from assess.decisions.options import LEAVE
from assess.decisions.results import RunRecord, SectionResult, Standing

# Short enough for a table in 100 columns; the report has them in full.
SHORT = {
    Standing.MEETS: "meets it through the horizon",
    Standing.MEETS_UNTIL: "meets it until {year}",
    Standing.BELOW_LIMITABLE: "below; load x {factor:.2f} would meet it now",
    Standing.BELOW: "below it now",
}


class RunScreen:
    """Shows a run; safe to be told things from several threads."""

    def __init__(self) -> None:
        self._console = Console(file=sys.stdout, highlight=False)
        self._progress = Progress(
            SpinnerColumn(),
            TextColumn("{task.description:<42}"),
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
                    self._progress.update(task, completed=1.0)  # type: ignore[arg-type]
                if not self._console.is_terminal:
                    self._console.print(what)
                if what == "done":
                    return
                self._tasks[what] = self._progress.add_task(what, total=1.0)
            self._progress.update(self._tasks[what], completed=share)  # type: ignore[arg-type]

    def show(self, record: RunRecord, report: Path) -> None:
        """Print the verdicts and where the report is."""
        console = self._console
        wanted = record.target
        table = Table(title=f"{record.title}: sections, nothing done", title_justify="left")
        for header in ("section", "index before", "index after", "5-95 %", "target", "verdict"):
            table.add_column(
                header, justify="left" if header in {"section", "verdict"} else "right"
            )
        first, last = record.stages[0].name, record.stages[-1].name
        for item in record.results:
            if item.stage == last and item.option == LEAVE:
                table.add_row(*_row(item, record.result(item.section, first), wanted.index))
        console.print(table)
        console.print(
            f"Index of {wanted.period} year{'s' if wanted.period > 1 else ''} in "
            f"{record.assessed}; target: {wanted.set_name}, {wanted.class_name}."
        )
        if record.accepted_unconverged:
            console.print("NOT CONVERGED: these figures must not be relied on.")
        if record.doubts:
            console.print(f"{len(record.doubts)} doubtful data are listed in the report.")
        console.print(f"Report: {report}", soft_wrap=True)


def _row(item: SectionResult, before: SectionResult, target: float) -> list[str]:
    curve = item.reference
    verdict = item.verdict
    words = SHORT[verdict.standing].format(
        year=verdict.crossing_year, factor=verdict.load_factor or 0.0
    )
    return [
        item.section,
        f"{before.reference.index[0]:.2f}",
        f"{curve.index[0]:.2f} ± {curve.error[0]:.2f}",
        f"{curve.low[0]:.2f} to {curve.high[0]:.2f}",
        f"{target:.2f}",
        words,
    ]
