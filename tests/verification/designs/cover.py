"""Readings of two meters, single and repeated, some beyond the range."""

from dataclasses import replace

from assess.updating.kind import Rows
from tests.verification.cases import METER_A, METER_B
from tests.verification.design import Design, Values, survey

_COVER = "location,cover [mm]\n" + "\n".join([",44"] * 12 + [",>50"] * 2) + "\n"
_LATER_COVER = "location,cover [mm]\n" + "\n".join(
    [f"R{i},40" for i in (1, 1, 1, 2, 2, 3, 3, 3)] + [",41"] * 6
)


def _noisier_meter(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "variance": 4.0 * rows.extra["variance"]}), values


DESIGN = Design(
    "cover",
    (
        survey("2010-01-01", "cover", {"table": "a.csv", "zone": "deck", "meter": METER_A}),
        survey("2020-01-01", "cover", {"table": "b.csv", "zone": "deck", "meter": METER_B}),
    ),
    {"a.csv": _COVER, "b.csv": _LATER_COVER},
    ("deck.cover_mean", "deck.cover_scatter", "cover_meter_1.bias", "cover_meter_2.bias"),
    _noisier_meter,
    "meters with twice the scatter that the model has",
)
