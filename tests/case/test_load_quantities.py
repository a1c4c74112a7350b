"""Quantities that loads are proportional to, as a case file says them."""

from pathlib import Path

import pytest

from assess.case.reader import read_case
from assess.vocabulary import vocabulary
from tests.verification import cases

LEVEL = {"distribution": "normal", "mean": "24 kN/m^3", "V": 0.03, "source": "test"}
SCATTER = {"distribution": "lognormal", "mean": "0.5 kN/m^3", "V": 0.3, "source": "test"}


def reading(folder: Path, **quantities: object):
    raw = cases.base() | {"quantities": quantities}
    return read_case(cases.write_case(folder, raw), vocabulary())


def test_units_are_converted_at_reading(tmp_path: Path) -> None:
    pounds = {"distribution": "normal", "mean": "150 lbf/ft^3", "V": 0.03, "source": "test"}
    inches = {"distribution": "lognormal", "mean": "3 in", "V": 0.2, "source": "test"}
    found = reading(
        tmp_path,
        concrete={"of": "weight density", "level": pounds},
        surfacing={"of": "thickness", "level": inches},
    )
    assert found.faults == ()
    spec = found.case.spec
    # 1 lbf/ft³ is 157.087 N/m³.
    assert spec.quantities["concrete"].stated_mean == pytest.approx(150 * 0.157087, rel=1e-5)
    assert spec.quantities["surfacing"].stated_mean == pytest.approx(76.2)
    assert spec.quantities["concrete"].unit == "kN/m³"


@pytest.mark.parametrize(
    ("name", "said", "words"),
    [
        ("a.b", {"of": "weight density", "level": LEVEL}, "a name must not be empty or have a dot"),
        ("a", {"of": "mass", "level": LEVEL}, "allowed of: weight density or of: density"),
        ("a", {"of": "thickness", "level": LEVEL}, "quantities.a.level.mean: a unit that does not"),
        ("a", {"of": "weight density"}, "quantities.a.level: this key is missing"),
        (
            "a",
            {"of": "weight density", "level": LEVEL, "scatter": LEVEL},
            "quantities.a.scatter: must be a distribution of positive values only",
        ),
        (
            "a",
            {"of": "weight density", "level": LEVEL, "error": 1},
            "quantities.a.error: unknown key, allowed of, level, scatter",
        ),
    ],
)
def test_faults_are_said_with_their_line(tmp_path: Path, name, said, words) -> None:
    faults = [str(fault) for fault in reading(tmp_path, **{name: said}).faults]
    assert len(faults) == 1
    assert words in faults[0]


def test_a_scatter_may_be_left_out(tmp_path: Path) -> None:
    found = reading(tmp_path, a={"of": "weight density", "level": LEVEL, "scatter": SCATTER})
    ends = [end for end, _, _, _ in found.case.spec.quantities["a"].priors()]
    assert ends == ["", ".scatter"]
    found = reading(tmp_path, a={"of": "weight density", "level": LEVEL})
    assert [end for end, _, _, _ in found.case.spec.quantities["a"].priors()] == [""]
