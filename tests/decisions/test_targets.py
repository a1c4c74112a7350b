from pathlib import Path

import pandas as pd
import pytest

from assess.decisions.targets import TARGET_SETS, target, user_target

TABLE = pd.read_csv(Path(__file__).parents[1] / "published" / "targets.csv", comment="#")


@pytest.mark.published(
    source="EN 1990:2002; JCSS PMC 2001; ISO 13822:2010; fib Model Code 2010 (partly from memory)",
    place="table B2; part 1, tables 1 and 2; table F.1; existing structures",
)
def test_every_target_as_printed():
    for row in TABLE.to_dict("records"):
        found = target(row["set"], row["class"], row["period"])
        assert (found.index, found.period) == (row["index"], row["period"])
        assert (found.set_name, found.class_name) == (row["set"], row["class"])
    listed = {
        (name, label, period)
        for name, entry in TARGET_SETS.items()
        for label, periods in entry.classes.items()
        for period in periods
    }
    assert listed == {(r["set"], r["class"], r["period"]) for r in TABLE.to_dict("records")}


def test_every_set_says_where_it_comes_from():
    for entry in TARGET_SETS.values():
        assert all(len(text) > 5 for text in (entry.source, entry.place, entry.seen, entry.note))
        assert "from memory" in entry.seen or "read in" in entry.seen


def test_source_tells_what_is_from_memory():
    found = target("ISO 13822", "medium consequences", 50)
    assert "annex F" in found.source
    assert "from memory" in found.source


def test_jcss_targets_rise_with_consequences_and_fall_with_cost():
    def index(consequences, cost):
        name = f"{consequences} consequences, {cost} cost of safety"
        return target("JCSS PMC", name, 1).index

    for cost in ("high", "normal", "low"):
        row = [index(c, cost) for c in ("minor", "moderate", "large")]
        assert row == sorted(row)
    for consequences in ("minor", "moderate", "large"):
        column = [index(consequences, c) for c in ("high", "normal", "low")]
        assert column == sorted(column)


def test_errors_name_what_is_known():
    with pytest.raises(ValueError, match="no target set 'EC0'; known: EN 1990; JCSS PMC;"):
        target("EC0", "RC2", 50)
    with pytest.raises(ValueError, match="no class 'CC2'; known: RC1; RC2; RC3"):
        target("EN 1990", "CC2", 50)
    with pytest.raises(ValueError, match="period of 15 years; known: 1, 50 .*not converted"):
        target("EN 1990", "RC2", 15)


def test_sets_cannot_be_changed():
    with pytest.raises(TypeError, match="does not support item assignment"):
        TARGET_SETS["EN 1990"].classes["RC2"][50] = 1.0


def test_user_target():
    found = user_target(3.3, 15, " NEN 8700, table B.1 ")
    assert (found.index, found.period, found.set_name) == (3.3, 15, "user")
    assert found.source == "NEN 8700, table B.1"


def test_user_target_refuses_nonsense():
    with pytest.raises(ValueError, match="finite number, got inf"):
        user_target(float("inf"), 50, "somewhere")
    with pytest.raises(ValueError, match="whole number of years from 1, got 0"):
        user_target(3.8, 0, "somewhere")
    with pytest.raises(ValueError, match="must name its source"):
        user_target(3.8, 50, "  ")
