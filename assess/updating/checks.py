"""Checks of fit: whether data drawn from the model look like those that were measured."""

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from assess.case.reader import Case
from assess.updating.kind import EvidenceKind, Rows
from assess.updating.kinds import KINDS
from assess.updating.model import Spec
from assess.updating.stages import StageDraws

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

REPLICATES = 400  # data sets drawn per stage, fewer of very large ones
FEWEST = 100
ELEMENTS = 4_000_000  # simulated values held at a time
MOST_ELEMENTS = 40_000_000  # simulated values drawn per stage, unless `FEWEST` sets have more
SHOWN = 2000  # simulated values kept for a picture
SURPRISING = 0.02  # a two-sided p-value below it is put into words


@dataclass(frozen=True, slots=True, eq=False)
class DataSet:
    """Measurements of one kind in one zone at one survey, and how well the model foretells them.

    ``p_values`` and ``predictive`` go by stage: the share of simulated data sets whose
    statistic is at least the measured one, and simulated single values.
    """

    kind: EvidenceKind
    stage: int
    zone: str
    values: FloatArray  # finite ones, in the unit shown
    count: int
    missing: int  # censored, or none found
    simulated: int  # data sets drawn per stage
    sections: tuple[str, ...]
    p_values: Mapping[str, Mapping[str, float]]
    predictive: Mapping[str, FloatArray]


def _mean(values: FloatArray) -> FloatArray:
    return np.asarray(np.nanmean(values, axis=-1))


def _scatter(values: FloatArray) -> FloatArray:
    return np.asarray(np.nanstd(values, axis=-1))


def _minimum(values: FloatArray) -> FloatArray:
    return np.asarray(np.nanmin(values, axis=-1))


STATISTICS: Mapping[str, Callable[[FloatArray], FloatArray]] = {
    "mean": _mean,
    "scatter": _scatter,
    "minimum": _minimum,
}


def data_sets(case: Case, spec: Spec, stages: Sequence[StageDraws], seed: int) -> list[DataSet]:
    """Check every data set against every stage.

    Parameters
    ----------
    case, spec : Case, Spec
        The case and its measurements.
    stages : sequence of StageDraws
        Prior and posteriors.
    seed : int
        Of the simulated data.

    Returns
    -------
    list of DataSet
        By kind, survey and zone. At the stage that includes a data set its p-values are
        posterior predictive, at earlier ones they say how the data were foretold.

    References
    ----------
    .. [1] A. Gelman, X.-L. Meng, H. Stern, Posterior predictive assessment of model fitness via
       realized discrepancies, Stat. Sinica 6 (1996) 733-807.
    """
    found = []
    for number, (key, rows) in enumerate(spec.rows.items()):
        kind = KINDS[key]
        parts = list(_parts(rows))
        foretold = [
            {stage.name: _Foretold(rows.value[here]) for stage in stages} for _, _, here in parts
        ]
        for stage in stages:
            rng = np.random.default_rng([seed, stage.number, number, 17])
            for simulated in _simulated(kind, rows, stage, rng):
                for (_, _, here), by_stage in zip(parts, foretold, strict=True):
                    by_stage[stage.name].add(simulated[:, here])
        for (survey, zone, here), by_stage in zip(parts, foretold, strict=True):
            found.append(_data_set(kind, rows, survey, zone, here, by_stage))
    return found


