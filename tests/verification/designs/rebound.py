"""Rebound numbers of two hammers, given cores and velocities at some of their places."""

from dataclasses import replace

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey
from tests.verification.designs.pulse_velocity import CORES

_VELOCITY = "location,velocity [km/s]\n" + "".join(f"P{i},4.3\n" for i in range(3, 8))
_REBOUND = "location,rebound\n" + "".join(f"P{i},40\n" for i in range(10)) + ",44\n"
_LATER = "location,rebound\n" + "".join(f"P{i},38\n" for i in range(7, 13))


def _larger_errors(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "variance": 60.0 * rows.extra["variance"]}), values


DESIGN = Design(
    "rebound",
    (
        {
            "date": "2010-01-01",
            "cores": {"table": "c.csv", "zone": "deck", "correction": "none"},
            "pulse_velocity": {"table": "v.csv", "zone": "deck"},
            "rebound": {"table": "r.csv", "zone": "deck", "device": "old"},
        },
        survey(
            "2020-01-01",
            "rebound",
            {"table": "s.csv", "zone": "deck", "device": "new", "curve": "published"},
        ),
    ),
    {"c.csv": CORES, "v.csv": _VELOCITY, "r.csv": _REBOUND, "s.csv": _LATER},
    (
        "deck.concrete_mean",
        "deck.concrete_scatter",
        "rebound.old.level",
        "rebound.old.slope",
        "rebound.new.level",
        "rebound.new.scatter",
    ),
    _larger_errors,
    "errors of reading eight times as large as the model has them",
)
