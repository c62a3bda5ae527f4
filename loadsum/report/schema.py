"""JSON schema of results.json, made from the result types themselves."""

import collections.abc
import dataclasses
import json
import sys
import types
import typing
from enum import Enum
from pathlib import Path
from typing import Any

import numpy as np

from loadsum.report.results import SCHEMA_VERSION, StudyResults


def results_schema() -> dict[str, Any]:
    """JSON schema (2020-12) that every results.json of this version satisfies."""
    definitions: dict[str, Any] = {}
    body = _schema_of(StudyResults, definitions)
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": f"loadsum results, version {SCHEMA_VERSION}",
        **body,
        "$defs": dict(sorted(definitions.items())),
    }


def _schema_of(kind: Any, definitions: dict[str, Any]) -> dict[str, Any]:
    """Schema of one type; dataclasses are collected under their names."""
    origin, arguments = typing.get_origin(kind), typing.get_args(kind)
    if kind is Any:
        return {}
    if dataclasses.is_dataclass(kind) and isinstance(kind, type):
        return _object_of(kind, definitions)
    if origin is np.ndarray:
        return {"type": "array"}
    if origin is tuple and Ellipsis not in arguments:
        return {"type": "array", "prefixItems": [_schema_of(part, definitions) for part in arguments]}
    if origin in (tuple, list, frozenset, set, collections.abc.Sequence):
        return {"type": "array", "items": _schema_of(arguments[0], definitions) if arguments else {}}
    if origin in (dict, collections.abc.Mapping):
        return {"type": "object", "additionalProperties": _schema_of(arguments[1], definitions)}
    if origin is typing.Literal:
        return {"enum": list(arguments)}
    if origin in (types.UnionType, typing.Union):
        return {"anyOf": [_schema_of(part, definitions) for part in arguments]}
    if isinstance(kind, type) and issubclass(kind, Enum):
        return {"enum": [member.value for member in kind]}
    plain: dict[Any, str | list[str]] = {
        bool: "boolean",
        int: "integer",
        float: ["number", "null"],
        str: "string",
        types.NoneType: "null",
    }
    if kind in plain:
        return {"type": plain[kind]}
    raise TypeError(f"results.json cannot describe {kind!r}")


def _object_of(kind: type, definitions: dict[str, Any]) -> dict[str, Any]:
    name = kind.__name__
    if name not in definitions:
        definitions[name] = {}  # stands while its own fields are walked
        hints = typing.get_type_hints(kind)
        names = [field.name for field in dataclasses.fields(kind)]
        definitions[name] = {
            "type": "object",
            "description": (kind.__doc__ or "").strip().split("\n")[0],
            "properties": {field: _schema_of(hints[field], definitions) for field in names},
            "required": names,
            "additionalProperties": False,
        }
    return {"$ref": f"#/$defs/{name}"}


def main() -> None:
    """Write the schema into the folder given."""
    text = json.dumps(results_schema(), indent=1, sort_keys=True, ensure_ascii=False) + "\n"
    (Path(sys.argv[1]) / "results.schema.json").write_text(text, encoding="utf-8")


if __name__ == "__main__":
    main()
