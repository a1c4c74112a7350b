"""Evidence: half-cell potentials, as counts of points in the classes of ASTM C876."""

from collections.abc import Iterator, Mapping, Sequence
from typing import Annotated, Any, Literal, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm, Table
from assess.case.processes import within_one
from assess.case.quantities import InUnit
from assess.case.reader import Case, Evidence
from assess.errors import Fault
from assess.mechanics.half_cell import CLASSES, against_copper_sulfate, potential_class
from assess.updating.corrosion_faults import zones_without_corrosion
from assess.updating.corrosion_history import LEAST
from assess.updating.half_cell_faults import doubtful_potentials, unusable_points
from assess.updating.kind import EvidenceKind, FloatArray, Numeric, Rows, gather, zone_values
from assess.updating.local import LocalModel
from assess.updating.measuring import catalogue_variable, restated_faults
from assess.updating.variables import Variable

Electrode = Literal[
    "copper sulfate", "calomel", "silver chloride, saturated KCl", "silver chloride, 3 M KCl"
]
LIMITS = len(CLASSES) - 1  # rows of `Rows` for each table and zone, one per limit between classes

# name: (label, symbol, entry of the catalogue)
PROBABILITIES: Mapping[str, tuple[str, str, str]] = {
    f"half_cell.{state}_{event}": (label, symbol, f"half-cell, {state} point {words}")
    for state, event, words, label, symbol in (
        ("active", "uncertain", "in the uncertain class",
         "chance that an active point reads between -200 and -350 mV", "$u_a$"),
        ("active", "told_right", "told right",
         "chance that an active point, if not in between, reads below -350 mV", "$c_a$"),
        ("passive", "uncertain", "in the uncertain class",
         "chance that a passive point reads between -200 and -350 mV", "$u_p$"),
        ("passive", "told_right", "told right",
         "chance that a passive point, if not in between, reads above -200 mV", "$c_p$"),
    )
}  # fmt: skip


class HalfCellEntry(EvidenceEntry):
    """What a survey says of its potentials."""

    electrode: Electrode | None = Field(
        None,
        description="Reference electrode of the potentials; left out where the table has classes "
        "only, which are those against the copper sulfate electrode.",
    )
    effective_points: Annotated[
        float, InUnit("-", "a number of independent points", at_least=1.0)
    ] = Field(
        description="Number of independent points that the table is worth, for neighbouring "
        "readings see the same concrete: about the area surveyed over the square of the distance "
        "at which readings no longer resemble each other. Counts are scaled down to it, zone by "
        "zone."
    )


