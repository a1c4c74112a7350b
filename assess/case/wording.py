"""The model's complaints as faults, in words for engineers."""

from collections import defaultdict
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from pydantic import BaseModel, ValidationError

from assess.case.yamlfile import Document, Keys, closest, listed, nearest
from assess.errors import Fault
from assess.units import QuantityError

_KEY = "[key]"  # pydantic's mark that a key, not its value, is meant
_MAPPING = "a mapping of keys"
_TEXT = "text"
_WHOLE = "a whole number"
_NUMBER = "a number"
_TRUTH = "true or false"
_LIST = "a list"

# Error types that say only what sort of value was wanted.
_WANTED = {
    "string_type": _TEXT,
    "path_type": "the path of a file",
    "int_type": _WHOLE,
    "int_parsing": _WHOLE,
    "int_from_float": _WHOLE,
    "int_parsing_size": _WHOLE,
    "float_type": _NUMBER,
    "float_parsing": _NUMBER,
    "finite_number": "a finite number",
    "bool_type": _TRUTH,
    "bool_parsing": _TRUTH,
    "model_type": _MAPPING,
    "model_attributes_type": _MAPPING,
    "dict_type": _MAPPING,
    "mapping_type": _MAPPING,
    "list_type": _LIST,
    "tuple_type": _LIST,
}
# Error types that compare with a bound.
_BOUNDS = {
    "greater_than": ("more than", "gt"),
    "greater_than_equal": ("at least", "ge"),
    "less_than": ("less than", "lt"),
    "less_than_equal": ("at most", "le"),
}


@dataclass(frozen=True, slots=True)
class _Error:
    """One complaint with its place found in the file's own terms."""

    document: Document
    keys: Keys
    tagged: bool  # the last word of its place is a branch of a union, not a key
    kind: str
    message: str
    value: Any
    context: Mapping[str, Any]
    model: type[BaseModel] | None  # that the mapping around it was read as

    def fault(
        self, what: str, *, given: object = "", allowed: str = "", mend: str = "", up: int = 0
    ) -> Fault:
        keys = self.keys[: len(self.keys) - up]
        return self.document.fault(keys, what, given=given, allowed=allowed, mend=mend)


def faults_of(
    error: ValidationError, document: Document, models: Mapping[int, type[BaseModel]]
) -> list[Fault]:
    """Say each complaint of the model with its line, in plain words.

    Parameters
    ----------
    error : ValidationError
        What the model complains of.
    document : Document
        What it was given.
    models : mapping
        Model that each mapping was read as, by the mapping's ``id``.

    Returns
    -------
    list of Fault
        Sorted, without repetition.
    """
    found = [_placed(item, document, models) for item in error.errors(include_url=False)]
    misspelt = {place for one in found if one.kind == "extra_forbidden" for place in _meant(one)}
    places: dict[tuple[Keys, bool], list[_Error]] = defaultdict(list)
    for one in found:
        if not _follows(one, misspelt):
            places[one.keys, one.tagged].append(one)
    faults: set[Fault] = set()
    for (_, tagged), errors in places.items():
        said = [_WORDS.get(one.kind, _otherwise)(one) for one in errors]
        faults.update(_either(errors, said) if tagged and len(errors) > 1 else said)
    return sorted(faults)


def _placed(item: Any, document: Document, models: Mapping[int, type[BaseModel]]) -> _Error:
    """Find where in the file a complaint belongs; branches of unions are no keys."""
    here: Any = document.data
    around: Any = None
    keys: list[Any] = []
    tagged = False
    location = [part for part in item["loc"] if part != _KEY]
    for position, part in enumerate(location):
        tagged = False
        match = _match(here, part)
        if match is not None:
            keys.append(match[0])
            around, here = here, match[1]
        elif item["type"] == "missing" and position == len(location) - 1:
            keys.append(part)
            around = here
        else:
            tagged = True
    return _Error(
        document,
        tuple(keys),
        tagged,
        item["type"],
        item["msg"],
        item["input"],
        item.get("ctx", {}),
        models.get(id(around)),
    )


def _match(here: Any, part: Any) -> tuple[Any, Any] | None:
    """Find a part of pydantic's location among the keys or items at a place."""
    if isinstance(here, list) and isinstance(part, int) and part < len(here):
        return part, here[part]
    if isinstance(here, dict):
        if part in here:
            return part, here[part]
        for key in here:  # pydantic turns numeric keys into text
            if str(key) == str(part) and not isinstance(part, int):
                return key, here[key]
    return None


def _follows(error: _Error, misspelt: set[Keys]) -> bool:
    """Tell whether an error says no more than another one does."""
    if error.kind == "missing":
        return error.keys in misspelt or (*error.keys[:2], error.keys[-1]) in misspelt
    # A list counts as short for pydantic where its items have faults of their own.
    few = error.kind == "too_short" and isinstance(error.value, list | dict)
    return few and len(error.value) >= int(error.context["min_length"])


def _meant(error: _Error) -> list[Keys]:
    """Give the place of the key that an unknown one was probably meant as."""
    word = closest(error.keys[-1], _known_keys(error))
    return [(*error.keys[:-1], word)] if word else []


def _known_keys(error: _Error) -> list[str]:
    if error.model is None:
        return []
    own = [str(f.alias or name) for name, f in error.model.model_fields.items()]
    return own + sorted(getattr(error.model, "also_known", ()))


