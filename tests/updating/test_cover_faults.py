from assess.updating.kinds import KINDS
from tests.verification import cases

COVER = KINDS["cover"]


def _case(make_case, first, second):
    surveys = [
        {"date": date, "cover": {"table": "cover.csv", "zone": "deck", "meter": meter}}
        for date, meter in (("2012-01-01", first), ("2020-01-01", second))
    ]
    return make_case(cases.base(surveys=surveys), {"cover.csv": "cover [mm]\n40\n"})


def test_a_meter_has_one_bias(make_case):
    other = {**cases.METER_A, "bias": "5 mm"}
    case = _case(make_case, cases.METER_A, other)
    (fault,) = COVER.faults(case)
    text = case.path.read_text(encoding="utf-8").splitlines()
    assert fault.file == str(case.path)
    assert text[fault.line - 1].strip() == "bias: 5 mm"
    first = next(n for n, line in enumerate(text, start=1) if line.strip() == "bias: 2 mm")
    assert f"meter 'A' has another bias in line {first}" in fault.what
    assert (fault.given, fault.allowed) == ("5 mm", "2 mm")


def test_another_name_or_another_scatter_is_no_contradiction(make_case):
    assert list(COVER.faults(_case(make_case, cases.METER_A, cases.METER_B))) == []
    other = {**cases.METER_A, "scatter": "4 mm"}
    assert list(COVER.faults(_case(make_case, cases.METER_A, other))) == []
