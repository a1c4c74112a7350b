from dataclasses import replace
from types import SimpleNamespace

import pytest

from assess.case.processes import Dimensions
from assess.case.spec import Structure
from assess.reliability.bending_faults import (
    Shape,
    impossible_load,
    impossible_shape,
    twice_stated,
    unknown_quantities,
)
from assess.reliability.loads import Loads

SHAPE = Shape(1000.0, 320.0, (1800.0, 180.0), 10.0, 7, 32.0, 320.0)
SPEC = SimpleNamespace(
    structure=Structure(name="a", built=1971, assessed=2026, horizon=30), load_models={}
)


def test_a_sound_shape() -> None:
    assert list(impossible_shape(SHAPE, 55.0)) == []
    # Bars side by side over the whole width, a flange as wide as the web and as thick as it is
    # deep: odd, but they exist.
    tight = replace(SHAPE, width=224.0, flange=(224.0, 1000.0))
    assert list(impossible_shape(tight, 55.0)) == []


@pytest.mark.parametrize(
    ("changes", "cover", "keys", "words"),
    [
        # cover 90 + link 10 + half of 32 leaves nothing of 116.
        ({"depth": 116.0, "flange": None}, 90.0, ("depth",), "more than 116 mm"),
        ({"flange": (300.0, 180.0)}, 55.0, ("flange", "width"), "at least the width of 320 mm"),
        ({"flange": (1800.0, 1001.0)}, 55.0, ("flange", "thickness"), "at most the depth of 1000"),
        ({"bar_count": 11}, 55.0, ("bars", "count"), "at most 10 in 320 mm"),
    ],
)
def test_an_impossible_shape(
    changes: dict[str, object], cover: float, keys: tuple[str, ...], words: str
) -> None:
    (complaint,) = impossible_shape(replace(SHAPE, **changes), cover)
    assert complaint.keys == keys
    assert words in complaint.allowed


def loads(**maximum: object) -> Loads:
    return Loads.model_validate({"variable": {"annual_maximum": maximum}})


def test_sound_loads() -> None:
    assert list(impossible_load(loads(mean="460 kN*m", V=0.12, growth=-0.03), SPEC)) == []
    by_period = loads(value="730 kN*m", return_period="1000 yr", V=0.12)
    assert list(impossible_load(by_period, SPEC)) == []


@pytest.mark.parametrize(
    ("maximum", "key", "words"),
    [
        ({"mean": 0, "V": 0.12}, "mean", "the variable load is nothing"),
        ({"value": 0, "return_period": 100, "V": 0.12}, "value", "the variable load is nothing"),
        (
            {"value": "460 kN*m", "return_period": 1.01, "V": 1.9},
            "value",
            "no positive mean has the fractile",
        ),
        # 29 years later a twentieth less each year is 1 - 29/20, below zero.
        ({"mean": "460 kN*m", "V": 0.12, "growth": -0.05}, "growth", "shrink to nothing"),
    ],
)
def test_a_load_without_a_distribution(maximum: dict[str, object], key: str, words: str) -> None:
    (complaint,) = impossible_load(loads(**maximum), SPEC)
    assert complaint.keys == ("loads", "variable", "annual_maximum", key)
    assert words in complaint.what


def test_permanent_loads_need_the_quantities_that_they_grow_with() -> None:
    stated = {"name": "self weight", "effect": "1 kN*m", "V": 0.05, "proportional_to": ["density"]}
    found = Loads.model_validate(
        {"permanent": [stated], "variable": {"annual_maximum": {"mean": "1 kN*m", "V": 0.1}}}
    )
    assert list(unknown_quantities(found, SimpleNamespace(quantities={"density": None}))) == []
    (complaint,) = unknown_quantities(found, SimpleNamespace(quantities={"densities": None}))
    assert complaint.keys == ("loads", "permanent", 0, "proportional_to", 0)
    assert (complaint.given, complaint.allowed) == ("density", "densities")
    assert complaint.mend == "did you mean 'densities'?"
    (complaint,) = unknown_quantities(found, SimpleNamespace(quantities={}))
    assert complaint.mend == "state it under quantities"


def test_the_deviation_of_a_depth_is_stated_once() -> None:
    def distribution(kind: str, mean: float) -> dict[str, object]:
        return {"distribution": kind, "mean": mean, "sd": 3.0, "source": "test"}

    stated = Dimensions.model_validate(
        {
            "depth_deviation": distribution("normal", 2.0),
            "depth_scatter": distribution("lognormal", 5.0),
        }
    )
    zone = SimpleNamespace(dimensions=stated)
    assert list(twice_stated(None, zone)) == []
    assert list(twice_stated(5.0, SimpleNamespace(dimensions=None))) == []
    (complaint,) = twice_stated(5.0, zone)
    assert complaint.keys == ("depth_sd",)
    assert "so does the section" in complaint.what
