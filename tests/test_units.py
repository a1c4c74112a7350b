import contextlib
import math
import re
import subprocess
import sys

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from assess.units import QuantityError, convert, customary, factor, header, plain

# Exact by definition: inch 25.4 mm, pound 0.45359237 kg, standard gravity 9.80665 m/s2.
POUND_FORCE = 0.45359237 * 9.80665  # [N]
PSI = POUND_FORCE / 25.4**2  # [MPa]


@pytest.mark.parametrize(
    ("text", "unit", "expected"),
    [
        ("40 mm", "mm", 40.0),
        ("40mm", "mm", 40.0),
        ("1.5 in", "mm", 38.1),
        ('1.5"', "mm", 38.1),
        ("4 ft", "mm", 1219.2),
        ("4300 psi", "MPa", 4300.0 * PSI),
        ("4.3 ksi", "MPa", 4300.0 * PSI),
        ("35 N/mm²", "MPa", 35.0),
        ("35 N/mm2", "MPa", 35.0),
        ("350 kgf/cm2", "MPa", 350.0 * 9.80665e-2),
        ("820 kN*m", "N*mm", 820e6),
        ("820 kNm", "N*mm", 820e6),
        ("820 kN·m", "N*mm", 820e6),
        ("0.82 MNm", "N*mm", 820e6),
        ("7 Nmm", "N*mm", 7.0),
        ("60 kip*ft", "N*mm", 60e3 * POUND_FORCE * 304.8),
        ("60 kip-ft", "N*mm", 60e3 * POUND_FORCE * 304.8),
        ("60 ft-kip", "N*mm", 60e3 * POUND_FORCE * 304.8),
        ("0.9 uA/cm^2", "µA/cm^2", 0.9),
        ("0.9 µA/cm²", "µA/cm^2", 0.9),  # micro sign
        ("0.9 μA/cm²", "µA/cm^2", 0.9),  # Greek letter
        ("9 mA/m^2", "µA/cm^2", 0.9),
        ("12 yr", "yr", 12.0),
        ("12 years", "yr", 12.0),
        ("12 a", "yr", 12.0),
        ("6 months", "yr", 0.5),
        ("15 %", "-", 0.15),
        ("0.15", "-", 0.15),
        ("-1.5e2 mm", "mm", -150.0),
        (40, "mm", 40.0),
        (0.5, "-", 0.5),
        ("12 kN/m", "N/mm", 12.0),
    ],
)
def test_convert(text: str | float, unit: str, expected: float) -> None:
    assert convert(text, unit) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(
    ("value", "unit", "message"),
    [
        ("40 MPa", "mm", "does not convert to mm, given '40 MPa', allowed mm, cm, m, in, ft"),
        ("40 mmm", "mm", "unknown unit, given '40 mmm', allowed mm, cm"),
        ("40 kg", "N", "does not convert to N, given '40 kg', allowed N, kN"),
        ("40 mm", "-", "does not convert to a pure number, given '40 mm'"),
        ("mm", "mm", "not a quantity, given 'mm', allowed a number with a unit such as mm"),
        ("1,5 mm", "mm", "a number with a comma, given '1,5 mm'.*write 1.5 mm"),
        ("1,000 mm", "mm", "a number with a comma, given '1,000 mm'.*thousands. write 1000 mm"),
        (620, "N*mm", "a number without a unit, given 620, allowed .*kN.m"),
        ("620", "N*mm", "a number without a unit, given 620"),
        ("", "mm", "not a quantity"),
        (True, "mm", "not a quantity, given True"),
        (None, "mm", "not a quantity, given None"),
        ([40], "mm", "not a quantity, given .40."),
        (float("nan"), "mm", "not a finite number, given nan"),
        (float("inf"), "mm", "not a finite number, given inf"),
        (10**400, "mm", "not a finite number"),
        ("1e999 mm", "mm", "not a finite number, given 1e999 mm"),
        ("2 mm" + "*mm" * 30, "mm", "unknown unit"),
        ("2 m**9999999", "mm", "unknown unit|does not convert"),
    ],
)
def test_convert_refuses(value: object, unit: str, message: str) -> None:
    with pytest.raises(QuantityError, match=message):
        convert(value, unit)


def test_refusal_is_a_value_error_with_its_parts() -> None:
    with pytest.raises(ValueError, match="allowed MPa, psi") as caught:
        convert("40 mm", "MPa")
    assert isinstance(caught.value, QuantityError)
    assert caught.value.given == "'40 mm'"
    assert caught.value.allowed == customary("MPa")


@given(st.text(max_size=30))
@settings(max_examples=150, deadline=None)
def test_any_text_is_read_or_refused(text: str) -> None:
    with contextlib.suppress(QuantityError):
        assert math.isfinite(convert(f"3 {text}", "mm"))


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("cover [mm]", ("cover", "mm")),
        ("Cover (mm)", ("cover", "mm")),
        ("  Residual_Diameter[ in ] ", ("residual diameter", "in")),
        ("current [µA/(cm²)]", ("current", "µA/(cm²)")),
        ("moisture", ("moisture", None)),
        ("share [-]", ("share", "-")),
        ("share []", ("share", "")),
    ],
)
def test_header(text: str, expected: tuple[str, str | None]) -> None:
    assert header(text) == expected


def test_factor_between_equal_units_needs_no_dimension() -> None:
    assert factor("wt.-%", "wt-%") == 1.0
    assert factor("%", "-") == 0.01
    assert factor("", "-") == 1.0


def test_factor_and_its_inverse() -> None:
    assert factor("psi", "MPa") * factor("MPa", "psi") == pytest.approx(1.0, rel=1e-12)
    assert plain("kNm") == plain("kN·m") == plain("kN*m") == "kN*m"


def test_pint_is_loaded_only_when_needed() -> None:
    code = (
        "import sys; from assess.units import convert; convert(40, 'mm'); convert('40 mm', 'mm');"
        "sys.exit('pint' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_messages_have_no_unfilled_parts() -> None:
    with pytest.raises(QuantityError) as caught:
        convert("x", "-")
    assert not re.search(r", ,|, $", str(caught.value))
