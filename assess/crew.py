"""Processes that work on the sections of a case while the sampler runs in this one.

Building the sampler is Python code from end to end, which threads beside it would slow down and
be slowed down by. Each process reads the case itself: the classes that hold a case are built
while running, so that a case cannot be sent.
"""

import multiprocessing
import os
import signal
from collections.abc import Callable
from concurrent.futures import Future, ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from assess.case.reader import Case, read_case
from assess.updating.model import Spec, specify
from assess.vocabulary import vocabulary

MOST_PROCESSES = 4


class Task[T]:
    """Something under way, or waiting for somebody to begin it."""

    def __init__(self, future: Future[T], here: Callable[[], T]) -> None:
        self._future = future
        self._here = here

    def begin_here(self) -> None:
        """Do it in this process, unless another has it already."""
        if self._future.cancel():
            self._future = Future()
            self._future.set_result(self._here())

    def result(self) -> T:
        """Give the result, once it is there."""
        self.begin_here()
        try:
            return self._future.result()
        except BrokenProcessPool:
            return self._here()


class Crew:
    """Works on one case in a few processes, or in this one where there is one processor.

    Parameters
    ----------
    case, spec : Case, Spec
        The case and its measurements.
    processes : int, optional
        How many besides this one; by default one for each further processor, up to
        `MOST_PROCESSES`.

    Notes
    -----
    Results do not depend on where they come from. A process that ends early (killed for want of
    memory, or a script that starts a run without asking whether it is the main one) costs time
    only: its work is done in this process.
    """

    def __init__(self, case: Case, spec: Spec, processes: int | None = None) -> None:
        self._case, self._spec = case, spec
        count = min(MOST_PROCESSES, (os.cpu_count() or 1) - 1) if processes is None else processes
        self._pool = None
        if count > 0 and not multiprocessing.current_process().daemon:
            self._pool = ProcessPoolExecutor(
                count,
                mp_context=multiprocessing.get_context("spawn"),
                initializer=_begin,
                initargs=(case.path, case.inputs),
            )

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        if self._pool is not None:
            self._pool.shutdown(wait=kind is None, cancel_futures=True)

    def submit[T](self, work: Callable[..., T], *arguments: Any, **named: Any) -> Task[T]:
        """Set ``work(case, spec, *arguments, **named)`` going.

        Parameters
        ----------
        work : callable
            A function of a module; it and its arguments are pickled.

        Returns
        -------
        Task
            Gives the result when asked.
        """

        def here() -> T:
            return work(self._case, self._spec, *arguments, **named)

        if self._pool is None:
            return Task(Future(), here)
        try:
            return Task(self._pool.submit(_do, work, arguments, named), here)
        except BrokenProcessPool:
            return Task(Future(), here)


_HELD: list[tuple[Case, Spec]] = []  # in a process of the crew: the case that it works on


def _begin(path: Path, inputs: dict[str, str]) -> None:
    """Read the case in a new process."""
    # An interrupt is for the process that was started by a person; it ends the others.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    case = read_case(path, vocabulary()).case
    if case is None or case.inputs != inputs:
        raise RuntimeError(f"{path} or one of its tables was changed while it was being worked on")
    _HELD.append((case, specify(case)))


def _do[T](work: Callable[..., T], arguments: tuple[Any, ...], named: dict[str, Any]) -> T:
    case, spec = _HELD[-1]
    return work(case, spec, *arguments, **named)
