"""Pulse velocities at places with cores, with rebound numbers, with both, and alone."""

from assess.updating.kind import Rows
from tests.verification.design import Design, Values

_CORES = "location,strength [MPa],diameter [mm],length [mm],moisture\n" + "\n".join(
    f"K{i},36,100,200,as received" for i in (1, 1, 2, 3, 4)
)
_REBOUND = "location,rebound number\n" + "\n".join(
    [f"{place},38" for place in ("K1", "K2", "X1", "X2", "X3", "X3")] + [",38"] * 3
)
_FIRST = "location,pulse velocity [km/s]\n" + "\n".join(
    [f"{place},4.4" for place in ("K1", "K3", "K4", "X1", "X2", "Y")] + [",4.4"] * 5
)
_LATER = "location,pulse velocity [m/s],readings\n" + "\n".join(
    ["K1,4400,3", "K2,4400,3", "X3,4400,3", "Y,4400,1"] + [",4400,3"] * 4
)


def _wider(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return rows, {k: 3.0 * v if k.endswith("P.scatter") else v for k, v in values.items()}


_DEVICE = {"zone": "deck", "device": {"name": "P"}}
DESIGN = Design(
    "pulse_velocity",
    (
        {
            "date": "2010-01-01",
            "cores": {"table": "a.csv", "zone": "deck", "correction": "none"},
            "pulse_velocity": {"table": "v.csv", **_DEVICE},
        },
        {
            "date": "2020-01-01",
            "rebound": {"table": "r.csv", "zone": "deck", "device": {"name": "N"}},
            "pulse_velocity": {"table": "w.csv", **_DEVICE},
        },
    ),
    {"a.csv": _CORES, "r.csv": _REBOUND, "v.csv": _FIRST, "w.csv": _LATER},
    (
        "deck.concrete_mean",
        "deck.concrete_scatter",
        *(f"pulse_velocity.P.{what}" for what in ("level", "slope", "scatter")),
        *(f"rebound.N.{what}" for what in ("level", "slope", "scatter")),
    ),
    _wider,
    "places three times as far from the line as the model has them",
    before=("cores", "rebound"),
)