def _simulated(
    kind: EvidenceKind, rows: Rows, stage: StageDraws, rng: np.random.Generator
) -> Iterator[FloatArray]:
    """Draw data sets at one stage, so many at a time that memory stays bounded."""
    values = stage.values()
    available = len(next(iter(values.values())))
    count = min(REPLICATES, max(FEWEST, MOST_ELEMENTS // len(rows.value)), available)
    chosen = rng.choice(available, count, replace=False)
    at_a_time = max(1, ELEMENTS // len(rows.value))
    for part in np.array_split(chosen, -(-count // at_a_time)):
        yield kind.simulate(rows, {name: draws[part] for name, draws in values.items()}, rng)


def _parts(rows: Rows) -> Iterator[tuple[int, int, BoolArray]]:
    """Go through (stage, zone, mask) of each data set."""
    for stage in np.unique(rows.stage):
        for zone in np.unique(rows.zone[rows.stage == stage]):
            yield int(stage), int(zone), (rows.stage == stage) & (rows.zone == zone)


def _data_set(
    kind: EvidenceKind,
    rows: Rows,
    survey: int,
    zone: int,
    here: BoolArray,
    foretold: Mapping[str, "_Foretold"],
) -> DataSet:
    """Compare one data set with its simulations."""
    measured = rows.value[here]
    finite = np.isfinite(measured)
    shown = np.exp if kind.log_scale else np.asarray
    names = [rows.places[place] for place in np.unique(rows.place[here])]
    return DataSet(
        kind,
        survey,
        rows.zones[zone],
        np.asarray(shown(measured[finite]), dtype=np.float64),
        len(measured),
        int((~finite).sum()),
        min(found.count for found in foretold.values()),
        tuple(name.removeprefix("section ") for name in names if name.startswith("section ")),
        {stage: found.p_values() for stage, found in foretold.items()},
        {
            stage: np.asarray(shown(found.singles()), dtype=np.float64)
            for stage, found in foretold.items()
        },
    )


class _Foretold:
    """Statistics of simulated data sets beside those of the measured one, gathered bit by bit."""

    def __init__(self, measured: FloatArray) -> None:
        self._measured = measured
        self._statistics: dict[str, list[FloatArray]] = {name: [] for name in STATISTICS}
        self._without: list[FloatArray] = []
        self._singles: list[FloatArray] = []
        self._wanted = SHOWN

    @property
    def count(self) -> int:
        """Number of simulated data sets so far."""
        return sum(len(part) for part in self._without)

    def add(self, simulated: FloatArray) -> None:
        """Take in some simulated data sets, (n, n_row)."""
        finite = np.isfinite(simulated)
        self._without.append((~finite).mean(axis=1))
        # A simulated data set of fewer than three values has no scatter to compare.
        usable = simulated[finite.sum(axis=1) >= 3]
        if len(usable):
            for name, statistic in STATISTICS.items():
                self._statistics[name].append(statistic(usable))
        if self._wanted > 0:
            some = simulated[finite][: self._wanted]
            self._wanted -= len(some)
            self._singles.append(some.copy())

    def p_values(self) -> dict[str, float]:
        """Share of simulated data sets whose statistic is at least the measured one."""
        found: dict[str, float] = {}
        finite = np.isfinite(self._measured)
        if finite.sum() >= 3:
            for name, statistic in STATISTICS.items():
                if self._statistics[name]:
                    simulated = np.concatenate(self._statistics[name])
                    found[name] = _share(simulated, float(statistic(self._measured)))
        if not finite.all():
            found["share without a value"] = _share(
                np.concatenate(self._without), float((~finite).mean())
            )
        return found

    def singles(self) -> FloatArray:
        """Give some simulated values."""
        return np.concatenate(self._singles)


def _share(simulated: FloatArray, measured: float) -> float:
    """P-value with half of the ties, so that a discrete statistic is not called surprising."""
    return float(np.mean(simulated > measured) + 0.5 * np.mean(simulated == measured))


def surprises(sets: Sequence[DataSet], stage_names: Sequence[str]) -> list[tuple[str, str]]:
    """Put into words what the model did not foretell, and what it does not reproduce.

    Parameters
    ----------
    sets : sequence of DataSet
        From `data_sets`.
    stage_names : sequence of str
        Of all stages, the prior first.

    Returns
    -------
    list of (subject, words)
        Conflicts of data with the knowledge before them, and misfits after.
    """
    words = []
    for item in sets:
        subject = f"{item.kind.form.title}, {item.zone}, {stage_names[item.stage]}"
        before, after = stage_names[item.stage - 1], stage_names[item.stage]
        for statistic, value in item.p_values[before].items():
            if min(value, 1.0 - value) < SURPRISING / 2:
                side, chance = odds(value, item.simulated)
                words.append(
                    (
                        subject,
                        f"The {statistic} is {side} than was to be expected before this survey: "
                        f"{chance} simulated surveys had one as {side.replace('er', '')}. Prior "
                        "and data disagree; check the prior's source and the table.",
                    )
                )
        for statistic, value in item.p_values[after].items():
            if min(value, 1.0 - value) < SURPRISING / 2:
                side, chance = odds(value, item.simulated)
                words.append(
                    (
                        subject,
                        f"The {statistic} is {side} than the model gives even after this survey: "
                        f"{chance} simulated surveys had one as {side.replace('er', '')}. The "
                        "model does not describe these data well.",
                    )
                )
    return words


def odds(p_value: float, simulated: int) -> tuple[str, str]:
    """Say on which side a measured statistic lies, and how rare that is among simulated ones.

    Parameters
    ----------
    p_value : float
        Share of simulated statistics that are at least the measured one.
    simulated : int
        How many there were.

    Returns
    -------
    side, chance : str
        Such as ``"higher"`` and ``"1 in 130"``, or ``"none of 400"``.

    Examples
    --------
    >>> odds(0.0075, 400), odds(1.0, 400)
    (('higher', '1 in 130'), ('lower', 'none of 400'))
    """
    rare = min(p_value, 1.0 - p_value)
    side = "higher" if p_value < 0.5 else "lower"
    if rare * simulated < 0.5:
        return side, f"none of {simulated}"
    number = 1.0 / rare
    digits = 10 ** max(0, int(np.log10(number)) - 1)
    return side, f"1 in {round(number / digits) * digits:g}"
