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
from assess.mechanics.core_corrections import DIAMETER_RANGE, correction
from assess.probability.marginals import make_marginal
from assess.updating.core_faults import uncorrectable_cores
from assess.updating.kind import (
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
from assess.updating.local import LocalModel
from assess.updating.nested import local_posterior, nested_log_likelihood
from assess.updating.variables import Variable

CORRECTIONS = ("length", "diameter", "moisture", "damage")


class CoresEntry(EvidenceEntry):
    """What a survey says of its cores."""

    correction: Literal["ACI 214.4R", "none"] = Field(
        "ACI 214.4R",
        description="Factors from the tested core to the strength in the structure; 'none' where "
        "the table already holds corrected strengths.",
    )
    within_location: float = Field(
        0.05,
        gt=0,
        le=0.3,
        description="Coefficient of variation of one core about the strength of its location: "
        "test repeatability and variation within a section. Engineering judgement, no source.",
    )


class Cores(EvidenceKind):
    r"""Cores: ln of corrected strength = ln of local strength + correction error + scatter.

    Notes
    -----
    For core i at place j of a zone, with :math:`y_i` the logarithm of the strength after the
    factors of ACI 214.4R-10:

    .. math:: y_i = u_j + \sum_k V_{ik} b_k + e_i, \quad u_j \sim N(\mu, \sigma^2),
              \quad e_i \sim N(0, s^2)

    The errors :math:`b_k` of the correction factors are common to all cores of the structure
    (a factor that is wrong is wrong for every core it is applied to), standard normal, with
    :math:`V_{ik}` the coefficient of variation that the source gives for the factor. Local
    strengths are integrated out (`nested_log_likelihood`).
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
        ),
        value="strength",
        log_scale=True,
    )
    unit = "MPa"
    log_scale = True
    assumption = (
        "Core strengths of a zone are lognormal from place to place; the errors of the correction "
        "factors of ACI 214.4R-10 are common to all cores."
    )
    carrier = "concrete_mean"

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find cores whose shape the correction does not cover."""
        return [
            fault
            for _, item in gather(case, self.form.key)
            if cast(CoresEntry, item.entry).correction != "none"
            for fault in uncorrectable_cores(self.form, item.table)
        ]

    def rows(self, case: Case) -> Rows | None:
        """Gather the cores of all surveys, corrected."""
        items = gather(case, self.form.key)
        if not items:
            return None
        value: list[FloatArray] = []
        loading: list[FloatArray] = []
        precision: list[FloatArray] = []
        for _, item in items:
            entry = cast(CoresEntry, item.entry)
            strength = item.table.numbers["strength"]
            if entry.correction == "none":
                factor = np.ones_like(strength)
                errors = np.zeros((len(strength), len(CORRECTIONS)))
            else:
                factors = correction(
                    strength,
                    item.table.numbers["diameter"],
                    item.table.numbers["length"],
                    item.table.texts["moisture"],
                )
                factor = factors.factor
                errors = np.stack(
                    [
                        np.broadcast_to(v, strength.shape)
                        for v in (
                            factors.V_length,
                            factors.V_diameter,
                            factors.V_moisture,
                            factors.V_damage,
                        )
                    ],
                    axis=-1,
                )
            value.append(np.log(strength * factor))
            loading.append(errors)
            scatter = np.log1p(entry.within_location**2)
            precision.append(np.full(len(strength), 1.0 / scatter))
        return build_rows(items, value, {"loading": loading, "precision": precision})

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
                source="ACI 214.4R-10, coefficients of variation of the correction factors",
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

    def _shift(self, rows: Rows, values: Mapping[str, Numeric]) -> Numeric:
        """Sum the correction errors of each core, last axis row."""
        shift: Numeric = 0.0
        for k, name in enumerate(CORRECTIONS):
            error = values.get(f"cores.{name}_correction")
            if error is not None:
                shift = shift + error[..., None] * rows.extra["loading"][:, k]
        return shift

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active cores, local strengths integrated out."""
        log_mean = op.log(zone_values(rows, values, "concrete_mean"))
        variance = zone_values(rows, values, "concrete_scatter") ** 2
        residual = data["cores_value"] - log_mean[..., rows.zone] - self._shift(rows, values)
        weighted = data["cores_precision"] * residual
        by_place = membership(rows.place, len(rows.places)).T
        return nested_log_likelihood(
            data["cores_precision"] @ by_place,
            weighted @ by_place,
            (weighted * residual) @ by_place,
            variance[..., rows.place_zone],
        ).sum(axis=-1)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw log strengths of the same cores, shape (n_draw, n_row)."""
        log_mean = np.log(zone_values(rows, values, "concrete_mean"))
        scatter = zone_values(rows, values, "concrete_scatter")
        local = log_mean[:, rows.place_zone] + scatter[:, rows.place_zone] * rng.standard_normal(
            (len(log_mean), len(rows.places))
        )
        error = rng.standard_normal((len(log_mean), len(rows.value)))
        return np.asarray(
            local[:, rows.place]
            + self._shift(rows, values)
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
        precision = np.where(here, rows.extra["precision"], 0.0)
        residual = rows.value - self._shift(rows, values) - population.mean[:, None]
        mean, sd = local_posterior(
            precision.sum(), residual @ precision, population.mean, population.sd**2
        )
        return (replace(population, mean=mean, sd=sd),)
