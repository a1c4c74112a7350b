"""Evidence: diameters and counts of the sound bars found at sections."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess.case.forms import Column, EvidenceEntry, EvidenceForm
from assess.case.quantities import Length
from assess.case.reader import Case
from assess.errors import Fault
from assess.mechanics.reinforcement import BAR_DIAMETER_VARIATION
from assess.updating.bar_faults import (
    Looked,
    contradicted_bars,
    impossible_bars,
    nominal_diameters,
)
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    IntArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    membership,
)
from assess.updating.local import Local, LocalModel
from assess.updating.nested import nested_log_likelihood


class BarsFoundEntry(EvidenceEntry):
    """What a survey says of the bars that it found."""

    error: Length = Field(
        0.3,
        description="Standard deviation of the mean diameter of a ribbed bar as read. [mm] "
        "Engineering judgement, no source.",
    )
    replaces: bool = Field(
        False,
        description="true: where count or nominal diameter differ from those of the section, what "
        "was found holds from this survey on. Left out, the case is refused for the difference.",
    )


@dataclass(frozen=True, slots=True)
class Counted(LocalModel):
    """A number of bars that was found: known."""

    count: float
    names: tuple[str, ...] = ("bar count",)
    normals: tuple[str, ...] = ()

    def values(self, z: FloatArray, draws: IntArray) -> dict[str, FloatArray]:
        """Give the count everywhere."""
        return {"bar count": np.full(z.shape[:2], self.count)}

    def without_dependence(self, rng: np.random.Generator) -> "Counted":
        """Give itself: what is known depends on nothing."""
        return self


class BarsFound(EvidenceKind):
    r"""Bars: reading = diameter of the section's bars + error; a count is taken as known.

    Notes
    -----
    The area of a bar is normal about its nominal value with a coefficient of variation of 0.02
    [1]_, its diameter d therefore with half of that, :math:`\sigma_d = 0.01 d_{nom}`; the bars of
    a section are of one rolling and share it. With n readings of mean :math:`\bar d` and error e,
    d is normal with precision :math:`\sigma_d^{-2} + n e^{-2}`. No common variable is told
    anything: the likelihood is the same number for all of them.

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.2 (its dependence on yield strength, 0.5, is left
       out).
    """

    form = EvidenceForm(
        key="bars_found",
        title="Diameters of bars found",
        entry=BarsFoundEntry,
        columns=(
            Column(
                "diameter",
                "mean diameter of a sound bar, as read",
                "mm",
                above=0.0,
                below=100.0,
                usual=(5.0, 60.0),
            ),
            Column(
                "nominal diameter",
                "nominal diameter that the bar was found to have, where it is not the section's",
                "mm",
                required=False,
                above=0.0,
                below=100.0,
                usual=(5.0, 60.0),
            ),
            Column(
                "count",
                "number of tension bars that the whole section was found to have",
                "-",
                required=False,
                above=0.0,
                below=201.0,
            ),
        ),
        value="diameter",
    )
    unit = "mm"
    log_scale = False
    assumption = (
        "The sound bars of a section share one deviation from their nominal diameter (JCSS part "
        "3.2, area with V 0.02); a count that was found is exact."
    )
    carrier = ""

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find rows without a section, and bars that contradict it or each other."""
        items = gather(case, self.form.key)
        found = [fault for _, item in items for fault in impossible_bars(case, item)]
        if found:
            return found
        entries = [cast(BarsFoundEntry, item.entry) for _, item in items]
        looked = [
            Looked(stage, item, entry.error, entry.replaces)
            for (stage, item), entry in zip(items, entries, strict=True)
        ]
        return list(contradicted_bars(case, looked))

    def rows(self, case: Case) -> Rows | None:
        """Gather the diameters of all surveys, and the counts beside them."""
        items = gather(case, self.form.key)
        if not items:
            return None
        value = [item.table.numbers["diameter"] for _, item in items]
        errors = [cast(BarsFoundEntry, item.entry).error for _, item in items]
        nominals = nominal_diameters(case, items)
        nominal = [[nominals[section] for section in item.section.tolist()] for _, item in items]
        return build_rows(
            items,
            value,
            {
                "precision": [np.full(len(v), e**-2.0) for v, e in zip(value, errors, strict=True)],
                "count": [item.table.numbers["count"] for _, item in items],
                "nominal": [np.array(part, dtype=np.float64) for part in nominal],
            },
        )

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Diameters and precisions; later ones have precision 0."""
        return {
            "bars_found_value": rows.value,
            "bars_found_precision": np.where(rows.stage <= stage, rows.extra["precision"], 0.0),
        }

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active readings: the same for all common variables."""
        by_place = membership(rows.place, len(rows.places)).T
        residual = data["bars_found_value"] - rows.extra["nominal"]
        weighted = data["bars_found_precision"] * residual
        nominal = np.zeros(len(rows.places))
        nominal[rows.place] = rows.extra["nominal"]
        return nested_log_likelihood(
            data["bars_found_precision"] @ by_place,
            weighted @ by_place,
            (weighted * residual) @ by_place,
            (BAR_DIAMETER_VARIATION * nominal) ** 2,
        ).sum()

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw diameters of the same bars as read, shape (n_draw, n_row)."""
        draws = len(next(iter(values.values())))
        score = rng.standard_normal((draws, len(rows.places)))[:, rows.place]
        bar = rows.extra["nominal"] * (1.0 + BAR_DIAMETER_VARIATION * score)
        error = rng.standard_normal(bar.shape) / np.sqrt(rows.extra["precision"])
        return np.asarray(bar + error)

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Bar diameter, and count, at a section whose bars were looked at."""
        place = None if rows is None else rows.place_of(section)
        if rows is None or place is None:
            return ()
        here = np.flatnonzero((rows.place == place) & (rows.stage <= stage))
        if not len(here):
            return ()
        nominal = float(rows.extra["nominal"][here[0]])
        precision = rows.extra["precision"][here]
        total = (BAR_DIAMETER_VARIATION * nominal) ** -2.0 + precision.sum()
        mean = nominal + float(precision @ (rows.value[here] - nominal)) / total
        draws = len(next(iter(values.values())))
        found: list[LocalModel] = [
            Local("bar diameter", np.full(draws, mean), np.full(draws, total**-0.5))
        ]
        counts = rows.extra["count"][here]
        if np.isfinite(counts).any():
            found.append(Counted(float(counts[np.isfinite(counts)][-1])))  # the latest
        return tuple(found)
