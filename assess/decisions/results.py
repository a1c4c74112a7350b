"""What a run found, as frozen records: all that the report, tables and summary are made from."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from assess.reliability.section import IndexCurve as IndexCurve
from assess.reliability.teaching import Taught as Taught
from assess.reliability.teaching import Teaching as Teaching
from assess.updating.power_scaling import PowerScaling as PowerScaling

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


class Standing(StrEnum):
    """The four verdicts."""

    MEETS = "meets the target through the horizon"
    MEETS_UNTIL = "meets the target until a year"
    BELOW_LIMITABLE = "below the target now, meets it under a load limit"
    BELOW = "below the target now"


@dataclass(frozen=True, slots=True)
class Target:
    """A required index, with what it belongs to."""

    index: float
    period: int  # reference period, years
    set_name: str  # "EN 1990"
    class_name: str  # "RC2"
    source: str  # document and place


@dataclass(frozen=True, slots=True)
class Verdict:
    """How one section stands against the target at one stage under one option."""

    standing: Standing
    crossing_year: int | None  # first year (of `reference.year`) below; None: not in the horizon
    crossing_low: int | None  # 5 % of the crossing year over the draws; None: after the horizon
    crossing_high: int | None  # 95 %; None: after the horizon
    probability_below: float  # share of draws whose conditional index is below target, last year
    load_factor: float | None  # variable load that would just meet the target, over today's
    governing: str  # the variable that dominates failure, in words


@dataclass(frozen=True, slots=True, eq=False)
class SectionResult:
    """One section at one stage under one option."""

    section: str
    member: str
    zone: str
    stage: str
    option: str
    annual: IndexCurve  # one year at a time
    cumulative: IndexCurve  # from the year of assessment to that year
    reference: IndexCurve  # of the target's reference period; its first value is "now"
    independent: IndexCurve | None  # reference period, dependence between variables dropped
    verdict: Verdict
    verdict_independent: Verdict | None
    sensitivities: Mapping[str, float]  # variable in words -> sensitivity factor, squares sum to 1
    evaluations: int  # capacity evaluations spent
    note: str = ""  # anything the reader of the index must know (e.g. error larger than asked)


@dataclass(frozen=True, slots=True)
class OptionResult:
    """One option over the whole structure: what it costs and what it brings."""

    option: str
    description: str
    cost: float | None  # present value
    expected_failure_cost: float | None  # present value over the horizon, sum over sections
    sections_below: int  # sections below target at the end of the horizon
    years_gained: Mapping[str, int | None]  # section -> later crossing than `leave`, years


@dataclass(frozen=True, slots=True, eq=False)
class VariableRecord:
    """One common variable with its draws at every stage."""

    name: str  # "girder soffits.cover"
    label: str  # "mean cover, girder soffits"
    symbol: str  # for axes
    unit: str  # "mm"; "-" if none
    zone: str
    source: str  # where its prior comes from
    used: bool  # a limit state uses it
    draws: Mapping[str, FloatArray]  # stage -> (chain, draw)


@dataclass(frozen=True, slots=True, eq=False)
class DataRecord:
    """One data set of one survey as the report shows it."""

    survey: str
    date: str
    kind: str  # "cores"
    title: str  # "Core strengths"
    zone: str
    unit: str
    log_scale: bool
    values: FloatArray  # as the likelihood saw them (corrected), finite ones only
    count: int  # rows, censored and absent ones too
    censored: int
    absent: int  # "none found"
    sections: Sequence[str]  # sections measured directly
    path: str
    variable: str  # name of the common variable whose density carries these data
    predictive: Mapping[str, FloatArray] = field(default_factory=dict)  # stage -> simulated values
    p_values: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    # stage -> statistic ("mean", "scatter", "minimum") -> predictive p-value


@dataclass(frozen=True, slots=True)
class CodeRecord:
    """A characteristic value as a code has it, beside that of the last state of knowledge."""

    zone: str
    quantity: str
    code: str
    count: int  # places that it rests on
    value: float | None
    note: str
    fractile: float
    posterior: float  # the same fractile of local values, all uncertainty integrated


@dataclass(frozen=True, slots=True)
class StageRecord:
    """One state of knowledge."""

    name: str  # "prior", "survey 2019-06-12"
    date: str  # "" for the prior
    chains: int
    draws: int
    rhat_max: float
    ess_bulk_min: float
    ess_tail_min: float
    divergences: int
    worst: str  # the variable with the largest rhat
    retried: bool
    passed: bool
    failures: Sequence[str]
    note: str = ""  # how its draws came about, where not by chains of their own


@dataclass(frozen=True, slots=True)
class Conflict:
    """One thing about fit or prior sensitivity that must be read, in words."""

    subject: str
    words: str


@dataclass(frozen=True, slots=True, eq=False)
class Provenance:
    """How the run came about, and how to have it again."""

    command: str
    started: str  # ISO time
    seed: int
    inputs: Mapping[str, str]  # path -> sha256
    versions: Mapping[str, str]
    timings: Mapping[str, float]  # stage of the run -> seconds
    sampler: str


@dataclass(frozen=True, slots=True, eq=False)
class RunRecord:
    """Everything a run found."""

    title: str
    description: str
    built: int
    assessed: int
    horizon: int
    invented: bool  # data invented for demonstration
    target: Target
    stages: Sequence[StageRecord]
    variables: Sequence[VariableRecord]
    data: Sequence[DataRecord]
    results: Sequence[SectionResult]
    options: Sequence[OptionResult]
    doubts: Sequence[str]
    conflicts: Sequence[Conflict]
    assumptions: Sequence[str]
    currency: str
    discount_rate: float | None
    failure_cost: float | None
    provenance: Provenance
    accepted_unconverged: bool = False
    power_scaling: Sequence[PowerScaling] = ()  # after the last survey
    teaching: Sequence[Teaching] = ()  # what was taught about each section
    code_strengths: Sequence[CodeRecord] = ()

    def result(self, section: str, stage: str, option: str = "leave") -> SectionResult:
        """Find one section's result.

        Raises
        ------
        KeyError
            If the run has no such result.
        """
        for item in self.results:
            if (item.section, item.stage, item.option) == (section, stage, option):
                return item
        raise KeyError(f"no result for section {section!r}, stage {stage!r}, option {option!r}")
