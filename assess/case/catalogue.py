"""Published priors by name, from a data file."""

from collections.abc import Mapping
from functools import cache
from importlib import resources
from types import MappingProxyType
from typing import Any

import yaml

from assess import units
from assess.case.yamlfile import listed, nearest
from assess.units import NONE, QuantityError

_BOOK = ("unit", "place", "seen")  # what an entry says of itself beyond a distribution
_IN_UNIT = ("mean", "sd", "lower", "upper")


@cache
def catalogue() -> Mapping[str, Mapping[str, Any]]:
    """Read the catalogue: entry by name, as in its file."""
    file = resources.files("assess.case") / "data" / "catalogue.yaml"
    return MappingProxyType(yaml.safe_load(file.read_text(encoding="utf-8")))


def from_catalogue(name: object, unit: str) -> dict[str, Any]:
    """Give what the catalogue says of a quantity as a case file would say it.

    Parameters
    ----------
    name : object
        Name of an entry.
    unit : str
        Unit that is wanted; that of the entry must convert to it.

    Returns
    -------
    dict
        Keys of a distribution, its numbers with their unit, and `source` with the place in it.

    Raises
    ------
    QuantityError
        If there is no such entry, or if it is of another quantity.

    Examples
    --------
    >>> from_catalogue("critical chloride content", "-")["mean"]
    '0.6 %'
    """
    entries = catalogue()
    entry = entries.get(name) if isinstance(name, str) else None
    if entry is None:
        what = "the catalogue has no entry of this name"
        raise QuantityError(what, repr(name), listed(fitting(unit)), nearest(name, entries))
    if not _fits(entry["unit"], unit):
        what = f"this entry of the catalogue is in {entry['unit']}"
        wanted = "a pure number" if unit == NONE else f"something in {unit}"
        raise QuantityError(what, repr(name), wanted)
    said = {key: value for key, value in entry.items() if key not in _BOOK}
    for key in _IN_UNIT:
        if key in said:
            said[key] = f"{said[key]} {entry['unit']}" if entry["unit"] != NONE else said[key]
    said["source"] = f"{entry['source']}, {' '.join(entry['place'].split())} ({entry['seen']})"
    return said


def fitting(unit: str) -> list[str]:
    """Name the entries whose unit converts to one."""
    return [name for name, entry in catalogue().items() if _fits(entry["unit"], unit)]


def _fits(unit: str, wanted: str) -> bool:
    try:
        units.factor(unit, wanted)
    except QuantityError:
        return False
    return True
