"""Small cases for tests and verification, written as files and read through the front door."""

import copy
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import yaml

from assess.case.reader import Case, load_case
from assess.vocabulary import vocabulary

NO_TABLES: Mapping[str, str] = {}

COVER = {
    "mean": {"distribution": "normal", "mean": "40 mm", "sd": "5 mm", "source": "test"},
    "scatter": {"distribution": "lognormal", "mean": "8 mm", "V": 0.3, "source": "test"},
}
CORROSION = {
    "onset": {"distribution": "lognormal", "mean": "35 yr", "V": 0.5, "source": "test"},
    "onset_scatter": {"distribution": "lognormal", "mean": 0.3, "V": 0.4, "source": "test"},
    "current": {"distribution": "lognormal", "mean": 3, "V": 0.8, "source": "test"},
    "current_scatter": {"distribution": "lognormal", "mean": 0.5, "V": 0.4, "source": "test"},
    "attack": "pitting",
}
GRADED = {"grade": "C35", "production": "ready-mixed", "source": "test"}
METER_A = {"name": "A", "bias": "2 mm", "scatter": "3 mm"}
METER_B = {"name": "B", "bias": "3 mm", "scatter": "4 mm"}


def write_case(
    folder: Path, case: Mapping[str, Any], tables: Mapping[str, str] = NO_TABLES
) -> Path:
    """Write a case file and its tables into a folder; give the path of the case file."""
    folder.mkdir(parents=True, exist_ok=True)
    for name, text in tables.items():
        (folder / name).write_text(text, encoding="utf-8")
    path = folder / "case.yaml"
    path.write_text(yaml.safe_dump(dict(case), sort_keys=False), encoding="utf-8")
    return path


def read(folder: Path, case: Mapping[str, Any], tables: Mapping[str, str] = NO_TABLES) -> Case:
    """Write a case and read it back; its faults are an error."""
    return load_case(write_case(folder, case, tables), vocabulary())


def base(
    *, concrete: Mapping[str, Any] = GRADED, corrosion: bool = False, surveys: Any = ()
) -> dict[str, Any]:
    """Give a structure of one zone, ``deck``, with one member and two sections."""
    zone: dict[str, Any] = {"concrete": dict(concrete), "cover": COVER}
    if corrosion:
        zone["corrosion"] = CORROSION
    return copy.deepcopy(
        {
            "structure": {"name": "Test", "built": 1971, "assessed": 2026, "horizon": 10},
            "zones": {"deck": zone},
            "steel": {"main": {"mean": "460 MPa", "sd": "29 MPa", "source": "test"}},
            "surveys": list(surveys),
            "members": [
                {
                    "name": "G1",
                    "zone": "deck",
                    "limit_state": "bending",
                    "depth": "1000 mm",
                    "width": "320 mm",
                    "flange": {"width": "1800 mm", "thickness": "180 mm"},
                    "link_diameter": "10 mm",
                    "bars": {"count": 7, "diameter": "32 mm", "steel": "main"},
                    "loads": {
                        "permanent": [{"name": "self weight", "effect": "450 kN*m", "V": 0.05}],
                        "variable": {
                            "name": "traffic",
                            "annual_maximum": {"mean": "250 kN*m", "V": 0.12},
                        },
                    },
                    "sections": [{"name": "S1"}, {"name": "S2"}],
                }
            ],
            "decision": {"target": {"set": "EN 1990", "class": "RC2", "period": 1}},
        }
    )


CORES_TABLE = """location;section;strength [MPa];diameter [mm];length [mm];moisture
K1;;31.6;94;141;as received
K2;;40.6;94;188;as received
K3;;37.2;94;94;as received
K3;;35.0;94;94;soaked
K4;;39.1;75;150;as received
K5;;33.0;50;75;air dried
;S1;36.5;94;188;as received
;S1;34.2;94;141;as received
"""
COVER_TABLE = """section,location,cover [mm]
S1,,43
S1,,39
,R1,36
,R1,34
,,51
,,32
,,47
,,28
,,37
,,>60
,,44
"""
LOSS_TABLE = """section,location,original diameter [mm],residual diameter [mm]
S1,,32,31.2
,B1,32,none
,B2,32,29.6
,B3,32,none
"""
LATER_COVER_TABLE = """section,location,cover [mm]
S1,,45
,R1,38
,,41
,,33
,,>55
"""
LATER_LOSS_TABLE = """section,location,original diameter [mm],residual diameter [mm]
S1,,32,30.4
,B1,32,31.0
,B3,32,none
,B4,32,30.2
"""
EXAMPLE_TABLES = {
    "cores.csv": CORES_TABLE,
    "cover.csv": COVER_TABLE,
    "loss.csv": LOSS_TABLE,
    "cover2.csv": LATER_COVER_TABLE,
    "loss2.csv": LATER_LOSS_TABLE,
}


def loss_entry(table: str, limit: str = "0.1 mm") -> dict[str, Any]:
    """Give a survey's entry of break-outs in the deck."""
    return {"table": table, "zone": "deck", "detection_limit": limit, "error": 0.15}


def example() -> dict[str, Any]:
    """Give a case with every kind of evidence in two surveys, and dependence in the prior."""
    surveys = [
        {
            "date": "2010-06-01",
            "name": "first",
            "cores": {"table": "cores.csv", "zone": "deck"},
            "cover": {"table": "cover.csv", "zone": "deck", "meter": METER_A},
            "section_loss": loss_entry("loss.csv"),
        },
        {
            "date": "2020-06-01",
            "name": "second",
            "cover": {"table": "cover2.csv", "zone": "deck", "meter": METER_B},
            "section_loss": loss_entry("loss2.csv", "0.2 mm"),
        },
    ]
    case = base(corrosion=True, surveys=surveys)
    case["dependence"] = [
        {"between": ["deck.onset", "deck.cover_mean"], "spearman": 0.6, "source": "test"},
        {"between": ["deck.onset", "deck.current"], "kendall": -0.3, "source": "test"},
    ]
    return case