class HalfCell(EvidenceKind):
    r"""Half-cell potentials: a mixture of what active and what passive bars read.

    Notes
    -----
    At a point of a zone the bar corrodes by age T with probability :math:`a = \Phi((\ln T - \ln
    \bar t) / s_t)`, the share of local onsets before T. A point reads in the class between the two
    limits of ASTM C876 with probability :math:`u_a` or :math:`u_p` (active, passive), else in the
    class of its own state with probability :math:`c_a` or :math:`c_p`:

    .. math:: p_{above} &= a (1 - u_a)(1 - c_a) + (1 - a)(1 - u_p) c_p \\
              p_{between} &= a u_a + (1 - a) u_p \\
              p_{below} &= a (1 - u_a) c_a + (1 - a)(1 - u_p)(1 - c_p)

    With :math:`u_a = u_p` and :math:`c_a = c_p = 0.9` this says what ASTM C876 says: nothing
    between the limits, odds of nine to one beyond them. The four probabilities are common to the
    structure and uncertain.

    The counts of n points in a zone are multinomial. Neighbouring points are not independent: the
    table is worth ``effective_points`` m in all, a zone its part of them by number, rounded to a
    whole number :math:`m_z` of at least one. The likelihood takes the shares of the classes as
    those of :math:`m_z` independent points, that is counts scaled by :math:`m_z / n_z` (the design
    effect of survey sampling [1]_); the simulator draws :math:`m_z` points.

    `Rows` has two rows for each table and zone: the shares of points at or below -200 mV, and
    below -350 mV.

    References
    ----------
    .. [1] L. Kish, Survey Sampling, Wiley, 1965, section 8.2 (design effect).
    """

    form = EvidenceForm(
        key="half_cell",
        title="Half-cell potentials",
        entry=HalfCellEntry,
        columns=(
            Column(
                "potential",
                "reading of one point, or of `count` points that read alike",
                "mV",
                required=False,
                above=-2000.0,
                below=2000.0,
                usual=(-800.0, 200.0),
            ),
            Column(
                "class",
                "in place of a potential: its class after ASTM C876, copper sulfate electrode",
                required=False,
                choices=CLASSES,
            ),
            Column(
                "count",
                "number of points of the row, 1 if left out",
                "-",
                required=False,
                above=0.0,
                below=1e9,
            ),
        ),
        value="potential",
        doubts=lambda _entry, table: doubtful_potentials(table),
    )
    unit = "-"
    log_scale = False
    assumption = (
        "A half-cell reading falls into its class by whether the bar there corrodes at the time of "
        "the survey, with probabilities common to the structure; points are places of their own, "
        "also where a bar was broken out or a current measured, and points of another survey are "
        "other points; readings count as the stated number of independent ones."
    )
    carrier = "onset"

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the probabilities of the classes, if potentials were measured."""
        if not gather(case, self.form.key):
            return ()
        return tuple(
            catalogue_variable(name, label, symbol, "-", entry)
            for name, (label, symbol, entry) in PROBABILITIES.items()
        )

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find rows without a class, unknown electrodes, too many points, sound zones."""
        items = gather(case, self.form.key)
        found = list(zones_without_corrosion(case, items, "potentials were measured"))
        for _, item in items:
            entry = cast(HalfCellEntry, item.entry)
            found += unusable_points(case, item, entry.electrode)
            total = float(_counts(item.table).sum())
            if entry.effective_points > total:
                found.append(
                    case.document.fault(
                        (*item.keys, "effective_points"),
                        "there are more independent points than points",
                        given=f"{entry.effective_points:g}",
                        allowed=f"1 to {total:g}",
                    )
                )
        return [*found, *restated_faults(case, self.variables(case), within_one)]

    def rows(self, case: Case) -> Rows | None:
        """Gather the shares of all surveys: two rows for each table and zone."""
        items = gather(case, self.form.key)
        if not items:
            return None
        groups = [group for stage, item in items for group in _groups(stage, item)]
        zones = tuple(dict.fromkeys(zone for _, zone, *_ in groups))
        zone = np.repeat([zones.index(name) for _, name, *_ in groups], LIMITS).astype(np.int64)
        stage = np.repeat([stage for stage, *_ in groups], LIMITS).astype(np.int64)
        return Rows(
            value=np.concatenate([share for *_, share in groups]),
            stage=stage,
            zone=zone,
            place=np.arange(len(zone)),
            place_zone=zone,
            zones=zones,
            places=("",) * len(zone),
            extra={
                "age": np.repeat([age for _, _, age, _, _ in groups], LIMITS),
                "points": np.repeat([points for *_, points, _ in groups], LIMITS),
            },
        )

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Effective counts by group and class; none of later surveys."""
        share = rows.value.reshape(-1, LIMITS)
        classes = np.column_stack([1.0 - share[:, 0], share[:, 0] - share[:, 1], share[:, 1]])
        active = rows.stage[::LIMITS] <= stage
        points = np.where(active, rows.extra["points"][::LIMITS], 0.0)
        return {"half_cell_counts": points[:, None] * classes}

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of the counts of all active surveys, up to a constant."""
        result: Numeric = 0.0
        for k, probability in enumerate(class_probabilities(rows, values)):
            counts = data["half_cell_counts"][:, k]
            result = result + (counts * op.log(op.maximum(probability, LEAST))).sum(axis=-1)
        return result

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw the shares of as many points as the surveys are worth."""
        probabilities = np.stack(class_probabilities(rows, values), axis=-1)
        probabilities = probabilities / probabilities.sum(axis=-1, keepdims=True)
        points = rows.extra["points"][::LIMITS].astype(np.int64)
        counts = rng.multinomial(points, probabilities)
        beyond = np.stack([counts[..., 1] + counts[..., 2], counts[..., 2]], axis=-1)
        share = beyond / points[:, None]
        return np.asarray(share.reshape(len(share), -1))

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Leave the section's local variables to others: a potential informs its zone."""
        return ()


def class_probabilities(rows: Rows, values: Mapping[str, Numeric]) -> list[Numeric]:
    """Give the probability of each class for each group of rows, last axis group."""
    zone, age = rows.zone[::LIMITS], rows.extra["age"][::LIMITS]
    median = zone_values(rows, values, "onset")[..., zone]
    scatter = zone_values(rows, values, "onset_scatter")[..., zone]
    score = (np.log(age) - op.log(median)) / scatter
    active, passive = op.normal_cdf(score), op.normal_cdf(-score)

    def chance(name: str) -> Numeric:
        return values[f"half_cell.{name}"][..., None]

    outside_active = active * (1.0 - chance("active_uncertain"))
    outside_passive = passive * (1.0 - chance("passive_uncertain"))
    right_active, right_passive = chance("active_told_right"), chance("passive_told_right")
    return [
        outside_active * (1.0 - right_active) + outside_passive * right_passive,
        active * chance("active_uncertain") + passive * chance("passive_uncertain"),
        outside_active * right_active + outside_passive * (1.0 - right_passive),
    ]


def _counts(table: Table) -> FloatArray:
    """Give the number of points of each row."""
    count = table.numbers["count"]
    return np.where(np.isfinite(count), count, 1.0)


def _groups(stage: int, item: Evidence) -> Iterator[tuple[int, str, float, float, FloatArray]]:
    """Go through stage, zone, age, effective points and shares of one table, zone by zone."""
    entry = cast(HalfCellEntry, item.entry)
    count = _counts(item.table)
    said = item.table.texts["class"]
    electrode = entry.electrode or "copper sulfate"
    potential = against_copper_sulfate(item.table.numbers["potential"], electrode)
    of_class = np.array([CLASSES.index(text) if text else -1 for text in said], dtype=np.int64)
    klass = np.where(of_class < 0, potential_class(potential), of_class)
    for zone in dict.fromkeys(item.zone.tolist()):
        here = np.bincount(klass, weights=count * (item.zone == zone), minlength=len(CLASSES))
        points = np.round(entry.effective_points * here.sum() / count.sum())
        share = np.array([here[1] + here[2], here[2]]) / here.sum()
        yield stage, zone, item.age, float(max(points, 1.0)), share
