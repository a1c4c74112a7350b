"""Five profiles of five increments, two of them again with a sixth, contents on both bases."""

from dataclasses import replace

import numpy as np

from assess.updating.kind import Rows
from tests.verification.design import Design, Values, survey

_CHLORIDE = {
    "surface_chloride": {
        "distribution": "lognormal", "mean": "2.5 %", "V": 0.4, "source": "test",
    },
    "surface_chloride_scatter": {
        "distribution": "lognormal", "mean": 0.35, "V": 0.4, "source": "test",
    },
    "diffusion": {
        "distribution": "lognormal", "mean": "150 mm^2/yr", "V": 0.6, "source": "test",
    },
    "diffusion_scatter": {
        "distribution": "lognormal", "mean": 0.4, "V": 0.4, "source": "test",
    },
    "age_exponent": {
        "distribution": "beta", "mean": 0.4, "sd": 0.15, "lower": 0, "upper": 1, "source": "test",
    },
    "reference_age": "0.0767 yr",
    "convection_depth": "6 mm",
    "initial_chloride": "0.02 %",
}  # fmt: skip
_HEAD = "location,from [mm],to [mm],chloride [%]\n"
_DEPTHS = ((0, 6), (6, 15), (15, 25), (25, 40), (40, 60))
_PROFILES = _HEAD + "\n".join(f"W{i},{a},{b},0.5" for i in range(5) for a, b in _DEPTHS)
_LATER = _HEAD + "\n".join(f"W{i},{a},{b},0.1" for i in (3, 4, 5) for a, b in _DEPTHS)


def _scattered_increments(rows: Rows, values: Values) -> tuple[Rows, Values]:
    count = len(rows.value)
    return replace(rows, place=np.arange(count), place_zone=rows.zone, places=("",) * count), values


DESIGN = Design(
    "chloride_profile",
    (
        survey(
            "1990-01-01",
            "chloride_profile",
            {
                "table": "a.csv",
                "zone": "deck",
                "basis": "binder",
                "error": 0.1,
                "absolute_error": "0.02 %",
                "detection_limit": "0.05 %",
            },
        ),
        survey(
            "2020-01-01",
            "chloride_profile",
            {
                "table": "b.csv",
                "zone": "deck",
                "basis": "concrete",
                "binder_content": "320 kg/m^3",
                "density": "2350 kg/m^3",
                "error": 0.15,
                "absolute_error": "0.004 %",
                "detection_limit": "0.01 %",
            },
        ),
    ),
    {"a.csv": _PROFILES, "b.csv": _LATER},
    (
        "deck.surface_chloride",
        "deck.surface_chloride_scatter",
        "deck.diffusion",
        "deck.diffusion_scatter",
        "deck.age_exponent",
        "chloride_profile.deck.binder_content",
    ),
    _scattered_increments,
    "increments of one profile that come from different places",
    zone={"chloride": _CHLORIDE},
    slow=True,
)
