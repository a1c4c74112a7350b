"""How a kind of evidence, a limit state or an option tells the case format about itself.

The packages that implement them (``updating``, ``reliability``, ``decisions``) stand above
``case`` and hand their forms down in a `Vocabulary`; the case format never imports them. That
is what makes a new kind one file and one registry line.
"""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field, ValidationInfo, model_validator

from assess.errors import Fault

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
TextArray = NDArray[np.str_]


class Closed(BaseModel):
    """Base of everything a case file may say: frozen and closed to unknown keys."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    @model_validator(mode="before")
    @classmethod
    def _note_model(cls, data: Any, info: ValidationInfo) -> Any:
        """Leave a note of which model a mapping was read as: faults name its known keys."""
        if isinstance(info.context, dict):
            info.context.setdefault(id(data), cls)
        return data


class EvidenceEntry(Closed):
    """What a survey says of one table, beside what the kind adds."""

    table: Path  # relative to the case file
    zone: str | None = None  # of every row, unless the table has a `zone` column


@dataclass(frozen=True, slots=True)
class Dimension:
    """A dimension of a section as the case states it [mm]."""

    nominal: float
    sd: float | None = None  # of built less nominal; None: the published one


@dataclass(frozen=True, slots=True)
class StatedBars:
    """Bars of a section as the case states them."""

    count: int
    diameter: float  # of the sound bars [mm]


class SectionEntry(Closed):
    """What is said of one section, beside what its limit state adds.

    A limit state's entry tells by the methods what a survey may find at the section.
    """

    name: str
    zone: str
    limit_state: str

    def steels(self) -> tuple[str, ...]:
        """Name the reinforcements that the section uses."""
        return ()

    def dimensions(self) -> Mapping[str, Dimension]:
        """Give the dimensions that may be measured, by name."""
        return {}

    def stated_bars(self) -> StatedBars | None:
        """Give the bars that may be looked for."""
        return None


class OptionEntry(Closed):
    """What is said of one option, beside what its kind adds."""

    name: str
    kind: str
    members: tuple[str, ...] = Field((), description="members it is done to; left out: all")


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a survey table. Header in the file: ``name [unit]``."""

    name: str
    what: str  # one line, for faults and the manual
    unit: str | None = None  # unit inside the tool; None for text
    required: bool = True
    above: float | None = None  # allowed: value > above
    below: float | None = None  # allowed: value < below
    usual: tuple[float, float] | None = None  # outside: a doubt (another unit?)
    typical: tuple[float, float] | None = None  # of the median of a table; outside: a doubt
    choices: tuple[str, ...] = ()  # for text columns
    censored: bool = False  # may say ">80": at least that much
    below_detection: bool = False  # may say "<0.01": less than that
    absent: tuple[str, ...] = ()  # words that mean "looked for, none found"


@dataclass(frozen=True, slots=True)
class Table:
    """A survey table after reading: internal units, one row per measurement.

    ``numbers[name]`` is NaN where the cell was a bound, absent or (optional columns) empty.
    """

    path: Path
    lines: NDArray[np.int64]  # line (CSV) or row (XLSX) of each measurement, 1-based
    numbers: Mapping[str, FloatArray]
    texts: Mapping[str, TextArray]  # "" where empty
    beyond: Mapping[str, FloatArray] = field(default_factory=dict)  # the 80 of ">80", else NaN
    below: Mapping[str, FloatArray] = field(default_factory=dict)  # the 0.01 of "<0.01", else NaN
    absent: Mapping[str, BoolArray] = field(default_factory=dict)  # True at "none found"
    units: Mapping[str, str] = field(default_factory=dict)  # of the headers, as written

    def __len__(self) -> int:
        """Count the measurements."""
        return len(self.lines)


Doubter = Callable[[EvidenceEntry, Table], Sequence[Fault]]


def no_doubts(_entry: EvidenceEntry, _table: Table) -> Sequence[Fault]:
    """Have nothing to doubt beyond what the columns say."""
    return ()


@dataclass(frozen=True, slots=True)
class Judged:
    """What outliers are looked for in, where that is not the value column as it stands."""

    what: str  # in words: "loss of diameter"
    of: Callable[[EvidenceEntry, Table], FloatArray]  # in the value column's unit, NaN for none


@dataclass(frozen=True, slots=True)
class EvidenceForm:
    """A kind of evidence as the case format sees it."""

    key: str  # under a survey: "cores", "cover", "section_loss"
    title: str
    entry: type[EvidenceEntry]
    columns: tuple[Column, ...]  # beside the common `location`, `zone`, `section`, `note`
    value: str  # name of the column that outlier and duplicate checks look at
    log_scale: bool = False  # outliers are judged on the logarithm
    judged: Judged | None = None  # left out: the value column is judged
    apart: tuple[str, ...] = ()  # number columns that tell rows of one location apart: a depth
    zoned: bool = True  # whether a row speaks of a zone; loads and quantities do not
    doubts: Doubter = no_doubts


@dataclass(frozen=True, slots=True)
class Complaint:
    """What is wrong with an entry that can be read; `keys` lead to it from the entry."""

    keys: tuple[str | int, ...]
    what: str
    given: str = ""
    allowed: str = ""
    mend: str = ""


@dataclass(frozen=True, slots=True)
class LimitStateForm:
    """A limit state as the case format sees it."""

    key: str  # "bending"
    title: str
    entry: type[SectionEntry]  # its `limit_state` is Literal[key]


@dataclass(frozen=True, slots=True)
class OptionForm:
    """A kind of option as the case format sees it."""

    key: str  # "arrest corrosion"
    title: str
    entry: type[OptionEntry]  # its `kind` is Literal[key]


@dataclass(frozen=True, slots=True)
class Vocabulary:
    """All kinds that a case file may name."""

    evidence: Mapping[str, EvidenceForm]
    limit_states: Mapping[str, LimitStateForm]
    options: Mapping[str, OptionForm]
    targets: Mapping[str, Sequence[str]]  # target set -> its classes
    concrete_grades: Sequence[str]  # grades with a published strength prior
