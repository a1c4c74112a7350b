"""Evidence: widths of cracks along bars, read as loss of radius."""

from collections.abc import Mapping, Sequence
from typing import Annotated, Any, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm
from assess.case.processes import only_positive
from assess.case.quantities import CoefficientOfVariation, InUnit
from assess.case.reader import Case, Evidence
from assess.case.spec import NominalCover, Zone
from assess.errors import Fault
from assess.mechanics.cracking import (
    UNIFORM,
    cracking_penetration,
    penetration_from_width,
)
from assess.updating import corrosion_history as history
from assess.updating.corrosion_faults import zones_without_corrosion
from assess.updating.corrosion_history import LEAST_AGE, Places, Population
from assess.updating.crack_faults import Bars, closed_cracks, impossible_widths
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    zone_values,
)
from assess.updating.local import LocalModel
from assess.updating.measuring import catalogue_variable, restated_faults
from assess.updating.variables import Variable

NONE_FOUND = ("none", "no crack", "none found")
LOCAL = 6.0  # concentration of pitting attack: middle of 4 to 8 (Vidal et al. 2004, from memory)


class CrackWidthEntry(EvidenceEntry):
    """What a survey says of its cracks."""

    concentration: (
        Annotated[float, InUnit("-", "a concentration", at_least=UNIFORM, at_most=8.0)] | None
    ) = Field(
        None,
        description="Depth of the attack where it is deepest over the mean loss of radius, "
        "doubled for uniform attack: 2 uniform, 4 to 8 local (Vidal et al. 2004, from memory). "
        f"Left out: {UNIFORM:g}, or {LOCAL:g} in zones whose attack is pitting.",
    )
    error: CoefficientOfVariation = Field(
        0.1,
        description="Coefficient of variation of a loss read from one measured width about that "
        "from the width itself. Engineering judgement, no source.",
    )


