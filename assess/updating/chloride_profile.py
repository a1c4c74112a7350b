"""Evidence: chloride profiles, contents of increments of depth at several places."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm, Judged, Table
from assess.case.processes import only_positive
from assess.case.reader import Case, Evidence
from assess.errors import Fault
from assess.probability.marginals import make_marginal
from assess.units import NONE
from assess.updating.bounds import bounded, is_below
from assess.updating.chloride_entry import PERCENT, ChlorideProfileEntry, table_rows
from assess.updating.chloride_increments import Increments, summarise
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    IntArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    membership,
    zone_values,
)
from assess.updating.local import LocalModel
from assess.updating.measuring import catalogue_variable, restated_faults
from assess.updating.process_faults import rows_without_process
from assess.updating.profile_faults import (
    contradicting_binders,
    restated_scores,
    unusable_increments,
)
from assess.updating.profile_locals import (
    Locals,
    Population,
    ProfileData,
    local_values,
    score_names,
    scores_of,
)
from assess.updating.variables import Variable

KEY = "chloride_profile"
BINDER_PRIOR = "binder content over that stated"


def _no_outliers(_entry: EvidenceEntry, table: Table) -> FloatArray:
    """Judge nothing: contents of a sound profile lie far from each other, as depths do."""
    return np.full(len(table), np.nan)


@dataclass(frozen=True, slots=True, eq=False)
class _Visits:
    """Profiles: the rows of one place in one table."""

    of_row: IntArray
    place: IntArray  # (n_visit,)
    row: IntArray  # a row of each, (n_visit,)


class ChlorideProfile(EvidenceKind):
    r"""Chloride profile: content = mean of the diffusion profile over the increment + error.

    Notes
    -----
    For increment i from :math:`x_1` to :math:`x_2` at place j of a zone, at age t:

    .. math:: c_i = f \left[C_0 + (C_{s,j} - C_0) \frac{1}{x_2 - x_1} \int_{x_1}^{x_2}
              \mathrm{erfc} \frac{x - \Delta x}{2 \sqrt{D_j (t_0 / t)^a\, t}}\, dx\right] + e_i

    (`assess.mechanics.chloride.mean_content`), with :math:`\ln C_{s,j}` and :math:`\ln D_j` normal
    within the zone and shared by all increments of the place at all ages, and
    :math:`e_i \sim N(0, (V c)^2 + s_0^2)` about the true content c. A content "<0.01" enters with
    its lower tail probability. f is the binder content over that stated, one for the concrete of a
    zone and 1 where contents are by mass of binder. Increments that begin above the convection
    depth :math:`\Delta x` are left out.

    A profile says much of its own :math:`C_s` and D and their likelihood is no closed form, so they
    are sampled, as scores of `profile_locals`.
    """

    form = EvidenceForm(
        key=KEY,
        title="Chloride contents",
        entry=ChlorideProfileEntry,
        columns=(
            Column("from", "depth at which the increment begins", "mm", usual=(0.0, 200.0)),
            Column("to", "depth at which the increment ends", "mm", above=0.0, usual=(1.0, 250.0)),
            Column(
                "chloride",
                "chloride content, mass fraction of what the entry says",
                NONE,
                above=0.0,
                below=0.2,
                usual=(1e-6, 0.06),
                below_detection=True,
            ),
        ),
        value="chloride",
        judged=Judged("chloride content", _no_outliers),
        apart=("from",),
    )
    unit = "%"
    log_scale = False
    assumption = (
        "Chlorides enter by diffusion from the convection depth on, with a surface content that "
        "lasts and an apparent coefficient that falls as a power of age; both are lognormal from "
        "place to place within the zone and independent of each other there. Increments that begin "
        "above the convection depth are not used; contents are in percent of binder."
    )
    carrier = "surface_chloride"

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find what no profile can be made of."""
        items = gather(case, KEY)
        found = list(rows_without_process(case, items, "chloride", "chlorides were measured"))
        if found:
            return found
        depth = {
            name: zone.chloride.convection_depth
            for name, zone in case.spec.zones.items()
            if zone.chloride is not None
        }
        for _, item in items:
            found += unusable_increments(item, depth)
        shares = [(item, cast(ChlorideProfileEntry, item.entry).binder_share) for _, item in items]
        found += contradicting_binders(case, shares)
        if not found and items:
            variables = self.variables(case)
            factors = [one for one in variables if not one.zone]
            found += restated_scores(case, {one.name for one in variables if one.zone})
            found += restated_faults(case, factors, only_positive)
        return found

    def rows(self, case: Case) -> Rows | None:
        """Gather the increments that diffusion rules; `Rows.value` is in percent of binder."""
        items = gather(case, KEY)
        if not items:
            return None
        used: list[tuple[int, Evidence]] = []
        parts: list[dict[str, FloatArray]] = []
        for number, (stage, item) in enumerate(items):
            part = table_rows(item, case) | {"table": np.full(len(item.table), float(number))}
            keep = part["start"] >= 0.0
            parts.append({name: array[keep] for name, array in part.items()})
            places = {name: getattr(item, name)[keep] for name in ("zone", "section", "location")}
            used.append((stage, replace(item, **places)))
        value = [part.pop("value") for part in parts]
        return build_rows(used, value, {name: [p[name] for p in parts] for name in parts[0]})

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the scores of each place, and the binder factor of each zone that needs one."""
        rows = self.rows(case)
        if rows is None:
            return ()
        standard = make_marginal("normal", mean=0.0, sd=1.0)
        found = []
        for place, zone in zip(rows.places, rows.place_zone, strict=True):
            words = ("surface chloride", "diffusion coefficient")
            for name, what in zip(score_names(KEY, place), words, strict=True):
                label = f"score of the {what} at {place.removeprefix(f'{rows.zones[zone]}: ')}"
                head = (name, label, "$z$", "-", rows.zones[zone])
                found.append(Variable(*head, "by construction", standard, latent=True))
        for zone in _scaled_zones(rows):
            label = f"binder content over that stated, {zone}"
            found.append(catalogue_variable(_factor_name(zone), label, "$f$", "-", BINDER_PRIOR))
        return tuple(found)

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Contents with weights that switch later surveys off, and summaries of the profiles."""
        active, below = rows.stage <= stage, is_below(rows.value)
        visits = _visits(rows)
        summary = summarise(_increments(rows), rows.value, active, visits.of_row, len(visits.place))
        precision = summary.precision
        return {
            f"{KEY}_value": np.nan_to_num(rows.value),
            f"{KEY}_read": np.where(active & np.isfinite(rows.value), 1.0, 0.0),
            f"{KEY}_below": np.where(active & below, 1.0, 0.0),
            f"{KEY}_precision": np.stack(
                [precision[:, 0, 0], precision[:, 0, 1], precision[:, 1, 1]]
            ),
            f"{KEY}_linear": summary.linear.T.copy(),
        }

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active increments, with the weight of the local values."""
        known = self.local_values(rows, values, data)
        content = self._content(rows, values, known.log_surface, known.log_diffusion)
        increments = _increments(rows)
        sd = increments.sd(content)
        read = op.normal_logpdf((data[f"{KEY}_value"] - content) / sd) - op.log(sd)
        result = (data[f"{KEY}_read"] * read).sum(axis=-1) + known.log_weight.sum(axis=-1)
        limited = np.flatnonzero(np.isfinite(increments.limit))
        if len(limited):
            score = (increments.limit[limited] - content[..., limited]) / sd[..., limited]
            below = data[f"{KEY}_below"][limited] * op.log_normal_cdf(score)
            result = result + below.sum(axis=-1)
        return result

    def local_values(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Locals:
        """Local surface content and diffusion coefficient of each place, last axis place.

        Parameters
        ----------
        rows : Rows
            All increments.
        values : mapping
            Common variables and scores, of draws or as graph variables.
        data : mapping
            From `data`, of the stage that the draws belong to.
        """
        visits = _visits(rows)
        exponent = zone_values(rows, values, "age_exponent")[..., rows.zone[visits.row]]
        profiles = ProfileData(
            data[f"{KEY}_precision"],
            data[f"{KEY}_linear"],
            membership(visits.place, len(rows.places)).T,
        )
        offset = (
            op.log(_factor(rows, values))[..., visits.row],
            exponent * rows.extra["log_ratio"][visits.row],
        )
        population = _population(rows, values)
        return local_values(profiles, population, scores_of(KEY, rows.places, values), offset)

    def _content(
        self,
        rows: Rows,
        values: Mapping[str, Numeric],
        log_surface: Numeric,
        log_diffusion: Numeric,
    ) -> Numeric:
        """Content that each increment should show, given its place's values, last axis row."""
        exponent = zone_values(rows, values, "age_exponent")[..., rows.zone]
        log_apparent = log_diffusion[..., rows.place] + exponent * rows.extra["log_ratio"]
        content = _increments(rows).content(log_surface[..., rows.place], log_apparent)
        return content * _factor(rows, values)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw contents of the same increments at new places; NaN below the detection limit."""
        zone = _population(rows, values)
        shape = (len(zone.log_surface), len(rows.places))
        log_surface = zone.log_surface + zone.surface_scatter * rng.standard_normal(shape)
        log_diffusion = zone.log_diffusion + zone.diffusion_scatter * rng.standard_normal(shape)
        content = self._content(rows, values, log_surface, log_diffusion)
        sd = _increments(rows).sd(content)
        measured = content + sd * rng.standard_normal(content.shape)
        return bounded(measured, rows.extra["limit"], np.full(len(rows.value), np.inf))

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Give no local variable: no limit state has one of chloride."""
        return ()


