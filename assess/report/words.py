"""Names, verdicts, warnings and cautions in words, the same for tables, sentences and figures."""

from collections import Counter

import numpy as np
from scipy.special import ndtr

from assess.decisions.results import (
    FloatArray,
    PowerScaling,
    RunRecord,
    SectionResult,
    StageRecord,
    Standing,
    Target,
    VariableRecord,
    Verdict,
)
from assess.report import derived, numbers
from assess.updating.power_scaling import SENSITIVE

WITHHELD = "withheld"
FINE, DOUBTFUL, CONFLICT = "unremarkable", "doubtful", "conflict"
INVENTED_TITLE = "Invented data"
INVENTED = (
    "The structure and all survey data in this report are invented for demonstration. "
    "Nothing here describes a real structure."
)
UNCONVERGED_TITLE = "Accepted without convergence"
CAUTIONS = (
    "This report states a reliability index, a required index and what was assumed. It is not a "
    "statement that the structure may be used, and it does not replace the verification that the "
    "local code requires.",
    "The index is a measure of the state of knowledge under the models and assumptions listed "
    "here. Failure modes, members and hazards that are not listed were not assessed.",
    "Gross errors in design, construction or survey are outside the models.",
    "The decision, and the responsibility for it, lie with a licensed engineer who has checked "
    "the inputs against the structure and the local code, which governs where it differs.",
)
LEAVE_WORDS = "leave as is"


def stage_words(record: RunRecord, stage: str) -> str:
    """Name a state of knowledge in a sentence."""
    return f"before ({stage})" if stage == record.stages[0].name else _after(stage)


def _after(stage: str) -> str:
    """Say "after" once, also where the survey's own name begins with it."""
    return stage if stage.casefold().startswith("after ") else f"after {stage}"


def stage_heading(record: RunRecord, stage: str) -> str:
    """Name a state of knowledge as a narrow column heading."""
    first = stage == record.stages[0].name
    return f"Index {'before (' + stage + ')' if first else stage_key(record, stage)}"


def stage_key(record: RunRecord, stage: str) -> str:
    """Name a state of knowledge at the end of a curve, as short as can be."""
    if stage == record.stages[0].name:
        return stage
    same_year = Counter(item.date[:4] for item in record.stages if item.date)
    for item in record.stages:
        if item.name == stage and item.date and same_year[item.date[:4]] == 1:
            return f"after {item.date[:4]}"
    return _after(stage)


def option_words(option: str) -> str:
    """Name an option; the option of doing nothing in plain words."""
    return LEAVE_WORDS if option == derived.LEAVE else option


def years(period: int) -> str:
    """Write a reference period."""
    return numbers.count(period, "year")


def target_short(target: Target) -> str:
    """Target for the margin of a figure."""
    period = years(target.period).replace(" ", numbers.NO_BREAK)
    return f"target {numbers.index(target.index)} ({period})"


def target_sentence(target: Target) -> str:
    """Target with document, class and period."""
    return (
        f"The required index is {numbers.index(target.index)} for a reference period of "
        f"{years(target.period)}, {target.set_name} class {target.class_name} ({target.source}); "
        f"it corresponds to a failure probability of "
        f"{numbers.probability(float(ndtr(-target.index)))} in {years(target.period)}."
    )


def verdict_words(verdict: Verdict, last_year: int) -> str:
    """Write a verdict as a table cell says it."""
    if verdict.standing is Standing.MEETS:
        return f"meets the target through {last_year}"
    if verdict.standing is Standing.MEETS_UNTIL:
        if verdict.crossing_year is None:
            return verdict.standing.value
        return f"meets the target until {verdict.crossing_year - 1}"
    if verdict.standing is Standing.BELOW_LIMITABLE and verdict.load_factor is not None:
        load = f"variable load limited to {numbers.fixed(verdict.load_factor, 2)} of today\u2019s"
        return f"below the target now; meets it with {load}"
    return verdict.standing.value


def result_verdict(record: RunRecord, result: SectionResult) -> str:
    """Write a result's verdict, or that it is withheld."""
    if derived.withheld(record, result.stage):
        return WITHHELD
    said = verdict_words(result.verdict, derived.last_year(record))
    failed = {item.name for item in derived.unconverged(record)}
    return f"{said} (not converged)" if result.stage in failed else said


