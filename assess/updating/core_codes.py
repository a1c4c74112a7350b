"""Characteristic strengths that codes would derive from the cores of each zone alone."""

import numpy as np

from assess.mechanics.characteristic_strength import (
    FEWEST_ACI,
    FEWEST_EN,
    FRACTILE,
    characteristic_strength_en,
    equivalent_specified_strength,
)
from assess.updating.kind import CodeStrength, Rows

CONFIDENCES = (0.75, 0.95)
CHARACTERISTIC = 0.05  # fractile of a characteristic strength, EN 1990


def code_strengths(rows: Rows) -> list[CodeStrength]:
    """Give the characteristic in-situ strength and the equivalent specified strength of each zone.

    Parameters
    ----------
    rows : Rows
        Cores of all surveys, corrected.

    Returns
    -------
    list of CodeStrength
        A zone is taken as one test region; cores of one location count as one result, their mean.
    """
    found = []
    for number, zone in enumerate(rows.zones):
        places = np.flatnonzero(rows.place_zone == number)
        strength = np.array([np.exp(rows.value[rows.place == place]).mean() for place in places])
        error = float(np.sqrt((rows.extra["loading"][rows.zone == number] ** 2).sum(axis=1).mean()))
        count = len(strength)
        variable = (f"{zone}.concrete_mean", f"{zone}.concrete_scatter")
        short = f"asks for {FEWEST_EN} places or more"
        value = characteristic_strength_en(strength) if count >= FEWEST_EN else None
        found.append(
            CodeStrength(
                zone,
                "characteristic strength in the structure",
                "EN 13791:2019",
                count,
                value,
                "" if value is not None else short,
                variable,
                CHARACTERISTIC,
            )
        )
        for confidence in CONFIDENCES:
            enough = count >= FEWEST_ACI
            found.append(
                CodeStrength(
                    zone,
                    "equivalent specified strength",
                    f"ACI 214.4R-10, confidence {confidence:.0%}".replace("%", " %"),
                    count,
                    equivalent_specified_strength(strength, error, confidence) if enough else None,
                    "" if enough else f"asks for {FEWEST_ACI} places or more",
                    variable,
                    FRACTILE,
                )
            )
    return found
