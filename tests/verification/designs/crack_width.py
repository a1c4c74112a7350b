"""Cracks along bars of two diameters, some places seen twice, some without a crack."""

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_HEAD = "location,crack width [mm],bar diameter [mm],cover [mm]\n"
_FIRST = _HEAD + "\n".join(
    f"B{i},{'none' if i % 2 else 0.4},{16 if i < 3 else 25},{30 + 2 * i}" for i in range(4)
)
_LATER = _HEAD + "\n".join(f"B{i},1,{16 if i < 3 else 25},{30 + 2 * i}" for i in range(2, 7))


def _looser_relation(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return rows, {**values, "crack_width.scatter": 4.0 * values["crack_width.scatter"]}


DESIGN = Design(
    "crack_width",
    (
        survey("2005-01-01", "crack_width", {"table": "a.csv", "zone": "deck"}),
        survey("2020-01-01", "crack_width", {"table": "b.csv", "zone": "deck", "error": 0.2}),
    ),
    {"a.csv": _FIRST, "b.csv": _LATER},
    (
        "deck.onset",
        "deck.onset_scatter",
        "deck.current",
        "deck.current_scatter",
        "crack_width.factor",
        "crack_width.scatter",
    ),
    _looser_relation,
    "a relation that scatters four times as much as the model has it",
    corrosion=True,
    slow=True,
)
