"""Rebound numbers of two hammers: at cored places, beside each other, alone, in two surveys."""

from assess.updating.kind import Rows
from tests.verification.design import Design, Values

_CORES = "location,strength [MPa],diameter [mm],length [mm],moisture\n" + "\n".join(
    f"K{i},36,100,200,as received" for i in (1, 1, 2, 3, 4, 5, 6)
)
_FIRST = "location,rebound number,readings\n" + "\n".join(
    [f"K{i},38,9" for i in (1, 2, 2, 3, 4, 5)] + ["X,38,9", "X,38,9"] + [",38,9"] * 6
)
_LATER = "location,rebound number\n" + "\n".join(["K1,40", "K6,40", "X,40"] + [",40"] * 5)
_LATER_CORES = "location,strength [MPa],diameter [mm],length [mm],moisture\n" + "\n".join(
    f"K{i},36,100,200,as received" for i in (2, 7)
)


def _wider(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return rows, {k: 3.0 * v if k.endswith("N.scatter") else v for k, v in values.items()}


_ENTRY = {"zone": "deck", "correction": "none"}
DESIGN = Design(
    "rebound",
    (
        {
            "date": "2010-01-01",
            "cores": {"table": "a.csv", **_ENTRY},
            "rebound": {"table": "r.csv", "zone": "deck", "device": {"name": "N"}},
        },
        {
            "date": "2020-01-01",
            "cores": {"table": "b.csv", **_ENTRY},
            "rebound": {
                "table": "s.csv",
                "zone": "deck",
                "device": {"name": "M"},
                "curve": "EN 13791",
            },
        },
    ),
    {"a.csv": _CORES, "b.csv": _LATER_CORES, "r.csv": _FIRST, "s.csv": _LATER},
    (
        "deck.concrete_mean",
        "deck.concrete_scatter",
        *(f"rebound.{name}.{what}" for name in "NM" for what in ("level", "slope", "scatter")),
    ),
    _wider,
    "places three times as far from the line as the model has them",
    before=("cores",),
)
