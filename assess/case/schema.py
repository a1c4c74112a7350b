"""The case format for the kinds that exist, and its JSON Schema for editors."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import reduce
from operator import or_
from typing import Annotated, Any

from pydantic import BaseModel, BeforeValidator, Field, GetJsonSchemaHandler, create_model
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema

from assess.case.forms import OptionEntry, SectionEntry, Vocabulary
from assess.case.spec import CaseSpec, Decision, Member, Survey
from assess.case.yamlfile import Document, Keys

DIALECT = "https://json-schema.org/draft/2020-12/schema"


@dataclass(frozen=True, slots=True)
class _OneOrSeveral:
    """Tell editors that a list of one may be written without the list."""

    def __get_pydantic_json_schema__(
        self, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        several = handler(schema)
        return {"anyOf": [several["items"], several]}


def _as_list(value: object) -> object:
    return [value] if isinstance(value, dict) else value


def case_model(vocabulary: Vocabulary) -> type[CaseSpec]:
    """Build the model of a case file for the kinds that exist.

    Parameters
    ----------
    vocabulary : Vocabulary
        Kinds of evidence, limit state and option.

    Returns
    -------
    type of CaseSpec
        Closed to unknown keys; sections and options are told apart by `limit_state` and `kind`.
    """
    evidence: dict[str, Any] = {
        key: (
            Annotated[_several(form.entry), BeforeValidator(_as_list), _OneOrSeveral()],
            Field((), description=form.title),
        )
        for key, form in vocabulary.evidence.items()
    }
    survey = create_model("Survey", __base__=Survey, __doc__=Survey.__doc__, **evidence)
    sections = [form.entry for form in vocabulary.limit_states.values()]
    one_section = _told_apart(sections, "limit_state", SectionEntry)
    member = _narrowed(Member, "sections", _several(one_section))
    member.also_known = frozenset(section_keys(vocabulary)) - {"name"}
    options = [form.entry for form in vocabulary.options.values()]
    one_option = _told_apart(options, "kind", OptionEntry)
    decision = _narrowed(Decision, "options", _several(one_option))
    return create_model(
        "Case",
        __base__=CaseSpec,
        __doc__=CaseSpec.__doc__,
        surveys=(_several(survey), CaseSpec.model_fields["surveys"]),
        members=(_several(member), CaseSpec.model_fields["members"]),
        decision=(decision, CaseSpec.model_fields["decision"]),
    )


def _narrowed[M: BaseModel](model: type[M], name: str, annotation: Any) -> type[M]:
    """Derive a model whose one field has a narrower type."""
    fields: dict[str, Any] = {name: (annotation, model.model_fields[name])}
    return create_model(model.__name__, __base__=model, __doc__=model.__doc__, **fields)


def _several(entry: Any) -> Any:
    return tuple[entry, ...]


def _told_apart(entries: Sequence[type[BaseModel]], key: str, base: type[BaseModel]) -> Any:
    """Make a union that is told apart by a key; pydantic wants at least two for one."""
    if len(entries) < 2:
        return entries[0] if entries else base
    return Annotated[reduce(or_, entries), Field(discriminator=key)]


def _keys_of(model: type[BaseModel]) -> set[str]:
    return {str(info.alias or name) for name, info in model.model_fields.items()}


def section_keys(vocabulary: Vocabulary, limit_state: object = None) -> set[str]:
    """Name the keys that a section may say.

    Parameters
    ----------
    vocabulary : Vocabulary
        Kinds that exist.
    limit_state : object, optional
        One limit state; those of all if it is none of the vocabulary's.

    Returns
    -------
    set of str
        Keys as written in a case file.
    """
    form = vocabulary.limit_states.get(limit_state) if isinstance(limit_state, str) else None
    forms = [form] if form else list(vocabulary.limit_states.values())
    return set().union(_keys_of(SectionEntry), *(_keys_of(form.entry) for form in forms))


def spread_defaults(document: Document, vocabulary: Vocabulary) -> Document:
    """Hand the section keys said at a member down to its sections.

    Parameters
    ----------
    document : Document
        As read.
    vocabulary : Vocabulary
        Kinds that exist: a key goes to those sections whose limit state knows it.

    Returns
    -------
    Document
        With the keys handed down, and a note where each stands in the file. Keys that no
        section of the member knows are left, to be refused by name.
    """
    members = document.data.get("members")
    if not isinstance(members, list):
        return document
    moved: dict[Keys, Keys] = {}
    spread = [
        _spread(member, ("members", index), vocabulary, moved)
        if isinstance(member, dict) and isinstance(member.get("sections"), list)
        else member
        for index, member in enumerate(members)
    ]
    data = {**document.data, "members": spread}
    return replace(document, data=data, moved=moved)


def _spread(
    member: dict[Any, Any], keys: Keys, vocabulary: Vocabulary, moved: dict[Keys, Keys]
) -> dict[Any, Any]:
    defaults = {k: v for k, v in member.items() if k not in Member.model_fields}
    sections, used = [], set()
    for index, section in enumerate(member["sections"]):
        if isinstance(section, dict):
            state = section.get("limit_state", defaults.get("limit_state"))
            known = section_keys(vocabulary, state) & set(defaults)
            fresh = {k: v for k, v in defaults.items() if k in known and k not in section}
            moved |= {(*keys, "sections", index, k): (*keys, k) for k in fresh}
            used |= known
            section = {**section, **fresh}
        sections.append(section)
    return {k: v for k, v in member.items() if k not in used} | {"sections": sections}


def json_schema(vocabulary: Vocabulary) -> dict[str, Any]:
    """Write the case format as a JSON Schema, for editors.

    Parameters
    ----------
    vocabulary : Vocabulary
        Kinds that exist.

    Returns
    -------
    dict
        JSON Schema, draft 2020-12. Quantities may be text or numbers; what rests on names
        (zones, sections) is checked at reading only.
    """
    schema = case_model(vocabulary).model_json_schema(by_alias=True)
    definitions: dict[str, Any] = schema.get("$defs", {})
    definitions["GradedConcrete"]["properties"]["grade"]["enum"] = list(vocabulary.concrete_grades)
    _allow_defaults(definitions, vocabulary)
    _say_units(schema)
    return {"$schema": DIALECT, **schema}


def _allow_defaults(definitions: dict[str, Any], vocabulary: Vocabulary) -> None:
    """Let section keys stand at the member, and hence be missing at the section."""
    member = definitions["Member"]["properties"]
    names = [form.entry.__name__ for form in vocabulary.limit_states.values()]
    for name in names:
        for key, value in definitions[name]["properties"].items():
            if key not in Member.model_fields:
                choices = member.setdefault(key, {"anyOf": []})["anyOf"]
                if value not in choices:
                    choices.append(value)
        definitions[name]["required"] = ["name"]
    # Without its limit state (said at the member) a section may fit several: anyOf, not oneOf.
    member["sections"]["items"] = {"anyOf": [{"$ref": f"#/$defs/{name}"} for name in names]}


def _say_units(node: Any) -> None:
    """Put the unit of each quantity into its description, where editors show it."""
    if isinstance(node, list):
        for item in node:
            _say_units(item)
    elif isinstance(node, dict):
        said = str(node.get("description", ""))
        choices = [one for one in node.get("anyOf", ()) if isinstance(one, dict)]
        units = [one["x-unit"] for one in (node, *choices) if "x-unit" in one]
        if units and f"[{units[0]}]" not in said and not said.endswith("]"):
            node["description"] = f"{said} [{units[0]}]".strip()
        for value in node.values():
            _say_units(value)
        node.pop("x-unit", None)
