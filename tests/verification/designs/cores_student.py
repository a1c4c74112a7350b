"""Cores with Student-t errors, a later survey with normal ones at places of the first."""

from dataclasses import replace

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_CORES = "location,strength [MPa],diameter [mm],length [mm],moisture\n" + "\n".join(
    f"K{k // 2},{32 + k},94,{94 + 8 * k},as received" for k in range(6)
)
_LATER_CORES = "location,strength [MPa],diameter [mm],length [mm],moisture\n" + "\n".join(
    f"K{3 * k},36,94,188,soaked" for k in range(2)
)


def _larger_errors(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "precision": rows.extra["precision"] / 16.0}), values


DESIGN = Design(
    "cores",
    (
        survey(
            "2010-01-01",
            "cores",
            {
                "table": "a.csv",
                "zone": "deck",
                "correction": "EN 13791",
                "errors": "Student-t",
                "within_location": 0.1,
            },
        ),
        survey("2020-01-01", "cores", {"table": "b.csv", "zone": "deck", "within_location": 0.1}),
    ),
    {"a.csv": _CORES, "b.csv": _LATER_CORES},
    ("deck.concrete_mean", "deck.concrete_scatter", "cores.length_correction"),
    _larger_errors,
    "errors four times as large as the model has",
    words="with Student-t errors",
    slow=True,
)
