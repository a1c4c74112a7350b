"""Instant readings of two visits and yearly means, single and repeated, some passive."""

from dataclasses import replace

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_FIRST = "location,current [µA/cm^2]\n" + "\n".join(
    [f"R{i},{'passive' if i % 2 else 1.2}" for i in range(3)] + [",0.8"] * 8 + [",passive"] * 6
)
_LATER = "location,current [µA/cm^2]\n" + "\n".join([f"R{i},2" for i in (1, 2)] + [",1.5"] * 8)
_MEANS = "location,current [µA/cm^2]\nR1,3\n,2\n,1\nR4,1\nR4,2\n"


def _noisier_readings(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "variance": 9.0 * rows.extra["variance"]}), values


DESIGN = Design(
    "corrosion_current",
    (
        survey(
            "2000-01-01",
            "corrosion_current",
            {"table": "a.csv", "zone": "deck", "device": "A", "season": 0.4},
        ),
        survey(
            "2012-01-01",
            "corrosion_current",
            {"table": "b.csv", "zone": "deck", "device": "B", "repeatability": 0.3},
        ),
        survey(
            "2022-01-01",
            "corrosion_current",
            {"table": "c.csv", "zone": "deck", "device": "B", "average": True},
        ),
    ),
    {"a.csv": _FIRST, "b.csv": _LATER, "c.csv": _MEANS},
    (
        "deck.onset",
        "deck.onset_scatter",
        "deck.current",
        "deck.current_scatter",
        "corrosion_current.device_1",
        "corrosion_current.device_2",
        "corrosion_current.season_1",
        "corrosion_current.season_2",
    ),
    _noisier_readings,
    "errors of readings three times as large as the model has them",
    corrosion=True,
    slow=True,
)
