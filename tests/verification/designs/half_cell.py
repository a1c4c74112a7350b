"""Potentials of one zone in two surveys, worth fewer points than were read."""

from dataclasses import replace

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_POTENTIALS = "potential [mV],count\n-120,30\n-260,20\n-420,10\n"
_CLASSES = "class,count\nabove -200 mV,40\n-200 to -350 mV,20\nbelow -350 mV,20\n"


def _older_structure(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "age": 1.6 * rows.extra["age"]}), values


DESIGN = Design(
    "half_cell",
    (
        survey(
            "2000-01-01",
            "half_cell",
            {
                "table": "a.csv",
                "zone": "deck",
                "electrode": "silver chloride, 3 M KCl",
                "effective_points": 30,
            },
        ),
        survey(
            "2020-01-01", "half_cell", {"table": "b.csv", "zone": "deck", "effective_points": 40}
        ),
    ),
    {"a.csv": _POTENTIALS, "b.csv": _CLASSES},
    (
        "deck.onset",
        "deck.onset_scatter",
        "half_cell.active_uncertain",
        "half_cell.active_told_right",
        "half_cell.passive_uncertain",
        "half_cell.passive_told_right",
    ),
    _older_structure,
    "a structure 1.6 times as old as the model has it",
    corrosion=True,
    slow=True,
)
