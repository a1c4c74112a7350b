"""Evidence: densities and thicknesses that permanent loads are proportional to."""

from collections.abc import Iterator, Mapping, Sequence
from functools import lru_cache
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm
from assess.case.load_quantities import MEASURED
from assess.case.quantities import CoefficientOfVariation
from assess.case.reader import Case, Evidence
from assess.case.yamlfile import listed, nearest
from assess.errors import Fault
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    Numeric,
    Rows,
    gather,
    index_places,
)
from assess.updating.local import LocalModel
from assess.updating.place_statistics import Places, normal_log_likelihood, without_prefix
from assess.updating.row_faults import unknown_sections

# Generous ranges of what structures are loaded with, to catch another unit.
_USUAL = {
    "weight density": (8.0, 80.0),
    "density": (800.0, 8000.0),
    "thickness": (5.0, 1000.0),
    "weight per area": (0.05, 30.0),
}


class QuantitiesEntry(EvidenceEntry):
    """What a survey says of the readings of one quantity."""

    quantity: str = Field(description="name under `quantities`")
    error: CoefficientOfVariation = Field(
        description="standard deviation of one reading about the quantity at its place, over the "
        "quantity's stated mean"
    )


class Quantities(EvidenceKind):
    r"""Quantities: reading = mean of the structure + deviation of the place + error.

    Notes
    -----
    A quantity at a place is :math:`N(m, s^2)`, m and s common to the structure; readings of one
    place share it. Loads are integrals over a member, in which the places' deviations average
    out: they are proportional to m. `Rows.value` is the reading over the stated mean
    :math:`m_0`; places read alike enter through sufficient statistics
    (`place_statistics.normal_log_likelihood`).
    """

    form = EvidenceForm(
        key="quantities",
        title="Densities and thicknesses, over their stated means",
        entry=QuantitiesEntry,
        columns=tuple(
            Column(
                name,
                f"{name} as read",
                unit,
                required=False,
                above=0.0,
                below=20.0 * _USUAL[name][1],  # nothing built is so heavy or so thick
                usual=_USUAL[name],
            )
            for name, unit in MEASURED.items()
        ),
        value=next(iter(MEASURED)),
        zoned=False,
    )
    unit = "-"
    log_scale = False
    assumption = (
        "Densities and thicknesses are normal from place to place; permanent loads are "
        "proportional to their means over the structure."
    )
    carrier = ""

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find quantities that do not exist or do not scatter, and rows without their value."""
        found: list[Fault] = []
        for _, item in gather(case, self.form.key):
            found += _unknown(case, item)
            found += unknown_sections(case, item)
        return found

    def rows(self, case: Case) -> Rows | None:
        """Gather the readings of all surveys, each over the stated mean of its quantity."""
        items = gather(case, self.form.key)
        if not items:
            return None
        entries = [cast(QuantitiesEntry, item.entry) for _, item in items]
        names = tuple(dict.fromkeys(entry.quantity for entry in entries))
        means = np.array([case.spec.quantities[name].stated_mean for name in names])
        value: list[FloatArray] = []
        keys: list[str] = []
        for (_, item), entry in zip(items, entries, strict=True):
            quantity = case.spec.quantities[entry.quantity]
            value.append(item.table.numbers[quantity.of] / quantity.stated_mean)
            keys += [
                f"{entry.quantity}: {section or location}" if section or location else ""
                for section, location in zip(item.section, item.location, strict=True)
            ]
        counts = [len(part) for part in value]
        of_item = np.array([names.index(entry.quantity) for entry in entries], dtype=np.int64)
        quantity_of = np.repeat(of_item, counts)
        place, places = index_places(keys)
        place_zone = np.zeros(len(places), dtype=np.int64)
        place_zone[place] = quantity_of
        return Rows(
            value=np.concatenate(value),
            stage=np.repeat([stage for stage, _ in items], counts),
            zone=quantity_of,
            place=place,
            place_zone=place_zone,
            zones=tuple(f"quantity.{name}" for name in names),
            places=places,
            extra={
                "precision": np.repeat([entry.error**-2.0 for entry in entries], counts),
                "mean": means[quantity_of],
            },
        )

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Statistics of places read alike, with later surveys switched off."""
        return dict(_places(rows).data(rows.value, stage))

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active readings, values of the places integrated out."""
        of = _places(rows).group_population
        level, scatter = (part[..., of] for part in _population(rows, values))
        found = without_prefix(_PREFIX, data)
        return normal_log_likelihood(found, level, scatter**2).sum(axis=-1)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw readings of the same places, shape (n_draw, n_row)."""
        level, scatter = (part[:, rows.place_zone] for part in _population(rows, values))
        local = level + scatter * rng.standard_normal(level.shape)
        error = rng.standard_normal((len(level), len(rows.value)))
        return np.asarray(local[:, rows.place] + error / np.sqrt(rows.extra["precision"]))

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Give none: loads follow the structure's means, which are common variables."""
        return ()


_PREFIX = "quantities"


@lru_cache(maxsize=8)
def _places(rows: Rows) -> Places:
    """Arrange readings by places; kept, for it is asked for with every evaluation."""
    return Places(
        prefix=_PREFIX,
        latent=rows.place,
        population=rows.place_zone[rows.place],
        sort=np.zeros(len(rows.value), dtype=np.int64),
        precision=rows.extra["precision"],
        stage=rows.stage,
    )


def _population(rows: Rows, values: Mapping[str, Numeric]) -> tuple[Numeric, Numeric]:
    """Mean and scatter of each quantity over its stated mean, last axis quantity."""
    stated = np.ones(len(rows.zones))
    stated[rows.zone] = rows.extra["mean"]
    level = op.stack_last([values[name] for name in rows.zones])
    scatter = op.stack_last([values[f"{name}.scatter"] for name in rows.zones])
    return level / stated, scatter / stated


def _unknown(case: Case, item: Evidence) -> Iterator[Fault]:
    """Find what keeps a table from telling of a quantity."""
    name, known = cast(QuantitiesEntry, item.entry).quantity, case.spec.quantities
    if name not in known:
        what = "there is no quantity of this name"
        allowed = listed(known) or "none; state it under quantities"
        keys = (*item.keys, "quantity")
        near = nearest(name, known)
        yield case.document.fault(keys, what, given=name, allowed=allowed, mend=near)
        return
    quantity = known[name]
    if quantity.scatter is None:
        what = "the quantity was measured but its scatter from place to place is not stated"
        mend = f"add scatter: (a distribution in {quantity.unit})"
        yield case.document.fault(("quantities", name), what, mend=mend)
    for row in np.flatnonzero(~np.isfinite(item.table.numbers[quantity.of])):
        line = int(item.table.lines[row])
        what = f"column {quantity.of!r} has no value, which quantity {name!r} needs"
        yield Fault(str(item.table.path), line, what, "", f"a {quantity.of}")
