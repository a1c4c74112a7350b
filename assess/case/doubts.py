"""What makes a survey table doubtful though it can be read: units, repetition, outliers."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from assess import units
from assess.case.forms import Column, EvidenceForm, FloatArray, Table
from assess.errors import Fault

SHOWN = 5  # doubts of one sort that are listed singly
FEWEST_FOR_OUTLIERS = 8
LARGEST_SCORE = 3.5  # Iglewicz & Hoaglin 1993


@dataclass(frozen=True, slots=True)
class Written:
    """Numbers of one column, with what is needed to speak of them as they stand in the file."""

    column: Column
    unit: str  # of the header; "-" for none
    values: FloatArray  # in the column's unit; NaN where there is no number

    @property
    def scale(self) -> float:
        """Give the column's unit per unit of the header."""
        return units.factor(self.unit, self.column.unit or units.NONE)

    def show(self, value: float) -> str:
        """Show a value as it was written, with its unit."""
        unit = "" if units.plain(self.unit) == units.NONE else f" {self.unit}"
        return f"{value / self.scale:.6g}{unit}"

    def show_range(self, low: float, high: float) -> str:
        """Show a range in the header's unit."""
        return f"{low / self.scale:.3g} to {self.show(high)}"


def capped(doubts: Sequence[Fault], what: str) -> list[Fault]:
    """Keep the first few of many alike and count the others.

    Parameters
    ----------
    doubts : sequence of Fault
        All of one sort, of one table.
    what : str
        The sort, for the last line: "values outside the usual range".

    Returns
    -------
    list of Fault
        At most `SHOWN` and one more.
    """
    if len(doubts) <= SHOWN:
        return list(doubts)
    rest = len(doubts) - SHOWN
    more = Fault(doubts[SHOWN].file, doubts[SHOWN].line, f"from here on {rest} more {what}")
    return [*doubts[:SHOWN], more]


def unusual(table: Table, header_line: int, written: Written) -> tuple[list[Fault], list[Fault]]:
    """Look for values that are out of the ordinary, and for a unit that would explain them.

    Parameters
    ----------
    table : Table
        The table.
    header_line : int
        Line of its header.
    written : Written
        The column; checked if it has a usual range.

    Returns
    -------
    faults : list of Fault
        One, if the column's median is unusual but would be usual in another customary unit.
    doubts : list of Fault
        Otherwise, one for each unusual value.
    """
    column, usual = written.column, written.column.usual
    known = np.isfinite(written.values)
    if usual is None or not known.any():
        return [], []
    low, high = usual
    file, about = str(table.path), f"column {column.name!r}"
    allowed = f"usually {written.show_range(low, high)}"
    median = float(np.median(written.values[known]))
    if looks := _other_units(written, median):
        what = f"{about} looks like {looks} under {_article(written.unit)} header"
        given = f"a median of {written.show(median)}"
        return [Fault(file, header_line, what, given, allowed, "correct the header's unit")], []
    outside = known & ((written.values < low) | (written.values > high))
    doubts = []
    for row in np.flatnonzero(outside):
        value = float(written.values[row])
        looks = _other_units(written, value)
        mend = f"written in {looks}?" if looks else ""
        what = f"{about} is out of the usual range"
        doubts.append(Fault(file, int(table.lines[row]), what, written.show(value), allowed, mend))
    return [], capped(doubts, f"values of {about} out of the usual range")


def _article(unit: str) -> str:
    if units.plain(unit) == units.NONE:
        return "a dimensionless"
    letter = unit.lstrip()[:1]
    return f"{'an' if letter in 'aeiou' or unit.startswith('N') else 'a'} {unit}"


