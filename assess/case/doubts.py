"""What makes a survey table doubtful though it can be read: units, repetition, outliers."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from assess import units
from assess.case.forms import (
    Column,
    EvidenceEntry,
    EvidenceForm,
    FloatArray,
    Table,
    TextArray,
)
from assess.errors import Fault

SHOWN = 5  # doubts of one sort that are listed singly
FEWEST_FOR_OUTLIERS = 8  # and for the median of a column
LARGEST_SCORE = 3.5  # Iglewicz & Hoaglin 1993


@dataclass(frozen=True, slots=True)
class Written:
    """Numbers of one column, with what is needed to speak of them as they stand in the file."""

    column: Column
    unit: str  # of the header; "-" for none
    values: FloatArray  # in the column's unit; NaN where there is no number
    refused: FloatArray | None = None  # numbers that the column does not allow; NaN elsewhere

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
        return f"{low / self.scale:.4g} to {self.show(high)}"


def written_column(form: EvidenceForm, table: Table, name: str) -> Written:
    """Take a column of a table as it stands in its file.

    Parameters
    ----------
    form : EvidenceForm
        Kind of evidence.
    table : Table
        As read.
    name : str
        One of the form's number columns.

    Returns
    -------
    Written
        Shows values in the header's unit.
    """
    column = next(one for one in form.columns if one.name == name)
    return Written(column, table.units.get(name, column.unit or units.NONE), table.numbers[name])


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


def mistaken_unit(file: str, header_line: int, written: Written) -> Fault | None:
    """Look whether a whole column stands in another unit than its header says.

    Parameters
    ----------
    file : str
        The table's file.
    header_line : int
        Line of its header.
    written : Written
        The column, with the numbers that were refused.

    Returns
    -------
    Fault or None
        If the column's median is unusual but would be usual in another customary unit.
    """
    numbers = written.values
    if written.refused is not None:
        numbers = np.where(np.isfinite(numbers), numbers, written.refused)
    known = numbers[np.isfinite(numbers)]
    if written.column.usual is None or not len(known):
        return None
    median = float(np.median(known))
    looks = other_units(written, median)
    if not looks:
        return None
    what = (
        f"column {written.column.name!r} looks like {looks} under {_article(written.unit)} header"
    )
    given = f"a median of {written.show(median)}"
    allowed = f"usually {written.show_range(*written.column.usual)}"
    return Fault(file, header_line, what, given, allowed, "correct the header's unit")


def unusual(table: Table, written: Written) -> list[Fault]:
    """Doubt each value that is out of the ordinary, saying which unit would explain it.

    Parameters
    ----------
    table : Table
        The table.
    written : Written
        The column; checked if it has a usual range.

    Returns
    -------
    list of Fault
        Doubts.
    """
    column, usual = written.column, written.column.usual
    if usual is None:
        return []
    about = f"column {column.name!r}"
    allowed = f"usually {written.show_range(*usual)}"
    outside = (written.values < usual[0]) | (written.values > usual[1])  # False for NaN
    doubts = []
    for row in np.flatnonzero(outside):
        value = float(written.values[row])
        looks = other_units(written, value)
        mend = f"written in {looks}?" if looks else ""
        what = f"{about} is out of the usual range"
        line = int(table.lines[row])
        doubts.append(Fault(str(table.path), line, what, written.show(value), allowed, mend))
    return capped(doubts, f"values of {about} out of the usual range") + _odd_median(table, written)


def _odd_median(table: Table, written: Written) -> list[Fault]:
    """Doubt a whole column whose median is hardly ever met, though each of its values may be."""
    typical, known = written.column.typical, written.values[np.isfinite(written.values)]
    if typical is None or len(known) < FEWEST_FOR_OUTLIERS:
        return []
    median = float(np.median(known))
    if typical[0] <= median <= typical[1]:
        return []
    looks = other_units(replace(written, column=replace(written.column, usual=typical)), median)
    mend = f"written in {looks}?" if looks else ""
    what = f"the median of column {written.column.name!r} is out of the usual range"
    allowed = f"usually {written.show_range(*typical)}"
    given = written.show(median)
    return [Fault(str(table.path), int(table.lines[0]), what, given, allowed, mend)]


def _article(unit: str) -> str:
    if units.plain(unit) == units.NONE:
        return "a dimensionless"
    letter = unit.lstrip()[:1]
    return f"{'an' if letter in 'aeiou' or unit.startswith('N') else 'a'} {unit}"


def other_units(written: Written, value: float) -> str:
    """Name the customary units in which an odd value would be usual, or at least allowed.

    Parameters
    ----------
    written : Written
        The column.
    value : float
        In the column's unit.

    Returns
    -------
    str
        ``psi or kPa``; nothing if the value is not odd or no unit explains it.
    """
    column = written.column
    low, high = column.usual or (
        -np.inf if column.above is None else column.above,
        np.inf if column.below is None else column.below,
    )
    if low <= value <= high:
        return ""
    inside = column.unit or units.NONE
    number = value / written.scale  # as it stands in the file
    fits = [
        unit
        for unit in units.CUSTOMARY.get(units.plain(inside), ())
        if low <= number * units.factor(unit, inside) <= high
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
        or more; and a location that has the same value again, where nothing tells them apart.
    """
    seen_rows: dict[tuple[object, ...], int] = {}
    seen_values: dict[tuple[object, ...], int] = {}
    doubts = []
    numbers = [*table.numbers.values(), *table.beyond.values(), *table.below.values()]
    texts = [values for name, values in table.texts.items() if name != "note"]
    # Only rows that name a location named again, or that say two numbers, can repeat another's.
    _, which, times = np.unique(table.texts["location"], return_inverse=True, return_counts=True)
    named = table.texts["location"] != ""
    several = np.sum([~np.isnan(v) for v in numbers], axis=0) >= 2
    for row in np.flatnonzero((named & (times[which] > 1)) | (~named & several)):
        line = int(table.lines[row])
        said = tuple(None if np.isnan(v[row]) else float(v[row]) for v in numbers)
        row_key = (*said, *(str(v[row]) for v in texts))
        place = tuple(str(table.texts[name][row]) for name in ("zone", "section", "location"))
        value = float(table.numbers[form.value][row])
        value_key = (*place, value, *(float(table.numbers[name][row]) for name in form.apart))
        if row_key in seen_rows:
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


