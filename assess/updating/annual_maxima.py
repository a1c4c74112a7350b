"""Evidence: largest load effects of periods, from monitoring or weighing in motion."""

from collections.abc import Mapping, Sequence
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm
from assess.case.load_models import LoadModel
from assess.case.quantities import CoefficientOfVariation
from assess.case.reader import Case
from assess.errors import Fault
from assess.probability.generalised_extreme import LEAST_REDUCED, log_density, standard_value
from assess.updating.kind import EvidenceKind, FloatArray, Numeric, Rows, build_rows, gather
from assess.updating.local import LocalModel

MAXIMUM = {"moment": "maximum moment", "force": "maximum force"}
NODES = 7  # Gauss-Hermite, over the error of a recorded maximum


class AnnualMaximaEntry(EvidenceEntry):
    """What a survey says of recorded maxima."""

    load_model: str = Field(description="name under `load_models`")
    error: CoefficientOfVariation | None = Field(
        None,
        description="coefficient of variation of a recorded maximum about the true one; left out: "
        "recorded without error",
    )


class AnnualMaxima(EvidenceKind):
    r"""Maxima: independent largest values of stated periods of a stationary load.

    Notes
    -----
    With the yearly distribution function F the largest value of a period of T years has
    :math:`F^T` (`generalised_extreme.log_density`). A recorded maximum is the true one times a
    lognormal error, where one is stated; the true one is integrated out by Gauss-Hermite
    quadrature, which is exact for a density that is smooth over the error.
    """

    form = EvidenceForm(
        key="annual_maxima",
        title="Largest load effects",
        entry=AnnualMaximaEntry,
        columns=(
            Column(
                MAXIMUM["moment"],
                "largest moment of the period",
                "N*mm",
                required=False,
                above=0.0,
                usual=(1e6, 1e11),
            ),
            Column(
                MAXIMUM["force"],
                "largest force of the period",
                "N",
                required=False,
                above=0.0,
                usual=(1e3, 1e8),
            ),
            Column(
                "period",
                "length of the period, a year if left out",
                "yr",
                required=False,
                above=0.0,
                below=100.0,
                usual=(0.01, 50.0),
            ),
        ),
        value=MAXIMUM["moment"],
        log_scale=True,
        zoned=False,
    )
    unit = "-"
    log_scale = False
    assumption = (
        "Recorded maxima of different periods are independent, and the load is stationary but for "
        "the growth that is stated."
    )
    carrier = "location"

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find unknown load models, and maxima of another quantity than the model's."""
        found: list[Fault] = []
        for _, item in gather(case, self.form.key):
            entry = cast(AnnualMaximaEntry, item.entry)
            model = case.spec.load_models.get(entry.load_model)
            if model is None:
                found.append(
                    case.document.fault(
                        (*item.keys, "load_model"),
                        "there is no load model of this name",
                        given=entry.load_model,
                        allowed=", ".join(case.spec.load_models) or "none; state load_models",
                    )
                )
                continue
            column = MAXIMUM[model.quantity]
            values = item.table.numbers.get(column, np.full(len(item.table), np.nan))
            found += [
                Fault(
                    str(item.table.path),
                    int(item.table.lines[row]),
                    f"column {column!r} has no value, which load model {entry.load_model!r} needs",
                    "",
                    f"a {model.quantity}",
                )
                for row in np.flatnonzero(~np.isfinite(values))
            ]
        return found

    def rows(self, case: Case) -> Rows | None:
        """Gather the maxima of all surveys; the model of each row is an index into its names."""
        items = gather(case, self.form.key)
        if not items:
            return None
        names = tuple(case.spec.load_models)
        value: list[FloatArray] = []
        extra: dict[str, list[FloatArray]] = {"model": [], "period": [], "error": []}
        for _, item in items:
            entry = cast(AnnualMaximaEntry, item.entry)
            numbers = item.table.numbers
            model = case.spec.load_models[entry.load_model]
            value.append(numbers[MAXIMUM[model.quantity]])
            count = len(item.table)
            period = numbers.get("period", np.full(count, np.nan))
            extra["period"].append(np.where(np.isfinite(period), period, 1.0))
            extra["model"].append(np.full(count, float(names.index(entry.load_model))))
            error = 0.0 if entry.error is None else float(np.sqrt(np.log1p(entry.error**2)))
            extra["error"].append(np.full(count, error))
        rows = build_rows(items, value, extra)
        # A load has no zone: its model takes the zone's place.
        model_of = rows.extra["model"].astype(np.int64)
        return Rows(
            rows.value,
            rows.stage,
            model_of,
            np.arange(len(model_of)),
            model_of,
            tuple(f"load.{name}" for name in names),
            ("",) * len(model_of),
            rows.extra,
        )

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Values, and weights that switch later surveys off."""
        return {
            "maxima_value": rows.value,
            "maxima_weight": np.where(rows.stage <= stage, 1.0, 0.0),
        }

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active maxima."""
        location, scale, shape = (
            _by_row(rows, values, name) for name in ("location", "scale", "shape")
        )
        period = rows.extra["period"]
        exact = rows.extra["error"] == 0.0
        result: Numeric = 0.0
        if exact.any():
            density = log_density(
                data["maxima_value"][exact],
                location[..., exact],
                scale[..., exact],
                shape[..., exact],
                period[exact],
            )
            result = result + (data["maxima_weight"][exact] * density).sum(axis=-1)
        if not exact.all():
            some = ~exact
            node, weight = np.polynomial.hermite_e.hermegauss(NODES)
            factor = np.exp(-rows.extra["error"][some][:, None] * node)  # true over recorded
            true = data["maxima_value"][some][:, None] * factor
            density = log_density(
                true,
                location[..., some, None],
                scale[..., some, None],
                shape[..., some, None],
                period[some][:, None],
            ) + np.log(factor * weight / weight.sum())
            peak = density.max(axis=-1)
            total = peak + op.log(op.exp(density - peak[..., None]).sum(axis=-1))
            result = result + (data["maxima_weight"][some] * total).sum(axis=-1)
        return result

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw maxima of the same periods, shape (n_draw, n_row)."""
        location, scale, shape = (
            _by_row(rows, values, name) for name in ("location", "scale", "shape")
        )
        uniform = rng.uniform(size=(len(location), len(rows.value)))
        reduced = np.maximum(-np.log(-np.log(uniform) / rows.extra["period"]), LEAST_REDUCED)
        standard = standard_value(reduced, shape)
        error = np.exp(rows.extra["error"] * rng.standard_normal(uniform.shape))
        return np.asarray((location + scale * standard) * error)

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Leave the section's local variables to others: a load is common to its sections."""
        return ()


def load_variables(models: Mapping[str, LoadModel]) -> dict[str, tuple[str, ...]]:
    """Name the common variables of each load model."""
    return {
        name: tuple(f"load.{name}.{key}" for key, _, _ in model.priors())
        for name, model in models.items()
    }


def _by_row(rows: Rows, values: Mapping[str, Numeric], name: str) -> Numeric:
    """Give one parameter of the load model of each row, last axis row; no shape is 0."""
    reference = next(values[f"{model}.location"] for model in rows.zones)
    columns = [values.get(f"{model}.{name}", reference * 0.0) for model in rows.zones]
    return op.stack_last(columns)[..., rows.zone]
