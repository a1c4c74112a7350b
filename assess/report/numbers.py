"""How numbers are written, in one place, so that a sentence and a table cannot differ."""

import math

from assess.report.document import Cell, Form

MINUS = "\u2212"
NARROW_SPACE = "\u202f"  # narrow no-break space between thousands
NO_BREAK = "\u00a0"
EMPTY = "\u2013"  # en dash: nothing to state
SUPERSCRIPTS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def _signed(text: str) -> str:
    """Use a true minus sign, and none before a value that rounds to zero."""
    if text.startswith("-"):
        return text[1:] if float(text.replace(",", "")) == 0.0 else MINUS + text[1:]
    return text


def fixed(value: float, decimals: int) -> str:
    """Write with a fixed number of decimals.

    Examples
    --------
    >>> fixed(3.14159, 2), fixed(float("nan"), 2)
    ('3.14', '–')
    """
    if math.isnan(value):
        return EMPTY
    if math.isinf(value):
        return "beyond range" if value > 0 else f"{MINUS}beyond range"
    return _signed(f"{value:.{decimals}f}")


def index(value: float) -> str:
    """Write a reliability index, two decimals."""
    return fixed(value, 2)


def error(value: float) -> str:
    """Write a standard error with one significant digit, not finer than 0.001.

    Examples
    --------
    >>> error(0.0123), error(0.0042), error(0.00001).replace(NO_BREAK, " ")
    ('0.01', '0.004', '< 0.001')
    """
    if not math.isfinite(value):
        return EMPTY
    if value < 0.0005:
        return "<" + NO_BREAK + "0.001"
    return f"{float(f'{value:.1g}'):g}" if value < 1.0 else f"{value:.1f}"


def index_with_error(value: float, standard_error: float) -> str:
    """Write index and standard error together, as ``3.42 ± 0.01``."""
    if not math.isfinite(value):
        return index(value)
    shown = error(standard_error)
    if shown == EMPTY:
        return index(value)
    return f"{index(value)}{NO_BREAK}±{NO_BREAK}{shown.lstrip('<' + NO_BREAK)}"


def probability(value: float) -> str:
    """Write a small probability as ``1.3 × 10⁻⁵``.

    Examples
    --------
    >>> probability(0.25)
    '0.25'
    """
    if math.isnan(value):
        return EMPTY
    if value == 0.0:
        return "0"
    if value >= 0.01:
        return f"{value:.2g}" if value < 0.995 else f"{value:.3f}"
    mantissa, exponent = f"{value:.1e}".split("e")
    power = str(int(exponent)).translate(SUPERSCRIPTS)
    return f"{mantissa}{NO_BREAK}×{NO_BREAK}10{power}"


def share(value: float) -> str:
    """Write a probability with two decimals, three near 0 and 1.

    Examples
    --------
    >>> share(0.31), share(0.005)
    ('0.31', '0.005')
    """
    return fixed(value, 2 if 0.0145 <= value <= 0.9855 else 3)


def integer(value: float) -> str:
    """Write a whole number, thousands apart by a narrow space."""
    if not math.isfinite(value):
        return EMPTY
    whole = round(value)
    grouped = f"{abs(whole):,}".replace(",", NARROW_SPACE)
    return (MINUS if whole < 0 else "") + grouped


def money(value: float, currency: str = "") -> str:
    """Write an amount, thousands apart, the currency before it."""
    amount = integer(value)
    return f"{currency}{NO_BREAK}{amount}" if currency and amount != EMPTY else amount


def rounded(value: float, digits: int = 3) -> float:
    """Round to some significant digits.

    Examples
    --------
    >>> rounded(4268113.0)
    4270000.0
    """
    return float(f"{value:.{digits}g}") if math.isfinite(value) else value


def percent(fraction: float) -> str:
    """Write a fraction in percent; never 0 or 100 for what is neither.

    Examples
    --------
    >>> percent(0.421).replace(NO_BREAK, " "), percent(0.002).replace(NO_BREAK, " ")
    ('42 %', '< 1 %')
    """
    if not math.isfinite(fraction):
        return EMPTY
    if 0.0 < fraction < 0.005:
        return f"<{NO_BREAK}1{NO_BREAK}%"
    if 0.995 < fraction < 1.0:
        return f">{NO_BREAK}99{NO_BREAK}%"
    return _signed(f"{100.0 * fraction:.0f}") + NO_BREAK + "%"


def significant(value: float, digits: int = 3) -> str:
    """Write with some significant digits; powers of ten outside 10⁻³ to 10⁵.

    Examples
    --------
    >>> significant(0.0), significant(41.237), significant(2.5)
    ('0', '41.2', '2.50')
    """
    if not math.isfinite(value):
        return EMPTY
    if value == 0.0:
        return "0"
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    power = int(exponent)
    if power < -3 or power > 5:
        raised = str(power).translate(SUPERSCRIPTS)
        return f"{_signed(mantissa)}{NO_BREAK}×{NO_BREAK}10{raised}"
    if power >= digits:
        return integer(float(f"{mantissa}e{exponent}"))
    return _signed(f"{value:.{max(digits - 1 - power, 0)}f}")


def count(number: int, singular: str, plural: str = "") -> str:
    """Write a count with its noun.

    Examples
    --------
    >>> count(1, "section"), count(3, "section")
    ('1 section', '3 sections')
    """
    noun = singular if number == 1 else (plural or singular + "s")
    return f"{integer(number)} {noun}"


def listing(items: list[str]) -> str:
    """Join words as a sentence does.

    Examples
    --------
    >>> listing(["a", "b", "c"])
    'a, b and c'
    >>> listing(["girder, left", "girder, right"])
    'girder, left; and girder, right'
    """
    if len(items) < 2:
        return "".join(items)
    if any("," in item for item in items):
        return f"{'; '.join(items[:-1])}; and {items[-1]}"
    return f"{', '.join(items[:-1])} and {items[-1]}"


def interval(low: str, high: str) -> str:
    """Write two written ends as an interval."""
    return f"{low} to {high}"


def year_interval(low: int | None, high: int | None, last: int) -> str:
    """Write an interval of years whose ends may lie after the last year of the horizon.

    Examples
    --------
    >>> year_interval(2041, None, 2055)
    '2041 to after 2055'
    """
    if low is None:
        return f"after {last}"
    if high is None:
        return f"{low} to after {last}"
    return str(low) if low == high else interval(str(low), str(high))


def _single(value: float | int, form: Form) -> str:
    writers = {
        Form.INDEX: index,
        Form.ERROR: error,
        Form.PROBABILITY: probability,
        Form.INTEGER: integer,
        Form.MONEY: money,
        Form.ESTIMATE: lambda amount: money(rounded(amount)),
        Form.PERCENT: percent,
        Form.SHARE: share,
        Form.SIGNIFICANT: significant,
        Form.FACTOR: index,
    }
    if form is Form.YEAR:
        return str(int(value))
    if form is Form.SECONDS:
        return fixed(value, 1)
    return writers[form](value) if form in writers else str(value)


def cell_text(cell: Cell) -> str:
    """Write a table cell; a pair is written as an interval."""
    value = cell.value
    if value is None:
        return EMPTY
    if isinstance(value, str):
        return value or EMPTY
    if isinstance(value, tuple):
        low, high = value
        if low is None or high is None:
            return EMPTY
        return interval(_single(low, cell.form), _single(high, cell.form))
    return _single(value, cell.form)
