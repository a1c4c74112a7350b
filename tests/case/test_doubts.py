from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from assess.case.doubts import outliers
from assess.case.forms import EvidenceEntry, EvidenceForm, Judged, Table, Vocabulary
from assess.case.tables import read_table


@pytest.fixture
def cores(vocabulary: Vocabulary) -> EvidenceForm:
    return vocabulary.evidence["cores"]


@pytest.fixture
def cover(vocabulary: Vocabulary) -> EvidenceForm:
    return vocabulary.evidence["cover"]


@pytest.fixture
def loss(vocabulary: Vocabulary) -> EvidenceForm:
    return vocabulary.evidence["section_loss"]


def doubts_of(
    folder: Path, form: EvidenceForm, text: str, zone: Sequence[str] | None = None
) -> list[str]:
    path = folder / "t.csv"
    path.write_text(text, encoding="utf-8")
    table, faults, _ = read_table(path, form)
    assert faults == ()
    assert table is not None
    zones = np.array(zone or ["deck"] * len(table))
    entry = EvidenceEntry(table=path)
    return [str(d).removeprefix(f"{folder}/") for d in outliers(form, entry, table, zones)]


# Modified z-score by hand: values 38..46 and 90 have median 42.5 and absolute deviations
# 4.5 3.5 2.5 1.5 0.5 0.5 1.5 2.5 3.5 47.5, hence MAD 2.5 and 0.6745 * 47.5 / 2.5 = 12.8 for 90.
VALUES = (38, 39, 40, 41, 42, 43, 44, 45, 46, 90)


def test_outlier_by_the_modified_z_score(tmp_path: Path, cover: EvidenceForm) -> None:
    (doubt,) = doubts_of(tmp_path, cover, "cover [mm]\n" + "\n".join(map(str, VALUES)))
    assert doubt == (
        "t.csv:11: cover lies far from the others: modified z-score 12.8 around a median of "
        "42.5 mm, given 90 mm, allowed usually up to 3.5 either way, check the record"
    )


def test_values_are_shown_in_the_unit_of_their_header(tmp_path: Path, cover: EvidenceForm) -> None:
    text = "cover [cm]\n" + "\n".join(str(value / 10) for value in VALUES)
    (doubt,) = doubts_of(tmp_path, cover, text)
    assert "around a median of 4.25 cm, given 9 cm" in doubt


def test_each_zone_is_judged_by_itself(tmp_path: Path, cover: EvidenceForm) -> None:
    text = "cover [mm]\n" + "\n".join(map(str, (*VALUES, *(v + 40 for v in VALUES[:9]))))
    # Together 90 lies among the second zone's values; alone it lies far from its own.
    assert doubts_of(tmp_path, cover, text) == []
    (doubt,) = doubts_of(tmp_path, cover, text, ["soffit"] * 10 + ["deck"] * 9)
    assert "t.csv:11: cover lies far from the others: " in doubt
    assert "around a median of 42.5 mm in 'soffit', given 90 mm" in doubt


# On the logarithm to base 2 the deviations from the median are 0, 1/8, 1/4, 3/8, 1/2 and 1.6, all
# but the first twice: MAD 3/8 and 0.6745 * 1.6 / 0.375 = 2.9, no outlier. The plain values' median
# is the same, their MAD 28.3 * (1 - 2**-0.375) = 6.5, and 85.7 would be one: 0.6745 * 57.5 / 6.5.
def test_outliers_are_judged_on_the_logarithm_where_the_form_says_so(
    tmp_path: Path, cores: EvidenceForm
) -> None:
    powers = [-1.6, -0.5, -0.375, -0.25, -0.125, 0.0, 0.125, 0.25, 0.375, 0.5, 1.6]
    values = 28.3 * 2.0 ** np.array(powers)
    text = "strength [MPa]\n" + "\n".join(map(str, values))
    assert doubts_of(tmp_path, cores, text) == []
    (doubt,) = doubts_of(tmp_path, replace(cores, log_scale=False), text)
    assert "t.csv:12: " in doubt


def test_no_outliers_among_few_values(tmp_path: Path, cover: EvidenceForm) -> None:
    few = "cover [mm]\n" + "\n".join(map(str, VALUES[3:]))
    assert doubts_of(tmp_path, cover, few) == []
    assert len(doubts_of(tmp_path, cover, few + "\n47")) == 1


def test_what_the_form_derives_is_judged_in_place_of_the_value(
    tmp_path: Path, loss: EvidenceForm
) -> None:
    def lost(_entry: EvidenceEntry, table: Table) -> np.ndarray:
        return table.numbers["original diameter"] - table.numbers["residual diameter"]

    form = replace(loss, judged=Judged("loss", lost))
    # Every bar lost 2 mm or so; only the thick bar's residual diameter is out of the ordinary.
    pairs = [(16, 14.1), (16, 14), (16, 13.9), (16, 14.2), (16, 13.8), (16, 14), (16, 14.1)]
    pairs += [(16, 13.9), (40, 38.1)]
    text = "original diameter [mm],residual diameter [mm]\n" + "\n".join(
        f"{a},{b}" for a, b in pairs
    )
    assert len(doubts_of(tmp_path, loss, text)) == 1
    assert doubts_of(tmp_path, form, text) == []
    (doubt,) = doubts_of(tmp_path, form, text + "\n16,9")
    assert "t.csv:11: loss lies far from the others" in doubt
    assert "given 7 mm" in doubt
