"""Evidence: compressive strength of drilled cores."""

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any, Literal, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm
from assess.case.reader import Case
from assess.errors import Fault
from assess.mechanics.core_corrections import DIAMETER_RANGE
from assess.probability.marginals import make_marginal
from assess.updating.core_codes import code_strengths
from assess.updating.core_faults import impossible_bars, uncorrectable_cores
from assess.updating.core_values import BARS, CORRECTIONS, core_values, correction_shift
from assess.updating.kind import (
    CodeStrength,
    EvidenceKind,
    FloatArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    membership,
    population_local,
    zone_values,
)
from assess.updating.local import LocalModel, TabulatedLocal, quantile_table, scores_of_density
from assess.updating.nested import local_posterior, nested_log_likelihood
from assess.updating.robust import (
    Readings,
    padded_places,
    robust_local_density,
    robust_log_likelihood,
)
from assess.updating.variables import Variable

SOURCES = {"bar": "engineering judgement, no source: half of what the correction for bars adds"}


class CoresEntry(EvidenceEntry):
    """What a survey says of its cores."""

    correction: Literal["ACI 214.4R", "EN 13791", "none"] = Field(
        "ACI 214.4R",
        description="Factors from the tested core to the strength in the structure, as of a core "
        "twice as long as wide; 'none' where the table already holds corrected strengths.",
    )
    within_location: float = Field(
        0.05,
        gt=0,
        le=0.3,
        description="Coefficient of variation of one core about the strength of its location: "
        "test repeatability and variation within a section. Engineering judgement, no source.",
    )
    errors: Literal["normal", "Student-t"] = Field(
        "normal",
        description="How ln of a core's strength scatters about that of its location. Student-t "
        "lets a core that is far off (a crack, a lost label) count for little.",
    )
    freedom: float = Field(
        4.0,
        ge=1.0,
        le=100.0,
        description="Degrees of freedom of Student-t errors. 4 is common practice, no source.",
    )


