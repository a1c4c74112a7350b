"""Shares of two surfaces, one of them surveyed twice."""

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_FIRST = "location,share [%],patches\nnorth,10,40\n"
_LATER = "location,share [%],patches\nnorth,30,40\nsouth,20,30\n"


def _tougher_cover(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return rows, {
        **values,
        "delamination.critical_loss": 8.0 * values["delamination.critical_loss"],
    }


DESIGN = Design(
    "delamination",
    (
        survey("2000-01-01", "delamination", {"table": "a.csv", "zone": "deck"}),
        survey("2020-01-01", "delamination", {"table": "b.csv", "zone": "deck"}),
    ),
    {"a.csv": _FIRST, "b.csv": _LATER},
    (
        "deck.onset",
        "deck.onset_scatter",
        "deck.current",
        "deck.current_scatter",
        "delamination.critical_loss",
        "delamination.critical_scatter",
    ),
    _tougher_cover,
    "a critical loss eight times the one that the model has",
    corrosion=True,
    slow=True,
)
