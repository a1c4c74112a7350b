"""Depths of a zone at single and repeated places, in two surveys of different error."""

from dataclasses import replace

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_ZONE = {
    "depth_deviation": {"distribution": "normal", "mean": "2 mm", "sd": "6 mm", "source": "test"},
    "depth_scatter": {"distribution": "lognormal", "mean": "6 mm", "V": 0.3, "source": "test"},
    "width_deviation": {"distribution": "normal", "mean": "1 mm", "sd": "4 mm", "source": "test"},
    "width_scatter": {"distribution": "lognormal", "mean": "4 mm", "V": 0.3, "source": "test"},
}
_HEAD = "section,location,dimension,measured [mm],nominal [mm]\n"
_FIRST = _HEAD + "S1,,depth,1000,\n" * 2 + ",A,depth,900,900\n" * 3 + ",,depth,900,900\n" * 4
_LATER = _HEAD + ",A,depth,900,900\nS2,,depth,1000,\n" + ",,width,320,320\n" * 6


def _larger_errors(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "precision": 0.02 * rows.extra["precision"]}), values


DESIGN = Design(
    "dimensions",
    (
        survey("2010-01-01", "dimensions", {"table": "a.csv", "zone": "deck"}),
        survey("2020-01-01", "dimensions", {"table": "b.csv", "zone": "deck", "error": "2 mm"}),
    ),
    {"a.csv": _FIRST, "b.csv": _LATER},
    ("deck.depth_deviation", "deck.depth_scatter", "deck.width_deviation", "deck.width_scatter"),
    _larger_errors,
    "readings of seven times the error that the model has",
    zone={"dimensions": _ZONE},
)
