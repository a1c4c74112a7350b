"""What options cost and bring over a whole structure, on the same draws."""

from collections.abc import Sequence

import numpy as np

from assess.case.reader import Case
from assess.decisions.options import LEAVE, OPTIONS
from assess.decisions.results import IndexCurve, OptionResult, SectionResult, Standing


def failure_cost(curve: IndexCurve, cost: float, rate: float) -> float:
    r"""Present value of the expected cost of a section's failure over the horizon.

    Parameters
    ----------
    curve : IndexCurve
        Cumulative, from the year of assessment.
    cost : float
        Of a failure with its consequences, in money of today.
    rate : float
        Yearly discount rate [-].

    Returns
    -------
    float
        :math:`\sum_k [P(k) - P(k-1)]\, C\, (1+r)^{-(k - 1/2)}`: a failure in year k costs at
        the middle of that year.

    References
    ----------
    .. [1] ISO 2394:2015, annex G (cost optimisation); clause from memory.
    """
    yearly = np.diff(curve.failure_probability, prepend=0.0)
    middle = np.arange(1, len(yearly) + 1) - 0.5
    return float(cost * np.sum(np.maximum(yearly, 0.0) * (1.0 + rate) ** -middle))


def option_results(case: Case, results: Sequence[SectionResult], stage: str) -> list[OptionResult]:
    """Sum each option up over the structure, `leave` first.

    Parameters
    ----------
    case : Case
        With its options and costs.
    results : sequence of SectionResult
        Of the last stage, all sections under all options.
    stage : str
        Name of the last stage.

    Returns
    -------
    list of OptionResult
        The expected failure cost is the sum over sections, each failure counted on its own.
    """
    by_option: dict[str, list[SectionResult]] = {}
    for item in results:
        if item.stage == stage:
            by_option.setdefault(item.option, []).append(item)
    leave = {item.section: item for item in by_option[LEAVE]}
    costs = case.spec.decision.costs
    summed = []
    for name, items in by_option.items():
        entry = next((o for o in case.spec.decision.options if o.name == name), None)
        price = None if entry is None else getattr(entry, "cost", None)
        if costs is not None and price is not None:
            wait = getattr(entry, "from_year", case.spec.structure.assessed)
            price *= (1.0 + costs.discount_rate) ** -(wait - case.spec.structure.assessed)
        summed.append(
            OptionResult(
                option=name,
                description=(
                    "Nothing is done."
                    if entry is None
                    else OPTIONS[entry.kind].describe(entry) + _members(entry.members)
                ),
                cost=0.0 if entry is None else price,
                expected_failure_cost=(
                    None
                    if costs is None
                    else sum(
                        failure_cost(item.cumulative, costs.failure, costs.discount_rate)
                        for item in items
                    )
                ),
                sections_below=sum(item.verdict.standing is not Standing.MEETS for item in items),
                years_gained={
                    item.section: _gained(item, leave[item.section], case) for item in items
                },
            )
        )
    return summed


def _members(members: Sequence[str]) -> str:
    return f" Members: {', '.join(members)}." if members else ""


def _gained(item: SectionResult, leave: SectionResult, case: Case) -> int | None:
    """Years by which the crossing is later than when nothing is done; None if never crossed."""
    if leave.verdict.crossing_year is None:
        return 0
    end = case.spec.structure.assessed + case.spec.structure.horizon
    return (item.verdict.crossing_year or end) - leave.verdict.crossing_year
