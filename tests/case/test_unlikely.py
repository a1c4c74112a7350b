from collections.abc import Callable

import pytest

from assess.case.reader import CaseReading

Read = Callable[..., CaseReading]


@pytest.mark.parametrize(
    ("change", "doubt"),
    [
        (("V: 0.15", "V: 1.5"), "case.yaml:15: zones.deck.concrete.V: .* in percent. write 0.015"),
        (("V: 0.15", "V: 150 %"), "case.yaml:15: .* given 150 %, .* check the value and its unit"),
        (
            ("mean: 5.5 ksi", "mean: 5500"),
            "case.yaml:15: zones.deck.concrete.mean: a stress or strength is out of the usual "
            "range, given 5500, allowed usually 5 to 150 MPa, in psi or kPa. write the unit",
        ),
        (
            ("{mean: 460 MPa", "{mean: 67"),
            "case.yaml:18: steel.main bars.mean: .* given 67, .* in ksi. write the unit: 67 ksi",
        ),
        (
            ("nominal: 1.5 in", "nominal: 1.5"),
            "case.yaml:16: zones.deck.cover.nominal: .* given 1.5, allowed usually 5 to 150 mm, in "
            "cm or in. write the unit: 1.5 cm",
        ),
        (("mean: 0.5 uA/cm^2, V: 0.5", "mean: 0.5 uA/cm^2, V: 1.2"), "soffit.corrosion.current.V"),
    ],
)
def test_a_quantity_out_of_the_ordinary_is_doubted_with_its_line(
    read: Read, change: tuple[str, str], doubt: str
) -> None:
    reading = read(change)
    assert reading.faults == ()
    (found,) = reading.doubts
    with pytest.raises(ValueError, match=doubt):
        raise ValueError(str(found))


def test_what_is_usual_is_not_doubted(read: Read) -> None:
    assert read(("V: 0.15", "V: 1")).doubts == ()
