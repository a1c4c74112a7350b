"""The report as a tree of frozen nodes: what is said, apart from how a format writes it.

Document
└── Section ── Paragraph | BulletList | Table | FigureNode | Callout | References | Section
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.figure import Figure


class Emphasis(StrEnum):
    """How a run of text is set."""

    PLAIN = "plain"
    STRONG = "strong"
    LIGHT = "light"  # italics
    CODE = "code"


class Form(StrEnum):
    """How a raw value is written; `assess.report.numbers` has the one place that does it."""

    TEXT = "text"
    INDEX = "index"  # two decimals
    ERROR = "error"  # one significant digit
    PROBABILITY = "probability"  # 1.3 × 10⁻⁵
    YEAR = "year"
    INTEGER = "integer"  # thousands apart
    MONEY = "money"
    ESTIMATE = "estimate"  # money that was calculated: three significant digits
    PERCENT = "percent"  # the raw value is a fraction
    SHARE = "share"  # a probability between 0 and 1, finer near its ends
    SIGNIFICANT = "significant"  # three significant digits
    FACTOR = "factor"  # two decimals
    SECONDS = "seconds"  # one decimal


class CalloutKind(StrEnum):
    """Weight of a callout."""

    CAUTION = "caution"
    NOTE = "note"


@dataclass(frozen=True, slots=True)
class Run:
    """A run of text set one way."""

    text: str
    emphasis: Emphasis = Emphasis.PLAIN


type Inline = str | Run
type Number = float | int | None
type Value = str | Number | tuple[Number, Number]


@dataclass(frozen=True, slots=True)
class Paragraph:
    """One paragraph."""

    runs: Sequence[Inline]


@dataclass(frozen=True, slots=True)
class BulletList:
    """Unordered items, each a sequence of runs."""

    items: Sequence[Sequence[Inline]]


@dataclass(frozen=True, slots=True)
class Column:
    """Heading of a table column."""

    heading: str
    unit: str = ""
    right: bool = False  # numbers stand to the right
    wide: bool = False  # running text: may wrap, wants room


@dataclass(frozen=True, slots=True)
class Cell:
    """A raw value with the way to write it; a pair is an interval."""

    value: Value
    form: Form = Form.TEXT
    strong: bool = False


@dataclass(frozen=True, slots=True)
class Table:
    """A table; the first cell of a row names the row.

    Raises
    ------
    ValueError
        If a row has not one cell per column.
    """

    caption: str
    columns: Sequence[Column]
    rows: Sequence[Sequence[Cell]]
    notes: Sequence[str] = ()

    def __post_init__(self) -> None:
        for row in self.rows:
            if len(row) != len(self.columns):
                raise ValueError(
                    f"table {self.caption!r}: a row of {len(row)} cells given, "
                    f"{len(self.columns)} allowed, one per column"
                )


@dataclass(frozen=True, slots=True)
class Panel:
    """One picture; the factory is called by the writer, which knows the file format."""

    factory: "Callable[[], Figure]"
    title: str
    alt: str  # what the picture shows, for those who do not see it


@dataclass(frozen=True, slots=True)
class FigureNode:
    """Panels that share one caption and one key."""

    panels: Sequence[Panel]
    caption: str
    width: float  # natural width of a panel [in]
    key: Panel | None = None  # what the line styles mean


@dataclass(frozen=True, slots=True)
class Callout:
    """Something that must not be overlooked."""

    kind: CalloutKind
    title: str
    text: str


@dataclass(frozen=True, slots=True)
class References:
    """Numbered sources, in plain words."""

    items: Sequence[str]


@dataclass(frozen=True, slots=True)
class Section:
    """A headed part."""

    heading: str
    blocks: "Sequence[Block]"


type Block = Paragraph | BulletList | Table | FigureNode | Callout | References | Section


@dataclass(frozen=True, slots=True)
class Document:
    """The whole report."""

    title: str
    subtitle: str
    lead: Sequence[Block]  # before the first section
    sections: Sequence[Section]
    language: str = "en"


def strong(text: str) -> Run:
    """Set a text in bold."""
    return Run(text, Emphasis.STRONG)


def code(text: str) -> Run:
    """Set a text as code."""
    return Run(text, Emphasis.CODE)


def text_cell(text: str, *, bold: bool = False) -> Cell:
    """Make a cell of words."""
    return Cell(text, Form.TEXT, bold)
