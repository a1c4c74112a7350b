import pytest

from assess.errors import AssessError, CaseError, Fault, NotConvergedError


def test_fault_says_place_and_remedy() -> None:
    fault = Fault("case.yaml", 3, "no such grade", "C36", "C25, C35", "did you mean 'C35'?")
    assert str(fault) == (
        "case.yaml:3: no such grade, given C36, allowed C25, C35, did you mean 'C35'?"
    )


def test_fault_of_a_whole_file_has_no_line_and_no_empty_parts() -> None:
    assert str(Fault("cores.csv", 0, "the table is empty")) == "cores.csv: the table is empty"


def test_case_error_lists_all_faults_in_order_of_place() -> None:
    later, earlier = Fault("case.yaml", 12, "second"), Fault("case.yaml", 3, "first")
    with pytest.raises(CaseError, match="case.yaml:3: first\ncase.yaml:12: second") as caught:
        raise CaseError([later, earlier])
    assert caught.value.faults == (earlier, later)
    assert isinstance(caught.value, AssessError)


def test_not_converged_names_stage_and_failures() -> None:
    with pytest.raises(NotConvergedError, match="stage '2019' has not converged: R-hat 1.2; ESS"):
        raise NotConvergedError("2019", ["R-hat 1.2", "ESS 80"])