def unconverged_words(record: RunRecord) -> str:
    """Warn that stages were accepted though they failed the gate."""
    failed = [stage_words(record, item.name) for item in derived.unconverged(record)]
    where = f" ({numbers.listing(failed)})" if failed else ""
    return (
        f"The Markov chains did not pass the convergence gate{where}; the results are shown only "
        "because this was accepted for the run. The indices may be wrong by more than the stated "
        "errors."
    )


def withheld_words(record: RunRecord) -> str:
    """Explain why indices are withheld."""
    failed = [stage_words(record, item.name) for item in derived.unconverged(record)]
    return (
        f"Indices {numbers.listing(failed)} are withheld because the Markov chains did not pass "
        "the convergence gate there; see Diagnostics."
    )


def disagreement(record: RunRecord) -> str:
    """Warn that verdicts and indices of the record do not fit together."""
    found = list(dict.fromkeys(item.section for item in derived.disagreeing(record)))
    if not found:
        return ""
    return (
        f"At {numbers.listing(found)} a verdict does not follow from the index beside it. One of "
        "the two is wrong; do not use this report before that is explained."
    )


def doubtful_draws(record: RunRecord) -> str:
    """Warn, beside what shows draws, that draws of some stages have not converged."""
    failed = [item.name for item in derived.unconverged(record)]
    names = [stage_words(record, name) for name in failed if derived.withheld(record, name)]
    if not names:
        return ""
    return (
        f"The draws {numbers.listing(names)} have not converged. They are shown so that the fault "
        "can be found; nothing may be concluded from them."
    )


def stage_diagnosis(record: RunRecord, stage: StageRecord) -> str:
    """Say in words how the sampling of one stage went."""
    name = stage_words(record, stage.name)
    name = name[0].upper() + name[1:]
    whole = numbers.count(stage.chains * stage.draws, "draw")
    if stage.note:
        return f"{name}: {stage.note}."
    if not np.isfinite(stage.rhat_max):
        return f"{name}: {whole}, made directly from the prior; no Markov chain is involved."
    size = (
        f"{numbers.count(stage.chains, 'chain')} of {numbers.count(stage.draws, 'draw')} each"
        if stage.chains > 1
        else whole
    )
    outcome = "passed the gate" if stage.passed else "did not pass the gate"
    retried = ", after a second attempt with smaller steps" if stage.retried else ""
    worst = f" (largest for {stage.worst})" if stage.worst else ""
    text = (
        f"{name}: {size}, {outcome}{retried}. Largest R-hat {numbers.fixed(stage.rhat_max, 3)}"
        f"{worst}, smallest effective sample size {numbers.integer(stage.ess_bulk_min)} in the "
        f"bulk and {numbers.integer(stage.ess_tail_min)} in the tails, "
        f"{_divergences(stage.divergences)}."
    )
    if stage.failures:
        text += f" What failed: {'; '.join(stage.failures)}."
    return text


def _divergences(number: int) -> str:
    return "no divergent step" if number == 0 else numbers.count(number, "divergent step")


def power_scaling_words(found: PowerScaling) -> str:
    """Say what decides a variable: its prior, the data, or both against each other."""
    if found.conflict:
        return "prior and data both felt; may disagree"
    if found.rests_on_prior:
        return "rests on its prior; mind its source"
    return "settled by data" if found.data >= SENSITIVE else "hardly moved by either"


def p_value_words(p_value: float) -> str:
    """Read a predictive p-value: how unusual the data are under the model."""
    tail = min(p_value, 1.0 - p_value)
    if tail < 0.01:
        return CONFLICT
    return DOUBTFUL if tail < 0.05 else FINE


def direction(correlation: float) -> str:
    """Put the sign of a rank correlation into words."""
    return "rise together" if correlation > 0 else "move against each other"


def density_alt(record: RunRecord, variable: VariableRecord, draws: dict[str, FloatArray]) -> str:
    """Describe a density picture for those who do not see it."""
    unit = "" if variable.unit == "-" else f" {variable.unit}"
    parts = []
    for stage, values in draws.items():
        found = derived.moments(values)
        low, high = numbers.significant(found.low), numbers.significant(found.high)
        parts.append(
            f"{stage_words(record, stage)}: mean {numbers.significant(found.mean)}{unit}, "
            f"5\u201395 % {numbers.interval(low, high)}{unit}"
        )
    return f"Densities of {variable.label}. " + "; ".join(parts) + "."


def ordinate(period: int) -> str:
    """Label of the index axis."""
    return "annual index β [-]" if period == 1 else f"index β of {years(period)} [-]"
