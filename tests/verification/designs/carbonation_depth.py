"""Depths on their own and repeated, some beyond the core, some not found, in two surveys."""

from dataclasses import replace

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_CARBONATION = {
    "carbonation_rate": {
        "distribution": "lognormal", "mean": "4 mm/yr^0.5", "V": 0.4, "source": "test",
    },
    "carbonation_rate_scatter": {
        "distribution": "lognormal", "mean": 0.35, "V": 0.4, "source": "test",
    },
}  # fmt: skip
_DEPTHS = "location,depth [mm]\n,20\n,20\n,20\n,20\n,20\n,>30\n,none\nC1,22\nC1,>30\n"
_LATER = "location,depth [mm]\nC1,25\n,25\n,25\n,none\n"


def _older_structure(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "age": 2.0 * rows.extra["age"]}), values


DESIGN = Design(
    "carbonation_depth",
    (
        survey(
            "2000-01-01",
            "carbonation_depth",
            {"table": "a.csv", "zone": "deck", "error": 0.2, "detection_limit": "10 mm"},
        ),
        survey(
            "2020-01-01",
            "carbonation_depth",
            {"table": "b.csv", "zone": "deck", "error": 0.3, "detection_limit": "15 mm"},
        ),
    ),
    {"a.csv": _DEPTHS, "b.csv": _LATER},
    ("deck.carbonation_rate", "deck.carbonation_rate_scatter"),
    _older_structure,
    "a structure twice as old as the model has it",
    zone={"carbonation": _CARBONATION},
)
