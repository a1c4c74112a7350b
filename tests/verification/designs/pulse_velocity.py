"""Pulse velocities given cores at some of their places, some with Student-t errors."""

from dataclasses import replace

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

CORES = "location,strength [MPa],diameter [mm],length [mm],moisture\n" + "".join(
    f"P{i},{28 + 3 * i},100,200,soaked\n" for i in range(5)
)
_VELOCITY = "location,velocity [km/s]\n" + "".join(f"P{i},4.3\n" for i in range(10)) + ",4.4\n"
_LATER = "location,velocity [km/s]\n" + "".join(f"P{i},4.3\n" for i in range(7, 13))


def _other_slope(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "variance": 60.0 * rows.extra["variance"]}), values


DESIGN = Design(
    "pulse_velocity",
    (
        {
            "date": "2010-01-01",
            "cores": {"table": "c.csv", "zone": "deck", "correction": "none"},
            "pulse_velocity": {"table": "v.csv", "zone": "deck"},
        },
        survey("2020-01-01", "pulse_velocity", {"table": "w.csv", "zone": "deck"}),
    ),
    {"c.csv": CORES, "v.csv": _VELOCITY, "w.csv": _LATER},
    (
        "deck.concrete_mean",
        "deck.concrete_scatter",
        "pulse_velocity.device.level",
        "pulse_velocity.device.slope",
        "pulse_velocity.device.scatter",
    ),
    _other_slope,
    "errors of reading eight times as large as the model has them",
)
