"""What the report derives from a run record before it says or draws anything."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.stats import rankdata

from assess.decisions.results import (
    FloatArray,
    IndexCurve,
    RunRecord,
    SectionResult,
    StageRecord,
    Standing,
    VariableRecord,
)

LEAVE = "leave"  # the option of doing nothing, which every run has
PRIOR = "prior"
MIN_DEPENDENCE = 0.15  # rank correlations nearer zero are not drawn


@dataclass(frozen=True, slots=True)
class Moments:
    """Summary of one variable at one stage."""

    mean: float
    sd: float
    low: float  # 5 %
    high: float  # 95 %

    @property
    def variation(self) -> float:
        """Coefficient of variation; nan where the mean is not positive."""
        return self.sd / self.mean if self.mean > 0 else float("nan")


@dataclass(frozen=True, slots=True)
class Pair:
    """Two variables with their rank correlation at the last and the first stage."""

    first: VariableRecord
    second: VariableRecord
    after: float
    before: float


def final_stage(record: RunRecord) -> StageRecord:
    """Return the last state of knowledge."""
    return record.stages[-1]


def withheld(record: RunRecord, stage: str) -> bool:
    """Tell whether the indices of a stage must not be shown."""
    if record.accepted_unconverged:
        return False
    return any(item.name == stage and not item.passed for item in record.stages)


def shown_stages(record: RunRecord) -> list[str]:
    """Names of the stages whose indices may be shown, in order."""
    return [item.name for item in record.stages if not withheld(record, item.name)]


def sections(record: RunRecord) -> list[str]:
    """Names of the sections in the order of the results."""
    return list(dict.fromkeys(item.section for item in record.results))


def option_names(record: RunRecord) -> list[str]:
    """Options in the order of the record, `leave` first, whether or not costs are known."""
    named = [item.option for item in record.options]
    found = [item.option for item in record.results]
    return list(dict.fromkeys([LEAVE, *named, *found]))


def find(record: RunRecord, section: str, stage: str, option: str = LEAVE) -> SectionResult | None:
    """Find a result that may be absent."""
    try:
        return record.result(section, stage, option)
    except KeyError:
        return None


def final_results(record: RunRecord, option: str = LEAVE) -> list[SectionResult]:
    """Results of the last stage, one per section that has one."""
    stage = final_stage(record).name
    found = (find(record, section, stage, option) for section in sections(record))
    return [item for item in found if item is not None]


def last_year(record: RunRecord) -> int:
    """Last year of the horizon, which the annual curves end with."""
    return int(record.results[0].annual.year[-1])


def now(curve: IndexCurve) -> tuple[float, float, float, float]:
    """Index, its standard error and the 5-95 % band in the first period of a curve."""
    return (
        float(curve.index[0]),
        float(curve.error[0]),
        float(curve.low[0]),
        float(curve.high[0]),
    )


def is_below(standing: Standing) -> bool:
    """Tell whether a section is below the target now."""
    return standing in (Standing.BELOW, Standing.BELOW_LIMITABLE)


def disagreeing(record: RunRecord) -> list[SectionResult]:
    """Results whose verdict on the present is not what their own index says."""
    return [
        item
        for item in record.results
        if is_below(item.verdict.standing) != bool(item.reference.index[0] < record.target.index)
    ]


def moments(draws: FloatArray) -> Moments:
    """Summarise draws of any shape."""
    flat = draws.ravel()
    low, high = np.quantile(flat, [0.05, 0.95])
    return Moments(float(flat.mean()), float(flat.std(ddof=1)), float(low), float(high))


def learned(before: Moments, after: Moments) -> float:
    """Share of the standard deviation that a stage removed; negative where it grew."""
    return 1.0 - after.sd / before.sd if before.sd > 0 else 0.0


def used_variables(record: RunRecord) -> list[VariableRecord]:
    """Variables that a limit state uses and that vary."""
    stage = final_stage(record).name
    return [
        item
        for item in record.variables
        if item.used and stage in item.draws and np.ptp(item.draws[stage]) > 0
    ]


def rank_correlation(columns: Sequence[FloatArray]) -> FloatArray:
    """Spearman's rank correlation matrix of equally long columns.

    References
    ----------
    C. Spearman, Am. J. Psychol. 15 (1904) 72-101, doi:10.2307/1412159.
    """
    ranks = np.array([rankdata(column) for column in columns])
    with np.errstate(invalid="ignore", divide="ignore"):
        matrix = np.corrcoef(ranks)
    return np.asarray(np.nan_to_num(np.atleast_2d(matrix)), dtype=float)


def dependent_pairs(record: RunRecord, limit: int = 6) -> list[Pair]:
    """Pairs of used variables with the strongest rank correlation at the last stage."""
    variables = used_variables(record)
    if len(variables) < 2:
        return []
    last, first = final_stage(record).name, record.stages[0].name
    after = rank_correlation([item.draws[last].ravel() for item in variables])
    has_first = all(first in item.draws for item in variables)
    before = (
        rank_correlation([item.draws[first].ravel() for item in variables])
        if has_first
        else np.full_like(after, np.nan)
    )
    rows, columns = np.triu_indices(len(variables), 1)
    order = np.argsort(-np.abs(after[rows, columns]), kind="stable")
    chosen = [(int(rows[k]), int(columns[k])) for k in order[:limit]]
    return [
        Pair(variables[i], variables[j], float(after[i, j]), float(before[i, j]))
        for i, j in chosen
        if abs(after[i, j]) >= MIN_DEPENDENCE
    ]


def measured_sections(record: RunRecord) -> set[str]:
    """Sections on which at least one data set was measured directly."""
    return {section for item in record.data for section in item.sections}


def unconverged(record: RunRecord) -> list[StageRecord]:
    """Stages that failed the convergence gate."""
    return [item for item in record.stages if not item.passed]


def spread(values: Iterable[float]) -> tuple[float, float]:
    """Smallest and largest finite value."""
    finite = [value for value in values if np.isfinite(value)]
    return (min(finite), max(finite)) if finite else (0.0, 1.0)