def _increments(rows: Rows) -> Increments:
    extra = rows.extra
    return Increments(
        extra["start"],
        extra["end"],
        np.log(extra["age"]),
        extra["initial"],
        extra["variation"],
        extra["absolute"],
        extra["limit"],
    )


def _visits(rows: Rows) -> _Visits:
    key = np.column_stack([rows.place, rows.extra["table"]])
    visits, row, of_row = np.unique(key, axis=0, return_index=True, return_inverse=True)
    return _Visits(of_row.astype(np.int64).ravel(), visits[:, 0].astype(np.int64), row)


def _population(rows: Rows, values: Mapping[str, Numeric]) -> Population:
    """Zone parameters at each place."""
    surface, surface_scatter, diffusion, diffusion_scatter = (
        zone_values(rows, values, name)[..., rows.place_zone]
        for name in (
            "surface_chloride",
            "surface_chloride_scatter",
            "diffusion",
            "diffusion_scatter",
        )
    )
    return Population(
        op.log(PERCENT * surface), op.log(diffusion), surface_scatter, diffusion_scatter
    )


def _factor_name(zone: str) -> str:
    return f"{KEY}.{zone}.binder_content"


def _scaled_zones(rows: Rows) -> list[str]:
    """Zones some of whose contents were converted from the mass of concrete."""
    scaled = np.unique(rows.zone[rows.extra["scaled"] > 0.0])
    return [rows.zones[zone] for zone in scaled]


def _factor(rows: Rows, values: Mapping[str, Numeric]) -> Numeric:
    """Binder content over that stated, for each row; 1 where contents are of binder."""
    reference = values[f"{rows.zones[0]}.age_exponent"]
    columns = [values.get(_factor_name(zone), 1.0 + 0.0 * reference) for zone in rows.zones]
    excess = op.stack_last(columns)[..., rows.zone] - 1.0
    return 1.0 + rows.extra["scaled"] * excess
