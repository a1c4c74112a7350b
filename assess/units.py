"""Units at the border: text such as ``40 mm`` to a number in the tool's own unit.

Inside the tool everything is a plain number in N, mm, MPa and years; this is the only module
that knows of any other unit.
"""

import math
import re
from functools import cache
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import pint

NONE = "-"  # the unit of a pure number

# What to offer where a unit is refused, by the unit inside the tool.
CUSTOMARY: dict[str, tuple[str, ...]] = {
    "mm": ("mm", "cm", "m", "in", "ft"),
    "mm^2": ("mm^2", "cm^2", "in^2"),
    "MPa": ("MPa", "psi", "ksi", "kPa", "GPa", "kgf/cm^2"),
    "N": ("N", "kN", "MN", "lbf", "kip"),
    "N/mm": ("kN/m", "N/mm", "kip/ft", "lbf/ft"),
    "N*mm": ("kN*m", "MN*m", "N*mm", "kip*ft", "lbf*ft"),
    "µA/cm^2": ("µA/cm^2", "uA/cm^2", "mA/m^2"),
    "yr": ("yr", "month", "week", "day"),
    "g/mm": ("g/mm", "kg/m", "lb/ft"),
    "mm^2/yr": ("mm^2/yr", "m^2/s", "cm^2/s"),
    "km/s": ("km/s", "m/s", "ft/s"),
    "mm/yr^0.5": ("mm/yr^0.5", "cm/yr^0.5", "in/yr^0.5"),
    NONE: ("-", "%"),
}

_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_QUANTITY = re.compile(rf"\s*({_NUMBER})\s*(.*?)\s*")
# Nobody thinks in the unit inside, and a bare number would be a million times too small.
NEVER_BARE = frozenset({"N*mm"})
_DECIMAL_COMMA = re.compile(r"\s*([+-]?\d+),(\d+)(\s*[^\d,.].*)?")
_HEADER = re.compile(r"\s*(.*?)\s*[\[(]([^\[\]()]*(?:\([^\[\]()]*\)[^\[\]()]*)*)[\])]\s*")
_UNIT_TEXT = re.compile(r"[A-Za-zµΩ°%‰*/^().\s0-9-]*")
_LONGEST = 40  # characters; no unit needs more, and none may keep the parser busy


class QuantityError(ValueError):
    """A quantity that cannot be used: what, value given, what is allowed, how to mend."""

    def __init__(self, what: str, given: str = "", allowed: str = "", mend: str = "") -> None:
        self.what, self.given, self.allowed, self.mend = what, given, allowed, mend
        parts = [what, f"given {given}" if given else "", f"allowed {allowed}" if allowed else ""]
        super().__init__(", ".join(part for part in (*parts, mend) if part))


@cache
def _registry() -> "pint.UnitRegistry[Any]":
    """Build pint's registry, once and only when a unit has to be read (0.3 s)."""
    import pint

    registry: pint.UnitRegistry[Any] = pint.UnitRegistry(cache_folder=None)
    registry.define("@alias year = y")
    return registry


def plain(unit: str) -> str:
    """Bring a unit as engineers write it into one spelling.

    Parameters
    ----------
    unit : str
        Unit as written, such as ``kNm``, ``N/mm²``, ``kip-ft`` or ``wt-%``.

    Returns
    -------
    str
        The same unit with ``*`` and ``^``; ``-`` for none.

    Examples
    --------
    >>> plain("kNm"), plain("N/mm²"), plain("kip-ft"), plain("wt.-%"), plain("")
    ('kN*m', 'N/mm^2', 'kip*ft', '%', '-')
    """
    text = unit.strip().replace("μ", "µ").replace("²", "^2").replace("³", "^3").replace("⁴", "^4")
    text = re.sub(r"\s*[·⋅×]\s*", "*", text).replace("**", "^")
    text = {'"': "in", "″": "in", "'": "ft", "′": "ft", "": NONE, "1": NONE}.get(text, text)
    text = re.sub(r"(?i)^(?:wt|m|mass|weight|vol)\.?[\s-]*%$", "%", text)
    text = re.sub(r"\b([kM]?N)(k|m|c)?m\b", lambda m: f"{m[1]}*{m[2] or ''}m", text)  # kNm, Nmm
    text = re.sub(r"(?<=[A-Za-z])\s*[-.]\s*(?=[A-Za-z])", "*", text)  # kip-ft, kN.m
    return re.sub(r"(?<=[A-Za-z])([234])\b", r"^\1", text)  # mm2


