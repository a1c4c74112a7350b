"""Evidence: yield strength of reinforcement, by tensile tests of coupons and by hardness."""

from collections.abc import Mapping, Sequence
from functools import lru_cache
from typing import Any, Literal, cast

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm
from assess.case.processes import only_positive
from assess.case.quantities import PositiveNumber, Stress
from assess.case.reader import Case, Evidence
from assess.errors import Fault
from assess.mechanics.reinforcement import (
    HARDNESS_SLOPE,
    vickers_from_brinell,
    yield_strength_from_hardness,
)
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    IntArray,
    Numeric,
    Rows,
    gather,
    index_places,
)
from assess.updating.local import Local, LocalModel
from assess.updating.measuring import catalogue_variable, restated_faults
from assess.updating.place_statistics import Places, deviation_square, without_prefix
from assess.updating.row_faults import silent_rows, unknown_sections
from assess.updating.steel_faults import steel_faults, steel_of_rows
from assess.updating.variables import Variable

COUPON, HARDNESS = 0, 1  # sorts of readings
COLUMNS = ("yield strength", "hardness")
BY_HARDNESS = " by hardness"  # ends the name of a steel's readings of hardness
HARDNESS_VARIABLES = {
    "factor": ("strength that hardness indicates over the true one", "$F_H$"),
    "gain": ("growth of indicated with true strength", "$g_H$"),
    "scatter": ("scatter of indicated strength over its mean, from bar to bar", "$s_H$"),
}


class YieldStrengthEntry(EvidenceEntry):
    """What a survey says of its coupons and hardness readings."""

    steel: str | None = Field(
        None,
        description="Name under `steel` of all rows without one in a column steel. Left out: that "
        "of the row's section, or the only one there is.",
    )
    error: Stress = Field(
        5.0,
        description="Standard deviation of a tensile test's yield strength about that of its "
        "place. [MPa] Engineering judgement, no source.",
    )
    hardness_scale: Literal["Vickers", "Brinell"] = Field(
        "Vickers", description="Scale of the hardness; other scales are to be converted before."
    )
    hardness_error: PositiveNumber = Field(
        5.0,
        description="Standard deviation of a place's hardness as read, in Vickers. [-] "
        "Engineering judgement, no source.",
    )