class CrackWidth(EvidenceKind):
    r"""Crack widths: onset and corrosion current of a place, seen through the crack above its bar.

    Notes
    -----
    The relation of Vidal, Castel and François (2004) between width and area lost, with the loss
    that cracks the cover after Alonso et al. (1998), turns a width into a mean loss of radius x
    (`penetration_from_width`). What the crack of a place shows is

    .. math:: \ln x_{crack} = \ln x + \ln f + \delta, \quad \delta \sim N(0, s^2)

    with x the loss of radius of its bar, f the relation's error common to all cracks and
    :math:`\delta` that of the place (its cover, concrete, stirrups), the same at every visit. The
    cover has cracked when :math:`x_{crack}` reaches the loss :math:`x_0` that cracks it; then the
    width is read with an error of its own. No crack says that it has not, whether corrosion has
    begun or not. As :math:`\ln x_{crack}` is :math:`\ln` of the years since onset plus a normal
    variable, onset and rate integrate out as for break-outs (`corrosion_history.log_likelihood`),
    with median rate :math:`f \bar r` and variance :math:`s_r^2 + s^2`.

    `Rows.value` is :math:`\ln x_{crack}`.
    """

    form = EvidenceForm(
        key="crack_width",
        title="Crack widths, as loss of radius",
        entry=CrackWidthEntry,
        columns=(
            Column(
                "crack width",
                "width of the crack along the bar at the surface",
                "mm",
                above=0.0,
                below=100.0,
                usual=(0.03, 10.0),
                absent=NONE_FOUND,
            ),
            Column(
                "bar diameter",
                "diameter of the sound bar",
                "mm",
                above=0.0,
                below=100.0,
                usual=(5.0, 50.0),
            ),
            Column(
                "cover",
                "cover of that bar; left out: the mean that the case states of the zone",
                "mm",
                required=False,
                above=0.0,
                below=400.0,
                usual=(3.0, 150.0),
            ),
        ),
        value="crack width",
        log_scale=True,
    )
    unit = "mm"
    log_scale = True
    assumption = (
        "The crack along a bar shows its loss of radius by the relation of Vidal et al. (2004), up "
        "to a factor common to all cracks and one of the place; a bar without a crack has lost "
        "less than cracks its cover (Alonso et al. 1998); a place that was also looked at by other "
        "means counts as another place of the zone, and a crack at a section informs the zone, not "
        "the section's own onset and current."
    )
    carrier = "onset"

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the error and the scatter of the relation, if cracks were looked for."""
        if not gather(case, self.form.key):
            return ()
        return (
            catalogue_variable(
                "crack_width.factor",
                "loss read from crack widths over the true one",
                "$f_w$",
                "-",
                "crack width factor",
            ),
            catalogue_variable(
                "crack_width.scatter",
                "scatter of ln loss read from crack widths, from place to place",
                "$s_w$",
                "-",
                "crack width scatter",
            ),
        )

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find cracks that no bar could cause or that closed, and zones that do not corrode."""
        items = gather(case, self.form.key)
        found = list(zones_without_corrosion(case, items, "cracks along bars were looked for"))
        if not found:
            for _, item in items:
                found += impossible_widths(item.table, _bars(case, item))
        rows = None if found else self.rows(case)
        if rows is not None:
            found += closed_cracks(rows, items)
        return [*found, *restated_faults(case, self.variables(case), only_positive)]

    def rows(self, case: Case) -> Rows | None:
        """Gather the cracks of all surveys; `Rows.value` is ln of the loss of radius."""
        items = gather(case, self.form.key)
        if not items:
            return None
        value: list[FloatArray] = []
        extra: dict[str, list[FloatArray]] = {"age": [], "limit": [], "precision": []}
        for _, item in items:
            bars, width = _bars(case, item), item.table.numbers["crack width"]
            loss = penetration_from_width(bars.diameter, bars.cover, width, bars.concentration)
            value.append(np.log(loss))
            extra["limit"].append(np.log(cracking_penetration(bars.diameter, bars.cover)))
            extra["age"].append(np.full(len(width), item.age))
            error = cast(CrackWidthEntry, item.entry).error
            extra["precision"].append(np.full(len(width), 1.0 / np.log1p(error**2)))
        return build_rows(items, value, extra)

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Places with what was found at each visit, later surveys switched off."""
        found = history.places(rows, stage).data()
        return {_DATA + name: array for name, array in found.items()}

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active visits, onset and rate integrated out."""
        population = _population(rows, values)
        zone = rows.place_zone
        arrays = {name.removeprefix(_DATA): array for name, array in data.items() if _DATA in name}
        return history.log_likelihood(
            Places.from_data(arrays, history.count_visits(rows)),
            Population(*(part[..., zone, None] for part in population)),
        ).sum(axis=-1)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw ln of the loss that cracks would show, NaN where there would be none."""
        population = _population(rows, values)
        shape = (len(population.log_onset), len(rows.places))
        log_onset, onset_scatter, log_rate, rate_scatter = (
            part[:, rows.place_zone] for part in population
        )
        onset = np.exp(log_onset + onset_scatter * rng.standard_normal(shape))[:, rows.place]
        shown = (log_rate + rate_scatter * rng.standard_normal(shape))[:, rows.place]
        log_loss = shown + np.log(np.maximum(rows.extra["age"] - onset, LEAST_AGE))
        error = rng.standard_normal(log_loss.shape) / np.sqrt(rows.extra["precision"])
        return np.where(log_loss >= rows.extra["limit"], log_loss + error, np.nan)

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Leave onset and current of a section to the break-outs, which give them jointly."""
        return ()


_DATA = "crack_width_"


def _population(rows: Rows, values: Mapping[str, Numeric]) -> Population:
    """Give onset and shown rate of loss of each zone, last axis zone."""
    zone = history.population(
        *(
            zone_values(rows, values, name)
            for name in ("onset", "onset_scatter", "current", "current_scatter")
        )
    )
    factor, scatter = (values[f"crack_width.{name}"][..., None] for name in ("factor", "scatter"))
    return zone._replace(
        log_rate=zone.log_rate + op.log(factor),
        rate_scatter=op.sqrt(zone.rate_scatter**2 + scatter**2),
    )


def _bars(case: Case, item: Evidence) -> Bars:
    """Give what is known of the bar of each row."""
    zones = [case.spec.zones[zone] for zone in item.zone.tolist()]
    cover = item.table.numbers["cover"]
    cover = np.where(np.isfinite(cover), cover, [_mean_cover(zone) for zone in zones])
    stated = cast(CrackWidthEntry, item.entry).concentration
    concentration = np.array([_concentration(zone) if stated is None else stated for zone in zones])
    return Bars(item.table.numbers["bar diameter"], cover, concentration)


def _concentration(zone: Zone) -> float:
    pitting = zone.corrosion is not None and zone.corrosion.attack == "pitting"
    return LOCAL if pitting else UNIFORM


def _mean_cover(zone: Zone) -> float:
    """Give the mean that the case states of a zone's cover [mm]."""
    if isinstance(zone.cover, NominalCover):
        return zone.cover.nominal
    return float(zone.cover.mean.marginal().mean)
