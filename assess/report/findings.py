"""What to read first: sentences made from results by rules.

A sentence takes its numbers from the same record and the same writers as the tables, so that the
two cannot contradict each other. A rule that finds nothing returns an empty text.
"""

from collections import Counter

import numpy as np

from assess.decisions.results import RunRecord, SectionResult, Standing
from assess.report import derived, numbers, words

STANDING_PHRASES = {  # for one section, for several
    Standing.MEETS: (
        "meets the target through {last}",
        "meet the target through {last}",
    ),
    Standing.MEETS_UNTIL: (
        "meets the target now and falls below it within the horizon",
        "meet the target now and fall below it within the horizon",
    ),
    Standing.BELOW_LIMITABLE: (
        "is below the target now and would meet it under a load limit",
        "are below the target now and would meet it under a load limit",
    ),
    Standing.BELOW: (
        "is below the target now, and no load limit was found that would mend it",
        "are below the target now, and no load limit was found that would mend it",
    ),
}


def standing_counts(record: RunRecord) -> str:
    """How many sections have which verdict, as the first sentence to read."""
    results = derived.final_results(record)
    stage = derived.final_stage(record).name
    total = numbers.count(len(results), "section")
    when = words.stage_words(record, stage)
    if derived.withheld(record, stage):
        return f"The indices {when} are withheld: the Markov chains have not converged."
    last = derived.last_year(record)
    counts = Counter(item.verdict.standing for item in results)
    parts = [
        f"{counts[standing]} {(one if counts[standing] == 1 else many).format(last=last)}"
        for standing, (one, many) in STANDING_PHRASES.items()
        if counts[standing]
    ]
    return f"Of {total} examined, {when}: {'; '.join(parts)}."


def lowest_sentence(record: RunRecord) -> str:
    """Name the section with the lowest index now."""
    results = derived.final_results(record)
    if not results or derived.withheld(record, derived.final_stage(record).name):
        return ""
    worst = min(results, key=lambda item: float(item.reference.index[0]))
    value, error, low, high = derived.now(worst.reference)
    band = numbers.interval(numbers.index(low), numbers.index(high))
    side = "below" if value < record.target.index else "at or above"
    return (
        f"The lowest index is {numbers.index_with_error(value, error)} at {worst.section} "
        f"(5\u201395 % band {band}), {side} the required {numbers.index(record.target.index)}. "
        f"Failure there is governed by {worst.verdict.governing}."
    )


def crossing_sentence(record: RunRecord) -> str:
    """Name the next section that will fall below the target."""
    if derived.withheld(record, derived.final_stage(record).name):
        return ""
    later = [
        item
        for item in derived.final_results(record)
        if item.verdict.standing is Standing.MEETS_UNTIL and item.verdict.crossing_year is not None
    ]
    if not later:
        return ""
    first = min(later, key=lambda item: (item.verdict.crossing_year or 0, item.section))
    verdict = first.verdict
    band = numbers.year_interval(
        verdict.crossing_low, verdict.crossing_high, derived.last_year(record)
    )
    return (
        f"Of the sections that meet the target now, {first.section} is the first to fall below it: "
        f"in {verdict.crossing_year} (5\u201395 % of the draws: {band})."
    )


def change_sentence(record: RunRecord) -> str:
    """Say where the surveys moved the index most, between the first and the last stage."""
    first, last = record.stages[0].name, derived.final_stage(record).name
    if first == last or derived.withheld(record, first) or derived.withheld(record, last):
        return ""
    changes: list[tuple[str, float, float]] = []
    for result in derived.final_results(record):
        before = derived.find(record, result.section, first)
        if before is not None:
            changes.append(
                (result.section, float(before.reference.index[0]), float(result.reference.index[0]))
            )
    changes = [item for item in changes if np.isfinite(item[1]) and np.isfinite(item[2])]
    if not changes:
        return ""
    section, old, new = max(changes, key=lambda item: abs(item[2] - item[1]))
    rose = sum(round(item[2], 2) > round(item[1], 2) for item in changes)
    fell = sum(round(item[2], 2) < round(item[1], 2) for item in changes)
    return (
        f"The surveys raised the index at {numbers.count(rose, 'section')} and lowered it at "
        f"{numbers.count(fell, 'section')}. The largest change is at {section}: from "
        f"{numbers.index(old)} to {numbers.index(new)}."
    )