class YieldStrength(EvidenceKind):
    r"""Coupons: reading = local yield strength + error; hardness: the same through a line.

    Notes
    -----
    The yield strength f of a bar is :math:`N(\mu, s^2)` within one reinforcement [1]_; coupons
    read it with a normal error. Hardness indicates, by the line of many steels
    (`yield_strength_from_hardness`),

    .. math:: x = F \mu_0 + g (f - \mu_0) + \delta + e, \quad \delta \sim N(0, (s_H \mu_0)^2)

    with :math:`\mu_0` the stated mean, F the error of the line for this reinforcement, g its
    slope and :math:`\delta` that of the bar. The line is told by bars that have both; without
    any, its published error stays. All is normal given the common variables, so f and
    :math:`\delta` integrate out in closed form: with a coupon mean of precision P,
    :math:`v_1 = s^2 / (1 + P s^2)` and :math:`k = P v_1`, the indicated strength is normal about
    :math:`F \mu_0 + g (\mu + k (\bar y - \mu) - \mu_0)` with variance
    :math:`g^2 v_1 + (s_H \mu_0)^2` beside its reading error. Bars read alike enter through
    sufficient statistics.

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.2 (its dependence on the bar's area, 0.5, is
       left out).
    """

    form = EvidenceForm(
        key="yield_strength",
        title="Yield strength of reinforcement",
        entry=YieldStrengthEntry,
        columns=(
            Column(
                "yield strength",
                "upper yield or 0.2 % proof strength of the coupon, on its own area",
                "MPa",
                required=False,
                above=0.0,
                below=3000.0,
                usual=(150.0, 1200.0),
            ),
            Column(
                "hardness",
                "hardness of the bar, mean of the indents at one spot",
                "-",
                required=False,
                above=0.0,
                below=1000.0,
                usual=(80.0, 450.0),
            ),
            Column("steel", "reinforcement, by its name under `steel`", required=False),
        ),
        value="yield strength",
        apart=("hardness",),
        zoned=False,
    )
    unit = "MPa"
    log_scale = False
    assumption = (
        "The yield strength of one reinforcement is normal from bar to bar (JCSS part 3.2); all "
        "bars of a section have the strength of the one tested there. Hardness indicates strength "
        "by the line of Pavlina and Van Tyne (2008) up to an error of level and slope common to "
        "the reinforcement and a scatter from bar to bar."
    )
    carrier = ""

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find rows that say nothing, and steel or sections that do not exist."""
        found: list[Fault] = []
        for _, item in gather(case, self.form.key):
            found += silent_rows(item, COLUMNS)
            found += steel_faults(case, item, cast(YieldStrengthEntry, item.entry).steel)
            found += unknown_sections(case, item)
        if found:
            return found
        return list(restated_faults(case, self.variables(case), only_positive))

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the line of hardness of each reinforcement that it was read of."""
        rows = self.rows(case)
        if rows is None:
            return ()
        steels = dict.fromkeys(rows.zones[k] for k in rows.zone[rows.extra["sort"] == HARDNESS])
        return tuple(
            catalogue_variable(
                _hardness_name(steel.removesuffix(BY_HARDNESS), key),
                f"{label}, {steel.removesuffix(BY_HARDNESS).removeprefix('steel.')}",
                symbol,
                "-",
                f"yield strength from hardness, {key}",
            )
            for steel in steels
            for key, (label, symbol) in HARDNESS_VARIABLES.items()
        )

    def rows(self, case: Case) -> Rows | None:
        """Gather all readings; a row of a table may bring a coupon and a hardness."""
        items = gather(case, self.form.key)
        if not items:
            return None
        parts = [_readings(case, number, *one) for number, one in enumerate(items)]
        joined = {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}
        names = tuple(dict.fromkeys(joined["steel"].tolist()))
        steel = np.array([names.index(name) for name in joined["steel"]], dtype=np.int64)
        place, places = index_places(joined["key"].tolist())
        place_zone = np.zeros(len(places), dtype=np.int64)
        place_zone[place] = steel
        stated = [case.spec.steel[name] for name in names]
        known = [one.local_sd if isinstance(one.local_sd, float) else np.nan for one in stated]
        sort = joined["sort"]
        return Rows(
            value=joined["value"],
            stage=joined["stage"],
            zone=np.where(sort == HARDNESS, len(names) + steel, steel),
            place=place,
            place_zone=place_zone,
            zones=tuple(f"steel.{name}{end}" for end in ("", BY_HARDNESS) for name in names),
            places=tuple("" if name.startswith(_ALONE) else name for name in places),
            extra={
                "sort": sort.astype(np.float64),
                "precision": joined["precision"],
                "known_scatter": np.array(known)[steel],
                "reference": np.array([one.mean for one in stated])[steel],
            },
        )

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Statistics of bars read alike, with later surveys switched off."""
        return dict(_places(rows).data(rows.value, stage))

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active readings, strengths of bars integrated out."""
        found, places = without_prefix(_PREFIX, data), _places(rows)
        steel = places.group_population
        mean, scatter = (part[..., steel] for part in _population(rows, values))
        precision, variance = found["precision"][:, COUPON], scatter**2
        inflation = 1.0 + precision * variance
        square = deviation_square(found, mean)
        result = (
            found["count"] * op.log(inflation) + precision / inflation * square + found["within"]
        )
        if places.sorts > 1:
            line, gain, spread = (part[..., steel] for part in _line(rows, values))
            reference = _by_steel(rows, "reference")[steel]
            centre = line + gain * (mean - reference)
            weight = found["precision"][:, HARDNESS]
            left = variance / inflation
            pull = gain * precision * left
            both = found["square"][:, COUPON, HARDNESS] + found["count"] * (
                found["mean"][:, COUPON] - mean
            ) * (found["mean"][:, HARDNESS] - centre)
            hard = 1.0 + weight * (gain**2 * left + spread**2)
            residual = (
                deviation_square(found, centre, HARDNESS) - 2.0 * pull * both + pull**2 * square
            )
            result = result + found["count"] * op.log(hard) + weight / hard * residual
        return -0.5 * result.sum(axis=-1)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw readings of the same bars, shape (n_draw, n_row)."""
        mean, scatter = _population(rows, values)
        steel = rows.place_zone
        shape = (len(mean), len(rows.places))
        bar = mean[:, steel] + scatter[:, steel] * rng.standard_normal(shape)
        read = bar[:, rows.place]
        hard = rows.extra["sort"] == HARDNESS
        if hard.any():
            line, gain, spread = _line(rows, values)
            reference = _by_steel(rows, "reference")[steel]
            indicated = line[:, steel] + gain[:, steel] * (bar - reference)
            indicated = indicated + spread[:, steel] * rng.standard_normal(shape)
            read = np.where(hard, indicated[:, rows.place], read)
        error = rng.standard_normal(read.shape) / np.sqrt(rows.extra["precision"])
        return np.asarray(read + error)

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Yield strength at a section whose bars were tested; elsewhere the limit state draws it.

        The conditional distribution given coupons, then given hardness, both closed.
        """
        place = None if rows is None else rows.place_of(section)
        if rows is None or place is None:
            return ()
        places = _places(rows)
        precision, read = places.summary(rows.value, stage, place)
        if not precision.any():
            return ()
        steel = int(rows.place_zone[place])
        mean, scatter = (part[..., steel] for part in _population(rows, values))
        variance = scatter**2 / (1.0 + precision[COUPON] * scatter**2)
        mean = mean + variance * precision[COUPON] * (read[COUPON] - mean)
        if places.sorts > 1 and precision[HARDNESS] > 0.0:
            line, gain, spread = (part[..., steel] for part in _line(rows, values))
            expected = line + gain * (mean - _by_steel(rows, "reference")[steel])
            total = gain**2 * variance + spread**2 + 1.0 / precision[HARDNESS]
            share = gain * variance / total
            mean = mean + share * (read[HARDNESS] - expected)
            variance = variance * (1.0 - share * gain)
        return (Local("yield strength", mean, np.sqrt(variance)),)