def _other_units(written: Written, value: float) -> str:
    """Name the customary units in which an unusual value would be usual."""
    column = written.column
    if column.usual is None or column.usual[0] <= value <= column.usual[1]:
        return ""
    inside = column.unit or units.NONE
    number = value / written.scale  # as it stands in the file
    fits = [
        unit
        for unit in units.CUSTOMARY.get(units.plain(inside), ())
        if column.usual[0] <= number * units.factor(unit, inside) <= column.usual[1]
    ]
    return " or ".join(fits)


def repeated(form: EvidenceForm, table: Table) -> list[Fault]:
    """Look for rows that say what an earlier row has said.

    Parameters
    ----------
    form : EvidenceForm
        Kind of evidence.
    table : Table
        The table.

    Returns
    -------
    list of Fault
        Doubts: identical rows (notes aside) that name a location, or that agree in two numbers
        or more; and a location that has the same value again.
    """
    seen_rows: dict[tuple[object, ...], int] = {}
    seen_values: dict[tuple[object, ...], int] = {}
    doubts = []
    numbers = [*table.numbers.values(), *table.beyond.values()]
    texts = [values for name, values in table.texts.items() if name != "note"]
    for row, line in enumerate(table.lines.tolist()):
        said = tuple(None if np.isnan(v[row]) else float(v[row]) for v in numbers)
        row_key = (*said, *(str(v[row]) for v in texts))
        place = tuple(str(table.texts[name][row]) for name in ("zone", "section", "location"))
        value = float(table.numbers[form.value][row])
        value_key = (*place, value)
        telling = bool(place[2]) or sum(one is not None for one in said) >= 2
        if telling and row_key in seen_rows:
            what = f"the row repeats line {seen_rows[row_key]}"
            doubts.append(Fault(str(table.path), line, what, mend="counted twice? delete one"))
        elif place[2] and np.isfinite(value) and value_key in seen_values:
            what = (
                f"location {place[2]!r} has the same {form.value} as in line "
                f"{seen_values[value_key]}"
            )
            doubts.append(Fault(str(table.path), line, what, mend="counted twice? delete one"))
        seen_rows.setdefault(row_key, line)
        seen_values.setdefault(value_key, line)
    return capped(doubts, "repeated rows")


def outliers(form: EvidenceForm, table: Table, written: Written) -> list[Fault]:
    r"""Look for values that lie far from the others of their table.

    Parameters
    ----------
    form : EvidenceForm
        Kind of evidence: its value column is judged, on the logarithm where it says so.
    table : Table
        The table.
    written : Written
        Its value column.

    Returns
    -------
    list of Fault
        Doubts; none with fewer than eight values or where half of them are equal.

    Notes
    -----
    The modified z-score [1]_ of x is :math:`0.6745 (x - \tilde x) / MAD` with the median
    :math:`\tilde x` and the median absolute deviation MAD; over 3.5 it marks an outlier.

    References
    ----------
    .. [1] B. Iglewicz, D. C. Hoaglin, How to Detect and Handle Outliers, ASQC Quality Press,
       1993, section 3.
    """
    values = written.values
    known = np.isfinite(values) & ((values > 0.0) | (not form.log_scale))
    if np.count_nonzero(known) < FEWEST_FOR_OUTLIERS:
        return []
    judged = np.log(values[known]) if form.log_scale else values[known]
    distance = judged - np.median(judged)
    spread = float(np.median(np.abs(distance)))
    if not spread > 0.0:
        return []
    scores = 0.6745 * distance / spread  # [1]
    middle = written.show(float(np.median(values[known])))
    doubts = []
    for row, score in zip(np.flatnonzero(known), scores, strict=True):
        if abs(score) > LARGEST_SCORE:
            what = (
                f"{form.value} lies far from the others: modified z-score {score:.1f} around a "
                f"median of {middle}"
            )
            given = written.show(float(values[row]))
            allowed = f"usually up to {LARGEST_SCORE:g} either way"
            line = int(table.lines[row])
            doubts.append(Fault(str(table.path), line, what, given, allowed, "check the record"))
    return capped(doubts, "values far from the others")
