"""What a kind of evidence must bring, and helpers that the kinds share.

A kind of evidence is one subclass of `EvidenceKind` in a file of its own and one line in
`assess.updating.kinds`.
"""

from abc import ABC, abstractmethod
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray

from assess import operations as op
from assess.case.forms import EvidenceForm
from assess.case.reader import Case, Evidence
from assess.errors import Fault
from assess.updating.local import Local, LocalModel
from assess.updating.variables import Variable

Numeric = Any  # float, ndarray or PyTensor variable
FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
TextArray = NDArray[np.str_]


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """All measurements of one kind in a case, surveys one after the other.

    ``value`` is on the scale of the likelihood; NaN where censored or none found. A place is
    a section that a row names, else the location that it names, else the row itself. All
    arrays have shape (n_row,) except ``place_zone`` (n_place,) and those in ``extra``.
    """

    value: FloatArray
    stage: IntArray  # 1 for the first survey
    zone: IntArray  # index into `zones`
    place: IntArray  # index into `places`
    place_zone: IntArray  # zone of each place
    zones: tuple[str, ...]
    places: tuple[str, ...]  # section or location; "" for a row on its own
    extra: Mapping[str, FloatArray]  # what the kind adds, first axis n_row

    def place_of(self, section: str) -> int | None:
        """Index of the place that is this section; None if it was not measured."""
        key = f"section {section}"
        return self.places.index(key) if key in self.places else None


@dataclass(frozen=True, slots=True)
class CodeStrength:
    """A characteristic value as a code has it, beside which the report sets the posterior."""

    zone: str
    quantity: str  # "characteristic strength in the structure"
    code: str  # "EN 13791:2019"
    count: int  # places that it rests on
    value: float | None  # None: the code gives none
    note: str
    variable: tuple[str, str]  # median of local values, standard deviation of their logarithms
    fractile: float  # of local values, to be compared


class EvidenceKind(ABC):
    """One kind of measurement: its table, its likelihood, its simulator, what it conditions."""

    form: ClassVar[EvidenceForm]
    unit: ClassVar[str]  # of what is shown to people
    log_scale: ClassVar[bool]  # whether `Rows.value` is the logarithm of what is shown
    assumption: ClassVar[str]  # a sentence for the report
    carrier: ClassVar[str]  # zone variable whose density carries the data in the report

    @abstractmethod
    def rows(self, case: Case) -> Rows | None:
        """Gather all measurements of this kind; None if the case has none."""

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the measuring variables (bias of a meter, ...) that this kind needs."""
        return ()

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find what makes the measurements unusable beyond what tables can say of themselves."""
        return ()

    @abstractmethod
    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Arrays of the likelihood with all surveys later than ``stage`` switched off."""

    @abstractmethod
    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active rows together, as a graph or as numbers.

        Parameters
        ----------
        rows : Rows
            All rows.
        values : mapping
            Common variables by name: scalars of the graph, or draws of shape (n_draw,).
        data : mapping
            From `data`, as the graph's variables or as arrays.

        Returns
        -------
        numeric
            A scalar of the graph, or shape (n_draw,).
        """

    @abstractmethod
    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw data sets of the same design, shape (n_draw, n_row), NaN as in `Rows.value`.

        ``values`` holds common variables by name, each of shape (n_draw,).
        """

    def observed(self, rows: Rows, value: FloatArray) -> Rows:
        """Put other measured values in place of those of the rows (same design)."""
        return replace(rows, value=value)

    def without(self, rows: Rows, _key: str) -> Rows:
        """Give the rows as they would be had another kind not been measured: the same, mostly."""
        return rows

    def code_strengths(self, rows: Rows) -> Sequence[CodeStrength]:
        """Give characteristic values as codes derive them from the measurements alone."""
        return ()

    @abstractmethod
    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Distribution of a section's local variables of this kind, given the draws."""


def gather(case: Case, key: str) -> list[tuple[int, Evidence]]:
    """List the case's evidence of one kind with its stage (1 for the first survey)."""
    stage_of = {date: number for number, (_, date) in enumerate(case.stages, start=1)}
    return [(stage_of[item.date], item) for item in case.evidence if item.kind == key]


def place_keys(item: Evidence) -> list[str]:
    """Name the place of each row: its section, its location, or nothing (a row on its own)."""
    return [
        f"section {section}" if section else (f"{zone}: {location}" if location else "")
        for section, location, zone in zip(item.section, item.location, item.zone, strict=True)
    ]


def index_places(keys: Sequence[str]) -> tuple[IntArray, tuple[str, ...]]:
    """Give numbers to places in order of appearance; rows without a key are places of their own."""
    numbers: dict[str, int] = {}
    names: list[str] = []
    place = np.empty(len(keys), dtype=np.int64)
    for row, key in enumerate(keys):
        if key and key in numbers:
            place[row] = numbers[key]
            continue
        if key:
            numbers[key] = len(names)
        place[row] = len(names)
        names.append(key)
    return place, tuple(names)


def build_rows(
    items: Sequence[tuple[int, Evidence]],
    value: Sequence[FloatArray],
    extra: Mapping[str, Sequence[FloatArray]],
) -> Rows:
    """Join the tables of one kind into `Rows`; ``value`` and ``extra`` go table by table."""
    zone_names = np.concatenate([item.zone for _, item in items])
    zones = tuple(dict.fromkeys(str(name) for name in zone_names))
    zone = np.array([zones.index(str(name)) for name in zone_names], dtype=np.int64)
    place, places = index_places([key for _, item in items for key in place_keys(item)])
    place_zone = np.zeros(len(places), dtype=np.int64)
    place_zone[place] = zone
    return Rows(
        value=np.concatenate(value),
        stage=np.concatenate([np.full(len(item.zone), stage) for stage, item in items]),
        zone=zone,
        place=place,
        place_zone=place_zone,
        zones=zones,
        places=places,
        extra={name: np.concatenate(parts) for name, parts in extra.items()},
    )


def membership(place: IntArray, count: int) -> FloatArray:
    """Build the 0/1 matrix (count, n_row) that sums rows by place."""
    matrix = np.zeros((count, len(place)))
    matrix[place, np.arange(len(place))] = 1.0
    return matrix


def zone_values(rows: Rows, values: Mapping[str, Numeric], variable: str) -> Numeric:
    """Stack one common variable of all zones of the rows, last axis zone."""
    return op.stack_last([values[f"{zone}.{variable}"] for zone in rows.zones])


def population_local(
    name: str,
    values: Mapping[str, FloatArray],
    zone: str,
    level: str,
    scatter: str,
    *,
    logarithm: bool,
) -> Local:
    """Give the local variable of a place nobody measured, drawn from its zone."""
    centre = values[f"{zone}.{level}"]
    mean = np.log(centre) if logarithm else centre
    return Local(name, mean, values[f"{zone}.{scatter}"], logarithm)
