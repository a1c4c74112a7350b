import pytest

from assess.decisions.results import RunRecord
from assess.report import derived


def test_dependent_pairs_are_ranked_by_the_last_stage(record: RunRecord) -> None:
    from scipy.stats import spearmanr

    pairs = derived.dependent_pairs(record)
    sizes = [abs(pair.after) for pair in pairs]
    assert sizes == sorted(sizes, reverse=True)
    top, last = pairs[0], record.stages[-1].name
    exact = spearmanr(top.first.draws[last].ravel(), top.second.draws[last].ravel()).statistic
    assert top.after == pytest.approx(exact, abs=1e-10)
    assert {"onset", "rate"} == {name.name.split(".")[1] for name in (top.first, top.second)}