def outliers(
    form: EvidenceForm, entry: EvidenceEntry, table: Table, zone: TextArray
) -> list[Fault]:
    r"""Look for values that lie far from the others of their zone in one table.

    Parameters
    ----------
    form : EvidenceForm
        Kind of evidence: its value column, or what it derives from it, is judged, on the
        logarithm where it says so.
    entry : EvidenceEntry
        What the survey says of the table.
    table : Table
        The table.
    zone : ndarray of str, shape (n_row,)
        Zone of each row: zones differ, so each is judged by itself.

    Returns
    -------
    list of Fault
        Doubts; none of a zone with fewer than eight values or where half of them are equal.

    Notes
    -----
    The modified z-score [1]_ of x is :math:`0.6745 (x - \tilde x) / MAD` with the median
    :math:`\tilde x` and the median absolute deviation MAD; over 3.5 it marks an outlier.

    References
    ----------
    .. [1] B. Iglewicz, D. C. Hoaglin, How to Detect and Handle Outliers, ASQC Quality Press,
       1993, section 3.
    """
    written = written_column(form, table, form.value)
    judged, about = written.values, form.value
    if form.judged is not None:
        judged, about = form.judged.of(entry, table), form.judged.what
    known = np.isfinite(judged) & ((judged > 0.0) | (not form.log_scale))
    names = sorted(set(zone.tolist()))
    doubts = []
    for name in names:
        rows = np.flatnonzero(known & (zone == name))
        where = f" in {name!r}" if len(names) > 1 else ""
        scores, middle = _modified_scores(judged[rows], form.log_scale)
        for row, score in zip(rows, scores, strict=True):
            if abs(score) > LARGEST_SCORE:
                what = (
                    f"{about} lies far from the others: modified z-score {score:.1f} around a "
                    f"median of {written.show(middle)}{where}"
                )
                given = written.show(float(judged[row]))
                allowed = f"usually up to {LARGEST_SCORE:g} either way"
                line = int(table.lines[row])
                doubts.append(
                    Fault(str(table.path), line, what, given, allowed, "check the record")
                )
    return capped(sorted(doubts), "values far from the others")


def _modified_scores(values: FloatArray, log_scale: bool) -> tuple[FloatArray, float]:
    """Give the modified z-scores and the median, zeros where nothing can be said."""
    if len(values) < FEWEST_FOR_OUTLIERS:
        return np.zeros(len(values)), 0.0
    judged = np.log(values) if log_scale else values
    distance = judged - np.median(judged)
    spread = float(np.median(np.abs(distance)))
    if not spread > 0.0:
        return np.zeros(len(values)), 0.0
    return 0.6745 * distance / spread, float(np.median(values))  # [1] of `outliers`
