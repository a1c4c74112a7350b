"""Walking through a parsed case file that may have any shape."""

from collections.abc import Callable, Iterator
from typing import Any

from pydantic import ValidationError

from assess.units import QuantityError


def mapping_at(data: Any, *keys: Any) -> dict[Any, Any]:
    """Give the mapping at a place, an empty one where there is none."""
    for key in keys:
        data = data.get(key) if isinstance(data, dict) else None
    return data if isinstance(data, dict) else {}


def items_at(data: Any, key: Any) -> Iterator[tuple[int, dict[Any, Any]]]:
    """Go through the mappings of a list."""
    found = data.get(key) if isinstance(data, dict) else None
    if isinstance(found, list):
        yield from ((i, item) for i, item in enumerate(found) if isinstance(item, dict))


def read_or_none[T](read: Callable[[Any], T], value: Any) -> T | None:
    """Read a value, None where the model will refuse it."""
    try:
        return read(value)
    except (ValidationError, QuantityError):
        return None
