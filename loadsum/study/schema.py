"""JSON schema of the study file, for editors that complete and check it as it is written."""

import dataclasses
import types
import typing
from typing import Any

from loadsum.study.keys import KeyInfo
from loadsum.study.tables import Study

PLAIN: dict[Any, str] = {str: "string", bool: "boolean", int: "integer", float: "number"}


def study_schema() -> dict[str, Any]:
    """JSON schema (2020-12) of the study file, made from the same tables as the loader.

    Notes
    -----
    What must hold between keys (months in two seasons, a season that does not exist) only the loader knows.
    """
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "loadsum study file",
        **_table(Study),
    }


def _table(kind: type) -> dict[str, Any]:
    hints = typing.get_type_hints(kind)
    fields = dataclasses.fields(kind)
    return {
        "type": "object",
        "properties": {field.name: _key(hints[field.name], field) for field in fields},
        "required": [field.name for field in fields if required(field)],
        "additionalProperties": False,
    }


def required(field: "dataclasses.Field[Any]") -> bool:
    """Whether a key must be given."""
    return field.default is dataclasses.MISSING and field.default_factory is dataclasses.MISSING


def _key(kind: Any, field: "dataclasses.Field[Any]") -> dict[str, Any]:
    info: KeyInfo = field.metadata["key"]
    schema: dict[str, Any] = {"description": info.doc, **_type(kind, info)}
    default = field.default
    if default is not dataclasses.MISSING and default is not None and not isinstance(default, tuple):
        schema["default"] = default
    return schema


def _type(kind: Any, info: KeyInfo) -> dict[str, Any]:
    if dataclasses.is_dataclass(kind) and isinstance(kind, type):
        return _table(kind)
    if typing.get_origin(kind) is tuple:
        member = typing.get_args(kind)[0]
        items = _type(member, info)
        if dataclasses.is_dataclass(member):
            return {"anyOf": [items, {"type": "array", "items": items}]}
        return {"type": "array", "items": items}
    if isinstance(kind, types.UnionType):
        kind = next(part for part in typing.get_args(kind) if part is not types.NoneType)
    if info.choices:
        choices: list[str | int | float] = [kind(choice) for choice in info.choices]
        return {"enum": [*choices, ""] if info.blank else choices}
    schema: dict[str, Any] = {"type": PLAIN[kind]}
    if kind in (int, float):
        bounds = {"exclusiveMinimum": info.above, "minimum": info.at_least, "maximum": info.at_most}
        schema |= {name: bound for name, bound in bounds.items() if bound is not None}
    return schema
