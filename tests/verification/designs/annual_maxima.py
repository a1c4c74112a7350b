"""Maxima of years and of months, some recorded with error, in two surveys."""

from dataclasses import replace

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_MODEL = {
    "quantity": "moment",
    "location": {"distribution": "lognormal", "mean": "400 kN*m", "V": 0.2, "source": "test"},
    "scale": {"distribution": "lognormal", "mean": "40 kN*m", "V": 0.4, "source": "test"},
    "shape": {"distribution": "normal", "mean": 0.0, "sd": 0.1, "source": "test"},
}
_YEARS = "maximum moment [kN*m]\n" + "\n".join(["420"] * 12) + "\n"
_MONTHS = "maximum moment [kN*m],period [month]\n" + "\n".join(["390,1"] * 8) + "\n"


def _longer_periods(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "period": 4.0 * rows.extra["period"]}), values


DESIGN = Design(
    "annual_maxima",
    (
        survey("2010-01-01", "annual_maxima", {"table": "a.csv", "load_model": "traffic"}),
        survey(
            "2020-01-01",
            "annual_maxima",
            {"table": "b.csv", "load_model": "traffic", "error": 0.05},
        ),
    ),
    {"a.csv": _YEARS, "b.csv": _MONTHS},
    ("load.traffic.location", "load.traffic.scale", "load.traffic.shape"),
    _longer_periods,
    "periods four times as long as the model has them",
    case={"load_models": {"traffic": _MODEL}},
)