class Cores(EvidenceKind):
    r"""Cores: ln of corrected strength = ln of local strength + correction error + scatter.

    Notes
    -----
    For core i at place j of a zone, with :math:`y_i` the logarithm of the strength after the
    factors of ACI 214.4R-10 or EN 13791:2019:

    .. math:: y_i = u_j + \sum_k V_{ik} b_k + e_i, \quad u_j \sim N(\mu, \sigma^2),
              \quad e_i \sim N(0, s^2)

    The errors :math:`b_k` of the correction factors are common to all cores of the structure
    (a factor that is wrong is wrong for every core it is applied to), standard normal, with
    :math:`V_{ik}` the coefficient of variation that the source gives for the factor. Local
    strengths are integrated out (`nested_log_likelihood`; with Student-t errors, of scale s and
    the stated degrees of freedom, `robust_log_likelihood`).
    """

    form = EvidenceForm(
        key="cores",
        title="Core strengths",
        entry=CoresEntry,
        columns=(
            Column(
                "strength",
                "compressive strength of the core as tested",
                "MPa",
                above=0.0,
                below=300.0,
                usual=(8.0, 110.0),
            ),
            Column("diameter", "core diameter", "mm", above=0.0, usual=DIAMETER_RANGE),
            Column("length", "length when tested, capped", "mm", above=0.0, usual=(40.0, 400.0)),
            Column(
                "moisture",
                "condition when tested",
                choices=("as received", "soaked", "air dried"),
            ),
            *(
                Column(name, what, "mm", required=False, above=0.0, below=above)
                for pair, which in zip(BARS, ("a bar", "a second bar"), strict=True)
                for name, what, above in (
                    (pair[0], f"diameter of {which} across the core", 60.0),
                    (pair[1], f"distance of {which} from the nearer end of the core", 400.0),
                )
            ),
        ),
        value="strength",
        log_scale=True,
    )
    unit = "MPa"
    log_scale = True
    assumption = (
        "Core strengths of a zone are lognormal from place to place; the errors of the correction "
        "factors (ACI 214.4R-10 or EN 13791:2019, as the case says) are common to all cores."
    )
    carrier = "concrete_mean"

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find cores whose shape the correction does not cover."""
        return [
            fault
            for _, item in gather(case, self.form.key)
            if (rule := cast(CoresEntry, item.entry).correction) != "none"
            for fault in (
                *uncorrectable_cores(self.form, item.table, rule),
                *impossible_bars(self.form, item.table),
            )
        ]

    def rows(self, case: Case) -> Rows | None:
        """Gather the cores of all surveys, corrected."""
        items = gather(case, self.form.key)
        if not items:
            return None
        found = [core_values(i.table, cast(CoresEntry, i.entry).correction) for _, i in items]
        counts = [len(values.log_strength) for values in found]
        entries = [cast(CoresEntry, item.entry) for _, item in items]
        per_core = [
            (1.0 / np.log1p(entry.within_location**2), _freedom(entry)) for entry in entries
        ]
        return build_rows(
            items,
            [values.log_strength for values in found],
            {
                "loading": [values.loading for values in found],
                "precision": [np.full(n, p) for n, (p, _) in zip(counts, per_core, strict=True)],
                "freedom": [np.full(n, f) for n, (_, f) in zip(counts, per_core, strict=True)],
            },
        )

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the errors of the correction factors that the case's cores need."""
        rows = self.rows(case)
        if rows is None:
            return ()
        return tuple(
            Variable(
                name=f"cores.{name}_correction",
                label=f"error of the {name} correction of cores, in its standard deviations",
                symbol=f"$b_\\mathrm{{{name}}}$",
                unit="-",
                zone="",
                source=SOURCES.get(
                    name, "ACI 214.4R-10, coefficients of variation of the correction factors"
                ),
                marginal=make_marginal("normal", parameters={"mean": 0.0, "sd": 1.0}),
            )
            for k, name in enumerate(CORRECTIONS)
            if np.any(rows.extra["loading"][:, k] > 0.0)
        )

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Values and precisions; later cores have precision 0."""
        return {
            "cores_value": rows.value,
            "cores_precision": np.where(rows.stage <= stage, rows.extra["precision"], 0.0),
        }

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active cores, local strengths integrated out."""
        log_mean = op.log(zone_values(rows, values, "concrete_mean"))
        variance = zone_values(rows, values, "concrete_scatter") ** 2
        reading = data["cores_value"] - correction_shift(rows, values)
        heavy = np.unique(rows.place[np.isfinite(rows.extra["freedom"])])
        residual = reading - log_mean[..., rows.zone]
        plain = ~np.isin(rows.place, heavy)
        precision = data["cores_precision"] * plain
        weighted = precision * residual
        by_place = membership(rows.place, len(rows.places)).T
        result = nested_log_likelihood(
            precision @ by_place,
            weighted @ by_place,
            (weighted * residual) @ by_place,
            variance[..., rows.place_zone],
        ).sum(axis=-1)
        if len(heavy) == 0:
            return result
        row, once = padded_places(rows.place, heavy)
        readings = Readings(
            reading[..., row], data["cores_precision"][row] * once, rows.extra["freedom"][row]
        )
        zone = rows.place_zone[heavy]
        robust = robust_log_likelihood(readings, log_mean[..., zone], variance[..., zone])
        return result + robust.sum(axis=-1)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw log strengths of the same cores, shape (n_draw, n_row)."""
        log_mean = np.log(zone_values(rows, values, "concrete_mean"))
        scatter = zone_values(rows, values, "concrete_scatter")
        local = log_mean[:, rows.place_zone] + scatter[:, rows.place_zone] * rng.standard_normal(
            (len(log_mean), len(rows.places))
        )
        shape, freedom = (len(log_mean), len(rows.value)), rows.extra["freedom"]
        heavy = np.isfinite(freedom)
        error = rng.standard_normal(shape)
        degrees = np.where(heavy, freedom, 1.0)
        error = np.where(heavy, error / np.sqrt(rng.chisquare(degrees, shape) / degrees), error)
        return np.asarray(
            local[:, rows.place]
            + correction_shift(rows, values)
            + error / np.sqrt(rows.extra["precision"])
        )

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Strength at a section, given its own cores where there are any."""
        population = population_local(
            "strength", values, zone, "concrete_mean", "concrete_scatter", logarithm=True
        )
        place = None if rows is None else rows.place_of(section)
        if rows is None or place is None:
            return (population,)
        here = (rows.place == place) & (rows.stage <= stage)
        reading = rows.value - correction_shift(rows, values)
        freedom = rows.extra["freedom"][here]
        if np.isfinite(freedom).any():
            value = np.broadcast_to(reading, (len(population.mean), len(rows.value)))[:, here]
            grid, density = robust_local_density(
                value, rows.extra["precision"][here], freedom, population.mean, population.sd
            )
            scores, _ = scores_of_density(grid, density)
            return (TabulatedLocal("strength", np.exp(quantile_table(grid, scores))),)
        precision = np.where(here, rows.extra["precision"], 0.0)
        residual = reading - population.mean[:, None]
        mean, sd = local_posterior(
            precision.sum(), residual @ precision, population.mean, population.sd**2
        )
        return (replace(population, mean=mean, sd=sd),)

    def code_strengths(self, rows: Rows) -> Sequence[CodeStrength]:
        """Characteristic strength of each zone by the codes."""
        return code_strengths(rows)


def _freedom(entry: CoresEntry) -> float:
    """Degrees of freedom of the errors, infinite where they are normal."""
    return entry.freedom if entry.errors == "Student-t" else np.inf
