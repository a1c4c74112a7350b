"""Work on a case in other processes: the same results, whatever becomes of them."""

import os
from pathlib import Path

import pytest

from assess.case.reader import Case
from assess.crew import Crew
from assess.updating.model import Spec, specify
from tests.verification.cases import base, read


def describe(case: Case, spec: Spec, word: str) -> tuple[str, int, str, int]:
    """Say something of the case, and where that was said."""
    return case.spec.structure.name, len(spec.prior.names), word, os.getpid()


def end_abruptly(case: Case, spec: Spec, pid: int) -> str:
    """End the process, if it is not the one named."""
    if os.getpid() != pid:
        os._exit(9)
    return "done here"


@pytest.fixture
def case(tmp_path: Path) -> Case:
    return read(tmp_path, base())


def test_another_process_knows_the_same_case(case: Case) -> None:
    spec = specify(case)
    with Crew(case, spec, processes=1) as crew:
        running = [crew.submit(describe, f"task {k}") for k in range(2)]
        while not running[0]._future.done():  # noqa: SLF001 - nobody else is to begin it
            pass
        name, variables, word, pid = running[0].result()
    assert (name, variables, word) == ("Test", len(spec.prior.names), "task 0")
    assert pid != os.getpid()


def test_who_asks_before_anyone_began_does_it_himself(case: Case) -> None:
    with Crew(case, specify(case), processes=0) as crew:
        task = crew.submit(describe, "alone")
        assert task.result()[2:] == ("alone", os.getpid())
        assert task.result() is task.result()


def test_what_a_lost_process_had_is_done_here(case: Case) -> None:
    with Crew(case, specify(case), processes=1) as crew:
        tasks = [crew.submit(end_abruptly, os.getpid()) for _ in range(4)]
        assert [task.result() for task in tasks] == ["done here"] * 4
        assert crew.submit(end_abruptly, os.getpid()).result() == "done here"


def test_a_case_that_was_changed_meanwhile_is_not_read_again(
    case: Case, capfd: pytest.CaptureFixture[str]
) -> None:
    text = case.path.read_text(encoding="utf-8")
    case.path.write_text(text.replace("name: Test", "name: Other"), encoding="utf-8")
    with Crew(case, specify(case), processes=1) as crew:
        tasks = [crew.submit(describe, "late") for _ in range(3)]
        assert {task.result()[0] for task in tasks} == {"Test"}
