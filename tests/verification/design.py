"""What a simulation-based calibration is told of a kind of evidence."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from assess.updating.kind import Rows

FloatArray = NDArray[np.float64]
Values = Mapping[str, FloatArray]
Spoil = Callable[[Rows, Values], tuple[Rows, Values]]


@dataclass(frozen=True, slots=True)
class Design:
    """What is measured, which variables are ranked, and a fault that must be noticed."""

    kind: str
    surveys: tuple[dict[str, Any], ...]
    tables: Mapping[str, str]
    variables: tuple[str, ...]
    spoil: Spoil
    fault: str
    corrosion: bool = False
    words: str = ""  # after the name of the kind, where it has several designs
    slow: bool = False  # run only where its group is asked for by name
    zone: Mapping[str, Any] = field(default_factory=dict)  # more keys of the zone ``deck``
    case: Mapping[str, Any] = field(default_factory=dict)  # more keys of the case
    before: tuple[str, ...] = ()  # kinds whose readings this one is conditional on, in order


def title(design: Design) -> str:
    """Name a design: its kind, and what sets it apart from others of the kind."""
    return " ".join(filter(None, (design.kind.replace("_", " "), design.words)))


def survey(date: str, kind: str, entry: dict[str, Any]) -> dict[str, Any]:
    """Give a survey that brings one kind of evidence."""
    return {"date": date, kind: entry}
