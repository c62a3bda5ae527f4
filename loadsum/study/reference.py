"""The reference page of the study file, made from the same tables as the loader."""

import dataclasses
import types
import typing
from typing import Any

from loadsum.study.keys import KeyInfo
from loadsum.study.schema import required
from loadsum.study.tables import Study

OPENING = """\
# The study file

A study is described by one TOML file (UTF-8). This page and the schema beside it (study-file.schema.json) are made
from the tables that the program itself checks the file with: `python -m loadsum.study.reference docs` writes both
again.

- Every fault is reported at once, with its dotted key and what to do. An unknown key is a fault; the nearest known key
  is named.
- File names are relative to the folder of the study file.
- A unit is part of a key's name. A key without a default must be given, where its table is given at all.
- Where a table may stand several times it is written `[[name]]`; a single one may be written `[name]`.
- Criteria and allowed loadings are those of your utility. None is ever supplied by the program.

An editor that knows JSON schemas completes and checks the file as you write: name the schema in the first line, as in
`#:schema study-file.schema.json`.

The customer table (`[customers]`, a CSV file or an .xlsx workbook) has the keys of `[[customer]]` as its columns, one
row a customer, in any order. An empty cell takes the default; the parts of a list are separated by `;`; yes and no
stand for true and false; a line that begins with `#` is a remark.
"""

WORDS = {str: "text", bool: "true or false", int: "whole number", float: "number"}


def reference_page() -> str:
    """Markdown of docs/study-file.md."""
    parts = [OPENING]
    hints = typing.get_type_hints(Study)
    for field in dataclasses.fields(Study):
        hint = hints[field.name]
        several = typing.get_origin(hint) is tuple
        kind = typing.get_args(hint)[0] if several else hint
        parts.append(_table(field, kind, several))
    return "\n".join(parts)


def _table(field: "dataclasses.Field[Any]", kind: type, several: bool) -> str:
    info: KeyInfo = field.metadata["key"]
    name = f"[[{field.name}]]" if several else f"[{field.name}]"
    needed = " Needed in every study." if required(field) else ""
    lines = [f"## `{name}`", "", f"{info.doc}{needed}", "", "| key | type | default | meaning |", "|---|---|---|---|"]
    hints = typing.get_type_hints(kind)
    for key in dataclasses.fields(kind):
        lines.append(_row(key, hints[key.name]))
    return "\n".join([*lines, ""])


def _row(field: "dataclasses.Field[Any]", hint: Any) -> str:
    info: KeyInfo = field.metadata["key"]
    several = typing.get_origin(hint) is tuple
    kind = typing.get_args(hint)[0] if several else hint
    if isinstance(kind, types.UnionType):
        kind = next(part for part in typing.get_args(kind) if part is not types.NoneType)
    word = f"list of {WORDS[kind]}" if several else WORDS[kind]
    meaning = [info.doc]
    if info.choices:
        meaning.append(f"One of: {', '.join(info.choices)}.")
    bounds = [
        f"{sign} {bound:g}"
        for sign, bound in (("above", info.above), ("at least", info.at_least), ("at most", info.at_most))
        if bound is not None
    ]
    if bounds:
        meaning.append(f"{', '.join(bounds).capitalize()}.")
    if info.example:
        meaning.append(f"Example: `{info.example}`.")
    default = "**required**" if required(field) else _default(field.default)
    return f"| `{field.name}` | {word} | {default} | {' '.join(meaning).replace('|', '/')} |"


def _default(value: Any) -> str:
    if value in ("", (), None):
        return "none"
    return f"`{str(value).lower() if isinstance(value, bool) else value}`"


if __name__ == "__main__":
    import json
    import sys
    from pathlib import Path

    from loadsum.study.schema import study_schema

    folder = Path(sys.argv[1])
    (folder / "study-file.md").write_text(reference_page(), encoding="utf-8")
    schema = json.dumps(study_schema(), indent=1, ensure_ascii=False) + "\n"
    (folder / "study-file.schema.json").write_text(schema, encoding="utf-8")