_PREFIX = "yield_strength"
_ALONE = "row "  # begins the name of a bar that the table does not name


@lru_cache(maxsize=8)
def _places(rows: Rows) -> Places:
    """Arrange readings by bars; kept, for it is asked for with every evaluation."""
    sort = rows.extra["sort"].astype(np.int64)
    return Places(
        prefix=_PREFIX,
        latent=rows.place,
        population=rows.place_zone[rows.place],
        sort=sort,
        precision=rows.extra["precision"],
        stage=rows.stage,
        sorts=int(sort.max()) + 1,
    )


def _hardness_name(steel: str, key: str) -> str:
    return f"{_PREFIX}.{steel.removeprefix('steel.')}.hardness_{key}"


def _steels(rows: Rows) -> tuple[str, ...]:
    return rows.zones[: len(rows.zones) // 2]


def _by_steel(rows: Rows, name: str) -> FloatArray:
    """Give what is the same for all rows of a reinforcement, (n_steel,)."""
    found = np.full(len(_steels(rows)), np.nan)
    found[rows.place_zone[rows.place]] = rows.extra[name]
    return found


def _population(rows: Rows, values: Mapping[str, Numeric]) -> tuple[Numeric, Numeric]:
    """Mean and scatter of each reinforcement [MPa], last axis steel."""
    steels = _steels(rows)
    level = [values[name] for name in steels]
    known = _by_steel(rows, "known_scatter").tolist()
    scatter = [
        values[f"{name}.scatter"] if np.isnan(sd) else values[name] * 0.0 + sd
        for name, sd in zip(steels, known, strict=True)
    ]
    return op.stack_last(level), op.stack_last(scatter)


def _line(rows: Rows, values: Mapping[str, Numeric]) -> tuple[Numeric, Numeric, Numeric]:
    """Level [MPa], slope [-] and scatter [MPa] of what hardness indicates, last axis steel."""
    steels, reference = _steels(rows), _by_steel(rows, "reference")

    def stacked(key: str) -> Numeric:
        # Of a reinforcement without hardness readings the line does not matter.
        one = values[steels[0]] * 0.0 + 1.0
        return op.stack_last([values.get(_hardness_name(name, key), one) for name in steels])

    return stacked("factor") * reference, stacked("gain"), stacked("scatter") * reference


def _readings(case: Case, number: int, stage: int, item: Evidence) -> dict[str, NDArray[Any]]:
    """Give the readings of the table of a number, coupons before hardness."""
    entry = cast(YieldStrengthEntry, item.entry)
    steels = steel_of_rows(case, item, entry.steel)
    keys = [key or f"{_ALONE}{number}:{row}" for row, key in enumerate(_bars(case, item, steels))]
    hardness = item.table.numbers["hardness"]
    if entry.hardness_scale == "Brinell":
        hardness = vickers_from_brinell(hardness)
    sorts = (
        (COUPON, item.table.numbers["yield strength"], entry.error),
        (HARDNESS, yield_strength_from_hardness(hardness), HARDNESS_SLOPE * entry.hardness_error),
    )
    parts: list[tuple[IntArray, int, FloatArray, float]] = []
    for sort, value, sd in sorts:
        row = np.flatnonzero(np.isfinite(value))
        parts.append((row, sort, value[row], sd))
    row = np.concatenate([part[0] for part in parts])
    return {
        "value": np.concatenate([part[2] for part in parts]),
        "sort": np.concatenate([np.full(len(part[0]), part[1]) for part in parts]),
        "precision": np.concatenate([np.full(len(part[0]), part[3] ** -2.0) for part in parts]),
        "stage": np.full(len(row), stage),
        "steel": np.array(steels, dtype=np.str_)[row],
        "key": np.array(keys, dtype=np.str_)[row],
    }


def _bars(case: Case, item: Evidence, steels: Sequence[str]) -> list[str]:
    """Name the place of each row; other reinforcement than a section's own is a place beside it."""
    sections = case.spec.sections()
    found = []
    rows = zip(item.section.tolist(), item.location.tolist(), steels, strict=True)
    for section, location, steel in rows:
        if section and steel in sections[section].steels():
            found.append(f"section {section}")
        elif section or location:
            found.append(f"{steel}: {section or location}")
        else:
            found.append("")
    return found
