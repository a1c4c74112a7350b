"""A density and a thickness, single and repeated readings, in two surveys."""

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_QUANTITIES = {
    "concrete": {
        "of": "weight density",
        "level": {"distribution": "normal", "mean": "24.5 kN/m^3", "V": 0.03, "source": "test"},
        "scatter": {"distribution": "lognormal", "mean": "0.5 kN/m^3", "V": 0.3, "source": "test"},
    },
    "surfacing": {
        "of": "thickness",
        "level": {"distribution": "lognormal", "mean": "90 mm", "V": 0.25, "source": "test"},
        "scatter": {"distribution": "lognormal", "mean": "12 mm", "V": 0.4, "source": "test"},
    },
}
_DENSITY = "location,weight density [kN/m^3]\nK1,24\nK1,24\nK2,24\n,24\n,24\n,24\n"
_THICKNESS = "location,thickness [mm]\n" + ",90\n" * 10 + "T1,90\nT1,90\n"
_LATER = "location,weight density [kN/m^3]\nK2,24\nK3,24\n,24\n"


def _more_scatter(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return rows, {k: 3.0 * v if k.endswith(".scatter") else v for k, v in values.items()}


DESIGN = Design(
    "quantities",
    (
        survey(
            "2010-01-01", "quantities", {"table": "a.csv", "quantity": "concrete", "error": 0.01}
        ),
        {
            "date": "2020-01-01",
            "quantities": [
                {"table": "b.csv", "quantity": "surfacing", "error": 0.05},
                {"table": "c.csv", "quantity": "concrete", "error": 0.02},
            ],
        },
    ),
    {"a.csv": _DENSITY, "b.csv": _THICKNESS, "c.csv": _LATER},
    (
        "quantity.concrete",
        "quantity.concrete.scatter",
        "quantity.surfacing",
        "quantity.surfacing.scatter",
    ),
    _more_scatter,
    "quantities that scatter three times as much as the model has them",
    case={"quantities": _QUANTITIES},
)