def learned_sentence(record: RunRecord) -> str:
    """Name the variables of which the surveys taught most, by standard deviation removed."""
    first, last = record.stages[0].name, derived.final_stage(record).name
    if derived.withheld(record, last):
        return ""
    gains = []
    for item in derived.used_variables(record):
        if first in item.draws and first != last:
            before, after = derived.moments(item.draws[first]), derived.moments(item.draws[last])
            gains.append((derived.learned(before, after), item.label))
    gains.sort(key=lambda pair: (-pair[0], pair[1]))
    if not gains or gains[0][0] <= 0.0:
        return ""
    named = [f"{label} ({numbers.percent(gain)})" for gain, label in gains[:3] if gain > 0.0]
    return (
        "The surveys taught most about "
        f"{numbers.listing(named)}; in brackets the share of the prior standard deviation removed."
    )


def close_calls(record: RunRecord) -> str:
    """Name sections whose index is within two standard errors of the target."""
    if derived.withheld(record, derived.final_stage(record).name):
        return ""
    close = [
        item.section
        for item in derived.final_results(record)
        if abs(float(item.reference.index[0]) - record.target.index)
        < 2.0 * float(item.reference.error[0])
    ]
    if not close:
        return ""
    return (
        f"At {numbers.listing(close)} the present index differs from the target by less than two "
        "standard errors of the calculation: the verdict there rests on numerical noise, and a "
        "longer run is needed."
    )


def unmeasured_sentence(record: RunRecord) -> str:
    """Name sections that no survey measured directly."""
    seen = derived.measured_sections(record)
    missing = [name for name in derived.sections(record) if name not in seen]
    if not missing or not record.data:
        return ""
    return (
        f"No survey measured {numbers.listing(missing)} directly; "
        f"{'its' if len(missing) == 1 else 'their'} local values are drawn from the zone."
    )


def ignoring_sentence(record: RunRecord) -> str:
    """Say which verdicts would change if the dependence between variables were ignored."""
    results = [item for item in derived.final_results(record) if item.independent is not None]
    if not results or derived.withheld(record, derived.final_stage(record).name):
        return ""
    changed = [item.section for item in results if verdict_changes(item)]
    differences = [_difference(item) for item in results]
    largest = max(differences, key=abs)
    if not largest:
        return ""
    way = "higher" if largest > 0 else "lower"
    size = f"by up to {numbers.index(abs(largest))} ({way})"
    if changed:
        return (
            f"Ignoring the dependence between the variables would change the verdict at "
            f"{numbers.listing(changed)}, and an index {size}."
        )
    return (
        "Ignoring the dependence between the variables would change no verdict; it would change "
        f"an index {size}."
    )


def _difference(result: SectionResult) -> float:
    """Largest change of a section's index in any year, where both are finite."""
    if result.independent is None:
        return 0.0
    kept, dropped = result.reference.index, result.independent.index
    usable = np.isfinite(kept) & np.isfinite(dropped)
    change = dropped[usable] - kept[usable]
    return float(max(change, key=abs, default=0.0))


def verdict_changes(result: SectionResult) -> bool:
    """Tell whether dropping the dependence changes standing or crossing year."""
    other = result.verdict_independent
    if other is None:
        return False
    same = other.standing is result.verdict.standing
    return not (same and other.crossing_year == result.verdict.crossing_year)


def options_sentence(record: RunRecord) -> str:
    """Compare the options by sections below the target and by money, without choosing one."""
    others = [item for item in record.options if item.option != derived.LEAVE]
    leave = [item for item in record.options if item.option == derived.LEAVE]
    if not others:
        return ""
    least = min(item.sections_below for item in record.options)
    best = [
        words.option_words(item.option) for item in record.options if item.sections_below == least
    ]
    against = f", against {leave[0].sections_below} if left as is" if leave else ""
    parts = [
        f"Fewest sections below the target at the end of the horizon: {least}{against}, with "
        f"{numbers.listing(best)}."
    ]
    sums = [
        (item.cost + item.expected_failure_cost, words.option_words(item.option))
        for item in record.options
        if item.cost is not None and item.expected_failure_cost is not None
    ]
    if len(sums) > 1:
        total, name = min(sums)
        amount = numbers.money(numbers.rounded(total), record.currency)
        parts.append(f"Smallest sum of cost and expected failure cost: {name}, {amount}.")
    return " ".join(parts)


def findings(record: RunRecord) -> list[str]:
    """Return what to read first, in order; a rule that finds nothing says nothing."""
    rules = (
        standing_counts,
        lowest_sentence,
        crossing_sentence,
        change_sentence,
        learned_sentence,
        unmeasured_sentence,
        ignoring_sentence,
        close_calls,
        _conflict_count,
    )
    return [sentence for sentence in (rule(record) for rule in rules) if sentence]


def _conflict_count(record: RunRecord) -> str:
    found = len(record.conflicts) + len(record.doubts)
    if not found:
        return ""
    return (
        f"Before relying on any of this, read the remarks on fit under Diagnostics "
        f"({len(record.conflicts)}) and the doubts about the data ({len(record.doubts)})."
    )
