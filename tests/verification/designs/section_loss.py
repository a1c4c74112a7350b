"""Break-outs with and without loss, some visited twice."""

from dataclasses import replace

import numpy as np

from assess.updating.kind import Rows
from tests.verification.cases import loss_entry
from tests.verification.design import Design, Values, survey

_LOSS = "location,original diameter [mm],residual diameter [mm]\n" + "\n".join(
    f"B{i},32,{'none' if i % 2 else 31}" for i in range(6)
)
_LATER_LOSS = "location,original diameter [mm],residual diameter [mm]\n" + "\n".join(
    f"B{i},32,30" for i in range(3, 8)
)


def _blunter_eye(rows: Rows, values: Values) -> tuple[Rows, Values]:
    limit = rows.extra["limit"] + np.log(4.0)
    return replace(rows, extra={**rows.extra, "limit": limit}), values


DESIGN = Design(
    "section_loss",
    (
        survey("2005-01-01", "section_loss", loss_entry("a.csv")),
        survey("2020-01-01", "section_loss", loss_entry("b.csv")),
    ),
    {"a.csv": _LOSS, "b.csv": _LATER_LOSS},
    ("deck.onset", "deck.onset_scatter", "deck.current", "deck.current_scatter"),
    _blunter_eye,
    "a detection limit four times the one that the model has",
    corrosion=True,
)
