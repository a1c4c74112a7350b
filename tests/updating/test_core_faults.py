"""Cores outside ACI 214.4R-10: diameters 50 to 150 mm with 5 %, length over diameter 1 to 2.1."""

import pytest

from assess.updating.kinds import KINDS
from tests.verification import cases

CORES = KINDS["cores"]
HEAD = "location,strength [MPa],diameter [mm],length [mm],moisture\n"


def _case(make_case, rows, correction="ACI 214.4R", head=HEAD):
    entry = {"table": "cores.csv", "zone": "deck", "correction": correction}
    case = cases.base(surveys=[{"date": "2020-01-01", "cores": entry}])
    return make_case(case, {"cores.csv": head + rows})


@pytest.mark.parametrize(
    ("row", "message"),
    [
        ("a,40,200,400,soaked", "the core's diameter .* given 200 mm, allowed 47.5 to 157.5 mm, "),
        ("a,40,40,80,soaked", "the core's diameter .* given 40 mm, allowed 47.5 to 157.5 mm, "),
        (
            "a,40,100,250,soaked",
            "length over diameter .* given 2.5, allowed 1 to 2.1, leave it out",
        ),
        ("a,40,100,60,soaked", "given 0.6, allowed 1 to 2.1, are length and diameter swapped"),
        ("a,40,100,30,soaked", "given 0.3, allowed 1 to 2.1, leave it out, or correct .*: none"),
    ],
)
def test_a_core_that_has_no_factors_is_a_fault_in_its_line(make_case, row, message):
    (fault,) = CORES.faults(_case(make_case, f"b,40,100,200,soaked\n{row}\n"))
    assert fault.file.endswith("cores.csv")
    assert fault.line == 3
    with pytest.raises(ValueError, match=message):
        raise ValueError(str(fault))


def test_what_is_no_fault_can_be_corrected(make_case):
    rows = "a,40,47.5,47.5,soaked\nb,40,157.5,330.7,soaked\nc,40,100,100,soaked\n"
    case = _case(make_case, rows)
    assert list(CORES.faults(case)) == []
    assert CORES.rows(case).value.shape == (3,)


def test_cores_that_are_corrected_already_may_have_any_shape(make_case):
    assert list(CORES.faults(_case(make_case, "a,40,200,400,soaked\n", "none"))) == []


def test_the_range_is_given_in_the_unit_of_the_header(make_case):
    head = HEAD.replace("diameter [mm]", "diameter [in]")
    (fault,) = CORES.faults(
        _case(make_case, "a,40,8,400,soaked\nb,40,4,200,soaked\nc,40,4,200,soaked\n", head=head)
    )
    assert (fault.given, fault.allowed) == ("8 in", "1.87 to 6.20079 in")


def test_many_such_cores_are_counted(make_case):
    found = CORES.faults(_case(make_case, "a,40,200,400,soaked\n" * 9))
    assert len(found) == 6
    assert found[-1].what == "from here on 4 more cores that cannot be corrected"
