"""Quantities of a case file that are allowed but out of the ordinary: another unit, perhaps."""

from collections.abc import Iterator
from typing import Any, get_args

from pydantic import BaseModel
from pydantic.fields import FieldInfo

from assess import units
from assess.case.quantities import InUnit
from assess.case.yamlfile import Document, Keys
from assess.errors import Fault


def unlikely_quantities(spec: BaseModel, document: Document) -> list[Fault]:
    """Doubt every quantity that is out of its usual range.

    Parameters
    ----------
    spec : BaseModel
        What was read from the file.
    document : Document
        The file, which knows the lines.

    Returns
    -------
    list of Fault
        Doubts, each with its line, and the unit that would explain it where there is one.
    """
    return list(_of_model(spec, (), document))


def _of_model(model: BaseModel, keys: Keys, document: Document) -> Iterator[Fault]:
    for name, info in type(model).model_fields.items():
        if name not in model.model_fields_set:
            continue  # a default of the tool is not the user's to mend
        place = (*keys, info.alias or name)
        value = getattr(model, name)
        quantity = _quantity(info)
        if quantity is None:
            yield from _within(value, place, document)
        elif isinstance(value, float) and quantity.usual is not None:
            low, high = quantity.usual
            if not low <= value <= high:
                yield _doubt(quantity, value, place, document)


def _within(value: Any, keys: Keys, document: Document) -> Iterator[Fault]:
    """Look into a part: a model, or several of them."""
    if isinstance(value, BaseModel):
        yield from _of_model(value, keys, document)
    elif isinstance(value, dict):
        for key, item in value.items():
            yield from _within(item, (*keys, key), document)
    elif isinstance(value, tuple):
        listed = isinstance(_at(document, keys), list)  # one alone may stand without the list
        for index, item in enumerate(value):
            yield from _within(item, (*keys, index) if listed else keys, document)


def _quantity(info: FieldInfo) -> InUnit | None:
    """Find how a field's quantity is read, also where the field may be left out."""
    inner = [part for one in get_args(info.annotation) for part in get_args(one)]
    return next((part for part in (*info.metadata, *inner) if isinstance(part, InUnit)), None)


def _at(document: Document, keys: Keys) -> Any:
    here: Any = document.data
    for key in keys:
        try:
            here = here[key]
        except (KeyError, IndexError, TypeError):
            return None
    return here


def _doubt(quantity: InUnit, value: float, keys: Keys, document: Document) -> Fault:
    written = _at(document, keys)
    low, high = quantity.usual or (value, value)
    unit = "" if quantity.unit == units.NONE else f" {quantity.unit}"
    allowed = (
        f"usually up to {high:g}{unit}" if low <= 0.0 else f"usually {low:g} to {high:g}{unit}"
    )
    mend = "check the value and its unit"
    if not isinstance(written, str):
        known = units.CUSTOMARY.get(units.plain(quantity.unit), ())
        fits = [one for one in known if low <= value * units.factor(one, quantity.unit) <= high]
        if fits == ["%"]:
            mend = f"in percent? write {value / 100.0:g}"
        elif fits:
            mend = f"in {' or '.join(fits)}? write the unit: {written} {fits[0]}"
    what = f"{quantity.name} is out of the usual range"
    return document.fault(keys, what, given=written, allowed=allowed, mend=mend)
