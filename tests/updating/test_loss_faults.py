import pytest

from assess.updating.kinds import KINDS
from tests.verification import cases

LOSS = KINDS["section_loss"]
HEAD = "location,original diameter [mm],residual diameter [mm]\n"


def _case(make_case, first, second, limit="0.1 mm"):
    surveys = [
        {"date": "2012-01-01", "section_loss": cases.loss_entry("first.csv")},
        {"date": "2020-01-01", "section_loss": cases.loss_entry("second.csv", limit)},
    ]
    tables = {"first.csv": HEAD + first, "second.csv": HEAD + second}
    return make_case(cases.base(corrosion=True, surveys=surveys), tables)


def test_a_loss_that_healed_is_a_fault_in_the_line_of_the_later_row(make_case):
    case = _case(make_case, "B1,32,none\nB2,32,31\n", "B1,32,31\nB3,32,none\nB2,32,none\n")
    (fault,) = LOSS.faults(case)
    assert fault.file.endswith("second.csv")
    assert fault.line == 4
    assert fault.given == "deck: B2"
    assert "first.csv:3; give the two break-outs different locations" in fault.mend


def test_a_less_keen_look_denies_nothing(make_case):
    assert list(LOSS.faults(_case(make_case, "B2,32,31\n", "B2,32,none\n", "2 mm"))) == []


def test_a_zone_without_corrosion_is_named_in_the_line_of_its_first_row(make_case):
    case = cases.base(
        corrosion=True,
        surveys=[{"date": "2020-01-01", "section_loss": {**cases.loss_entry("a.csv")}}],
    )
    case["zones"]["sound"] = cases.base()["zones"]["deck"]
    del case["surveys"][0]["section_loss"]["zone"]
    table = "zone,original diameter [mm],residual diameter [mm]\ndeck,32,31\nsound,32,none\n"
    (fault,) = LOSS.faults(make_case(case, {"a.csv": table}))
    assert (fault.line, fault.given) == (3, "sound")


def test_outliers_are_looked_for_in_found_losses_not_in_what_is_left(make_case):
    # What is left differs with the bar; the loss of one bar is ten times that of the others.
    rows = "".join(f"B{i},{d},{d - 0.6 - 0.02 * i}\n" for i, d in enumerate([12, 16, 20, 25] * 2))
    case = _case(make_case, rows + "B9,32,25\nB10,32,31.95\nB11,32,none\n", "B20,32,31\n")
    (one, _) = case.evidence
    judged = LOSS.form.judged
    assert judged is not None
    loss = judged.of(one.entry, one.table)
    # Below twice the detection limit of 0.1 mm of radius it counts as none found.
    assert loss[:9] == pytest.approx([0.6 + 0.02 * i for i in range(8)] + [7.0])
    assert all(value != value for value in loss[9:])
    assert LOSS.form.log_scale
