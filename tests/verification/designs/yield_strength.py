"""Coupons and hardness of one reinforcement: bars with either, bars with both, in two surveys."""

from dataclasses import replace

import numpy as np

from assess.updating.kind import Rows
from assess.updating.yield_strength import HARDNESS
from tests.verification.design import Design, Values, survey

_SCATTER = {"distribution": "lognormal", "mean": "12 MPa", "V": 0.4, "source": "test"}
_STEEL = {"mean": "460 MPa", "sd": "29 MPa", "local_sd": _SCATTER, "source": "test"}
_FIRST = "location,yield strength [MPa],hardness\n" + "\n".join(
    [f"B{i},460,191" for i in range(4)] + ["B0,460,", "B1,,191"] + [",470,"] * 4 + [",,195"] * 6
)
_LATER = "location,yield strength [MPa],hardness\n" + "\n".join(
    ["B0,460,", "B5,,190", "B5,460,"] + [",465,"] * 3 + [",,195"] * 3
)


def _noisier_hardness(rows: Rows, values: Values) -> tuple[Rows, Values]:
    hard = rows.extra["sort"] == HARDNESS
    precision = np.where(hard, 0.04 * rows.extra["precision"], rows.extra["precision"])
    return replace(rows, extra={**rows.extra, "precision": precision}), values


DESIGN = Design(
    "yield_strength",
    (
        survey("2010-01-01", "yield_strength", {"table": "a.csv"}),
        survey("2020-01-01", "yield_strength", {"table": "b.csv", "error": "8 MPa"}),
    ),
    {"a.csv": _FIRST, "b.csv": _LATER},
    (
        "steel.main",
        "steel.main.scatter",
        "yield_strength.main.hardness_factor",
        "yield_strength.main.hardness_gain",
        "yield_strength.main.hardness_scatter",
    ),
    _noisier_hardness,
    "hardness readings of five times the error that the model has",
    case={"steel": {"main": _STEEL}},
)