def _either(errors: list[_Error], said: list[Fault]) -> list[Fault]:
    """Make one fault of a value that fits no branch of a union."""
    allowed = dict.fromkeys(fault.allowed or fault.what for fault in said)
    first = errors[0]
    return [
        first.fault(
            "fits none of what it may be", given=short(first.value), allowed=" or ".join(allowed)
        )
    ]


def short(value: object) -> str:
    """Show a value of the file in a message, cut where it is long."""
    if isinstance(value, dict):
        return f"a mapping with {listed(value)}"[:80]
    if isinstance(value, list | tuple):
        return f"a list of {len(value)}"
    if value is None:
        return "nothing"
    text = str(value).lower() if isinstance(value, bool) else str(value)
    return text if len(text) <= 60 else text[:57] + "..."


def _description(error: _Error) -> str:
    if error.model is None or not error.keys:
        return ""
    for name, info in error.model.model_fields.items():
        if error.keys[-1] in (name, info.alias):
            return info.description or ""
    return ""


def _missing(error: _Error) -> Fault:
    about = _description(error)
    mend = f"add {error.keys[-1]}: ({about})" if about else f"add {error.keys[-1]}:"
    return error.fault("this key is missing", mend=mend)


def _unknown(error: _Error) -> Fault:
    known = _known_keys(error)
    mend = _cut_at_a_comma(error) or nearest(error.keys[-1], known)
    return error.fault("unknown key", allowed=listed(known), mend=mend)


def _cut_at_a_comma(error: _Error) -> str:
    """Tell a word between braces that has no colon: it belongs to the value before the comma."""
    if error.document.origin(error.keys) not in error.document.bare:
        return ""
    here: Any = error.document.data
    for key in error.keys[:-1]:
        here = here[key]
    keys = list(here)
    place = keys.index(error.keys[-1])
    before = keys[place - 1] if place else None
    said = here.get(before)
    if isinstance(said, int | float) and isinstance(error.keys[-1], int):
        return f"a decimal comma? write the number after {before}: with a point"
    if isinstance(said, str):
        return f'a text with a comma needs quotes: {before}: "{said}, {error.keys[-1]}"'
    return "a text with a comma needs quotes; a key needs a colon and a value"


def _wanted(error: _Error) -> Fault:
    wanted = _WANTED[error.kind]
    if error.value is None:
        return error.fault("has no value", allowed=wanted, mend=_description(error))
    mend = ""
    if wanted == _TEXT and isinstance(error.value, int | float):
        mend = "put it in quotes"
    if wanted == _LIST:
        mend = "begin each item with '- '"
    return error.fault(f"must be {wanted}", given=short(error.value), mend=mend)


def _bound(error: _Error) -> Fault:
    words, name = _BOUNDS[error.kind]
    allowed = f"{words} {error.context[name]:g}"
    return error.fault("is out of range", given=short(error.value), allowed=allowed)


def _choice(error: _Error) -> Fault:
    allowed = str(error.context.get("expected", "")).replace("'", "").replace(" or ", ", ")
    if allowed == "True":  # the only literal of the format that is no text
        allowed = "true"
    mend = nearest(error.value, allowed.split(", "))
    return error.fault("no such choice", given=short(error.value), allowed=allowed, mend=mend)


def _kind(error: _Error) -> Fault:
    key = str(error.context["discriminator"]).strip("'")
    allowed = str(error.context["expected_tags"]).replace("'", "")
    given = str(error.context["tag"])
    mend = nearest(given, allowed.split(", "))
    what = f"there is no such {key.replace('_', ' ')}"
    return error.document.fault((*error.keys, key), what, given=given, allowed=allowed, mend=mend)


def _no_kind(error: _Error) -> Fault:
    key = str(error.context["discriminator"]).strip("'")
    return error.document.fault((*error.keys, key), "this key is missing", mend=f"add {key}:")


def _form(error: _Error) -> Fault:
    allowed = str(error.context["keys"])
    if not isinstance(error.value, dict):
        what = f"must be {_MAPPING}"
    else:
        what = "exactly one way of saying it is wanted"
    return error.fault(what, given=short(error.value), allowed=allowed)


def _refused(error: _Error) -> Fault:
    cause = error.context.get("error")
    if isinstance(cause, QuantityError):
        return error.fault(cause.what, given=cause.given, allowed=cause.allowed, mend=cause.mend)
    return error.fault(str(cause))


def _length(error: _Error) -> Fault:
    if error.kind == "string_too_short":
        return error.fault("must not be empty", mend=_description(error))
    bound = error.context.get("min_length", error.context.get("max_length"))
    words = "at least" if error.kind == "too_short" else "at most"
    return error.fault(f"needs {words} {bound}", given=str(error.context.get("actual_length", "")))


def _otherwise(error: _Error) -> Fault:
    message = error.message.removeprefix("Input should be ").removeprefix("Value error, ")
    return error.fault(f"cannot be used ({message})", given=short(error.value))


_WORDS: dict[str, Callable[[_Error], Fault]] = {
    "missing": _missing,
    "extra_forbidden": _unknown,
    "invalid_key": _unknown,
    "literal_error": _choice,
    "union_tag_invalid": _kind,
    "union_tag_not_found": _no_kind,
    "one_form": _form,
    "value_error": _refused,
    "string_too_short": _length,
    "too_short": _length,
    "too_long": _length,
    **dict.fromkeys(_WANTED, _wanted),
    **dict.fromkeys(_BOUNDS, _bound),
}
