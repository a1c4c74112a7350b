"""A deck with cores, two rebound hammers and pulse velocities, and its joint normal density."""

from typing import Any, NamedTuple

import numpy as np

from tests.verification import cases

CORES = """location,section,strength [MPa],diameter [mm],length [mm],moisture
K1,,36.1,100,200,as received
K1,,33.0,100,200,as received
K2,,41.5,100,200,as received
K3,,29.4,100,200,as received
,S1,35.0,100,200,as received
,,38.0,100,200,as received
"""
LATER_CORES = """location,section,strength [MPa],diameter [mm],length [mm],moisture
K2,,40.0,100,200,as received
L1,,31.0,100,200,as received
"""
REBOUND = """location,section,rebound number,readings
K1,,38,9
K1,,40,12
K2,,41,
L1,,37,16
,S1,36,9
X,,40,9
X,,42,9
,,43,9
,,39,
,,41,12
Z,,35,9
"""
LATER_REBOUND = """location,section,rebound number
K1,,39
K3,,36
X,,44
,,42
"""
VELOCITY = """location,section,pulse velocity [m/s],readings
K1,,4400,
K3,,4210,2
X,,4550,
Y,,4480,
,S1,4310,
,S2,4290,
,,4500,
,,4450,
"""
LATER_VELOCITY = """location,section,pulse velocity [km/s]
Y,,4.52
K1,,4.38
,,4.47
"""
TABLES = {
    "cores.csv": CORES,
    "cores2.csv": LATER_CORES,
    "rebound.csv": REBOUND,
    "rebound2.csv": LATER_REBOUND,
    "velocity.csv": VELOCITY,
    "velocity2.csv": LATER_VELOCITY,
}
PLAIN = {"zone": "deck", "correction": "none"}
HAMMER = {"zone": "deck", "device": {"name": "N"}}
OTHER_HAMMER = {"zone": "deck", "device": {"name": "M"}, "curve": "EN 13791"}
PULSE = {"zone": "deck", "device": {"name": "P"}}

VALUES = {
    "deck.concrete_mean": np.array([33.0, 38.0, 29.0]),
    "deck.concrete_scatter": np.array([0.12, 0.2, 0.3]),
    "rebound.N.level": np.array([36.0, 38.5, 40.0]),
    "rebound.N.slope": np.array([0.45, 0.6, 0.2]),
    "rebound.N.scatter": np.array([0.06, 0.1, 0.03]),
    "rebound.M.level": np.array([39.0, 36.5, 41.0]),
    "rebound.M.slope": np.array([0.35, 0.5, 0.7]),
    "rebound.M.scatter": np.array([0.08, 0.05, 0.12]),
    "pulse_velocity.P.level": np.array([4.3, 4.4, 4.5]),
    "pulse_velocity.P.slope": np.array([0.15, 0.1, 0.25]),
    "pulse_velocity.P.scatter": np.array([0.02, 0.035, 0.05]),
}


def surveys() -> list[dict[str, Any]]:
    """Give two surveys of all three kinds."""
    return [
        {
            "date": "2010-01-01",
            "cores": {"table": "cores.csv", **PLAIN},
            "rebound": {"table": "rebound.csv", **HAMMER},
            "pulse_velocity": {"table": "velocity.csv", **PULSE},
        },
        {
            "date": "2020-01-01",
            "cores": {"table": "cores2.csv", **PLAIN, "within_location": 0.1},
            "rebound": {"table": "rebound2.csv", **OTHER_HAMMER},
            "pulse_velocity": {"table": "velocity2.csv", **PULSE, "reading_error": 0.03},
        },
    ]


def case(kinds: tuple[str, ...] = ("cores", "rebound", "pulse_velocity")) -> dict[str, Any]:
    """Give a case with some of the kinds; hammers have the published curve without cores."""
    found = [
        {key: item for key, item in one.items() if key in ("date", *kinds)} for one in surveys()
    ]
    if "cores" not in kinds:
        for key in kinds:
            found[0][key] = {**found[0][key], "curve": "EN 13791"}
    return cases.base(surveys=found)


class Reading(NamedTuple):
    """One reading as its row of the table has it."""

    kind: str
    device: str
    place: str
    value: float  # ln
    error: float  # variance of the reading about what the device shows at the place
    stage: int


def readings() -> list[Reading]:
    """All readings, read from the tables by hand: no code of the tool takes part."""
    found: list[Reading] = []
    devices = {"cores": ("", ""), "rebound": ("N", "M"), "pulse_velocity": ("P", "P")}
    variance = {
        "cores": (np.log1p(0.05**2), np.log1p(0.1**2)),
        "rebound": (np.log1p(0.1**2),) * 2,
        "pulse_velocity": (np.log1p(0.02**2), np.log1p(0.03**2)),
    }
    usual = {"cores": 1.0, "rebound": 9.0, "pulse_velocity": 1.0}
    tables = {
        "cores": (CORES, LATER_CORES),
        "rebound": (REBOUND, LATER_REBOUND),
        "pulse_velocity": (VELOCITY, LATER_VELOCITY),
    }
    for kind, pair in tables.items():
        for survey, text in enumerate(pair):
            head, *lines = text.strip().split("\n")
            scale = 1e-3 if "[m/s]" in head else 1.0
            for number, line in enumerate(lines):
                location, section, value, *more = line.split(",")
                place = location or section or f"{kind} {survey} {number}"
                many = more[0] if kind != "cores" and more else ""
                count = float(many) if many else usual[kind]
                found.append(
                    Reading(
                        kind,
                        devices[kind][survey],
                        place,
                        float(np.log(scale * float(value))),
                        variance[kind][survey] / count,
                        survey + 1,
                    )
                )
    return found


def joint(
    chosen: list[Reading], values: dict[str, float]
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Mean and covariance of readings, their values, and covariances with each local strength."""
    mu, sigma = np.log(values["deck.concrete_mean"]), values["deck.concrete_scatter"]
    slope = np.ones(len(chosen))
    level, departure = np.zeros(len(chosen)), np.zeros(len(chosen))
    for i, one in enumerate(chosen):
        if one.kind != "cores":
            name = f"{one.kind}.{one.device}"
            slope[i] = values[f"{name}.slope"]
            level[i] = np.log(values[f"{name}.level"]) - slope[i] * np.log(30.0)
            departure[i] = values[f"{name}.scatter"] ** 2
    mean = level + slope * mu
    covariance = np.zeros((len(chosen), len(chosen)))
    for i, a in enumerate(chosen):
        for j, b in enumerate(chosen):
            if a.place == b.place:
                covariance[i, j] = slope[i] * slope[j] * sigma**2
                if (a.kind, a.device) == (b.kind, b.device) and a.kind != "cores":
                    covariance[i, j] += departure[i]
        covariance[i, i] += a.error
    return mean, covariance, np.array([one.value for one in chosen]), slope * sigma**2


def at(draw: int) -> dict[str, float]:
    """Give the common variables of one draw."""
    return {name: value[draw] for name, value in VALUES.items()}