def factor(unit_from: str, unit_to: str) -> float:
    """Give the number that a value in one unit is multiplied by to stand in another.

    Parameters
    ----------
    unit_from, unit_to : str
        Units of one dimension; ``-`` is a pure number.

    Returns
    -------
    float
        ``value_to / value_from``.

    Raises
    ------
    QuantityError
        If either unit is unknown, or the two are not of one dimension.

    Notes
    -----
    A year is 365.25 days.

    Examples
    --------
    >>> round(factor("ksi", "MPa"), 6)
    6.894757
    """
    return _factor(plain(unit_from), plain(unit_to), unit_from.strip())


@cache
def _factor(source: str, target: str, written: str) -> float:
    if source == target:
        return 1.0
    allowed = ", ".join(CUSTOMARY.get(target, (f"anything that converts to {target}",)))
    if len(source) > _LONGEST or not _UNIT_TEXT.fullmatch(source):
        raise QuantityError("unknown unit", repr(written[:_LONGEST]), allowed)
    ureg = _registry()
    try:
        start, end = (ureg.Quantity(1.0, "" if u == NONE else u) for u in (source, target))
        same = start.is_compatible_with(end)
        ratio = float(start.to(end).magnitude) if same else math.nan
    except Exception:  # pint lets errors of its own, of tokenize and of arithmetic through
        raise QuantityError("unknown unit", repr(written), allowed) from None
    if not same or not math.isfinite(ratio):
        what = f"a unit that does not convert to {'a pure number' if target == NONE else target}"
        raise QuantityError(what, repr(written), allowed)
    return ratio


def convert(value: object, unit: str) -> float:
    """Read a quantity in the tool's own unit.

    Parameters
    ----------
    value : str or float or int
        ``"4.3 ksi"``, or a number that is taken as already in `unit`.
    unit : str
        Unit inside the tool; ``-`` for a pure number.

    Returns
    -------
    float
        The number, finite. [`unit`]

    Raises
    ------
    QuantityError
        If it is no finite number, its unit is unknown or of another dimension.

    Examples
    --------
    >>> convert("40 mm", "mm"), convert(40, "mm"), convert("4 cm", "mm"), convert("15 %", "-")
    (40.0, 40.0, 40.0, 0.15)
    """
    like = "a number" if unit == NONE else f"a number with a unit such as {customary(unit)}"
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise QuantityError("not a quantity", repr(value)[:_LONGEST], like)
    parts = None
    if isinstance(value, str):
        if comma := _DECIMAL_COMMA.fullmatch(value):
            rest = comma[3] or ""
            mend = f"with a decimal point? write {comma[1]}.{comma[2]}{rest}"
            if len(comma[2]) == 3:  # thousands, more likely than three decimals
                mend = f"thousands? write {comma[1]}{comma[2]}{rest}; {mend}"
            raise QuantityError("a number with a comma", repr(value[:_LONGEST]), like, mend)
        parts = _QUANTITY.fullmatch(value)
        if parts is None:
            raise QuantityError("not a quantity", repr(value[:_LONGEST]), like)
        try:
            number = float(parts[1]) * (factor(parts[2], unit) if parts[2] else 1.0)
        except QuantityError as error:
            raise QuantityError(error.what, repr(value[:_LONGEST]), error.allowed) from None
    else:
        number = float(value) if abs(value) < 1e300 else math.inf
    if not math.isfinite(number):
        raise QuantityError("not a finite number", str(value)[:_LONGEST], like)
    bare = not isinstance(value, str) or not (parts and parts[2])
    if unit in NEVER_BARE and bare and number != 0.0:
        raise QuantityError("a number without a unit", str(value)[:_LONGEST], like)
    return number


def customary(unit: str) -> str:
    """List the units that are usual in place of `unit`, for messages and the manual.

    Parameters
    ----------
    unit : str
        Unit inside the tool.

    Returns
    -------
    str
        Comma-separated units, `unit` itself if no others are usual.
    """
    return ", ".join(CUSTOMARY.get(plain(unit), (unit,)))


def header(text: str) -> tuple[str, str | None]:
    """Take a table header apart.

    Parameters
    ----------
    text : str
        Header as written, ``name [unit]`` or ``name (unit)``.

    Returns
    -------
    name : str
        Lower case, with single spaces for underscores and runs of blanks.
    unit : str or None
        Unit as written; None without brackets.

    Examples
    --------
    >>> header("Cover [mm]"), header("bar_diameter (in)"), header("location")
    (('cover', 'mm'), ('bar diameter', 'in'), ('location', None))
    """
    found = _HEADER.fullmatch(text)
    name, unit = (found[1], found[2].strip()) if found else (text, None)
    return " ".join(name.replace("_", " ").lower().split()), unit
