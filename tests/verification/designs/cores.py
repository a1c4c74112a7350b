"""Cores of several shapes and states."""

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_CORES = """location;strength [MPa];diameter [mm];length [mm];moisture
K1;31.6;94;141;as received
K2;40.6;94;188;soaked
K3;37.2;94;94;as received
K3;35.0;94;94;as received
K4;39.1;50;100;as received
K5;33.0;50;60;air dried
K6;36.0;50;75;as received
K6;36.0;75;75;as received
"""
_LATER_CORES = """location;strength [MPa];diameter [mm];length [mm];moisture
K3;35.0;94;141;as received
K7;38.0;94;188;as received
K8;34.0;75;150;air dried
"""


def _larger_errors(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return rows, {k: 3.0 * v if k.startswith("cores.") else v for k, v in values.items()}


DESIGN = Design(
    "cores",
    (
        survey("2010-01-01", "cores", {"table": "a.csv", "zone": "deck"}),
        survey("2020-01-01", "cores", {"table": "b.csv", "zone": "deck", "within_location": 0.1}),
    ),
    {"a.csv": _CORES, "b.csv": _LATER_CORES},
    (
        "deck.concrete_mean",
        "deck.concrete_scatter",
        "cores.length_correction",
        "cores.diameter_correction",
        "cores.moisture_correction",
        "cores.damage_correction",
    ),
    _larger_errors,
    "correction errors three times as large as the model has them",
)
