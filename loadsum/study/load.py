"""Study file (TOML) to a checked Study; every fault at once, with its dotted key and what to do."""

import dataclasses
import difflib
import tomllib
import types
import typing
from pathlib import Path
from typing import Any

from loadsum.errors import Fault, InputError
from loadsum.study.checks import check_study
from loadsum.study.keys import KeyInfo
from loadsum.study.tables import Study

WORDS = {str: "text", bool: "true or false", int: "a whole number", float: "a number"}


def load_study(path: Path) -> Study:
    """The study that a file describes.

    Raises
    ------
    InputError
        The file cannot be read, or holds faults; all of them are reported together.
    """
    try:
        tree = tomllib.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(path.name, [Fault(path.name, f"cannot be read: {error.strerror}")]) from error
    except UnicodeDecodeError as error:
        raise InputError(
            path.name, [Fault(path.name, f"is not UTF-8 text: {error.reason} at byte {error.start}")]
        ) from error
    except tomllib.TOMLDecodeError as error:
        raise InputError(path.name, [Fault(path.name, f"is not TOML: {error}")]) from error
    return study_from(tree, path.name)


def study_from(tree: dict[str, Any], source: str) -> Study:
    """The study that a tree of TOML values describes."""
    faults: list[Fault] = []
    study = _table(Study, tree, "", faults)
    if study is not None:
        faults.extend(check_study(study))
    if faults or study is None:
        raise InputError(source, faults)
    return typing.cast(Study, study)


def _table(kind: type, tree: Any, where: str, faults: list[Fault]) -> Any:
    """One table of the file as its dataclass; None where a fault keeps it from being made."""
    if not isinstance(tree, dict):
        faults.append(Fault(where, f"must be a table, got {_shown(tree)}"))
        return None
    fields = {field.name: field for field in dataclasses.fields(kind)}
    hints = typing.get_type_hints(kind)
    before = len(faults)
    for name in tree:
        if name not in fields:
            near = difflib.get_close_matches(name, fields, n=1, cutoff=0.6)
            advice = f"did you mean {near[0]!r}?" if near else f"known keys: {', '.join(sorted(fields))}"
            faults.append(Fault(_join(where, name), f"unknown key; {advice}"))
    values: dict[str, Any] = {}
    for name, field in fields.items():
        info: KeyInfo = field.metadata["key"]
        if name in tree:
            values[name] = _value(hints[name], tree[name], _join(where, name), info, faults)
        elif field.default is dataclasses.MISSING and field.default_factory is dataclasses.MISSING:
            faults.append(Fault(_join(where, name), f"missing; {info.advice}" if info.advice else "missing"))
    if len(faults) > before:
        return None
    return kind(**values)


def _value(kind: Any, value: Any, where: str, info: KeyInfo, faults: list[Fault]) -> Any:
    """One value, checked against its type, choices and bounds."""
    if dataclasses.is_dataclass(kind) and isinstance(kind, type):
        return _table(kind, value, where, faults)
    if typing.get_origin(kind) is tuple:
        (member, _) = typing.get_args(kind)
        if dataclasses.is_dataclass(member) and isinstance(value, dict):
            value = [value]  # one table where several may stand
        if not isinstance(value, list):
            faults.append(Fault(where, f"must be a list, got {_shown(value)}"))
            return ()
        return tuple(_value(member, item, f"{where}[{n}]", info, faults) for n, item in enumerate(value, start=1))
    if isinstance(kind, types.UnionType):
        kind = next(part for part in typing.get_args(kind) if part is not types.NoneType)
    if kind is float and isinstance(value, int) and not isinstance(value, bool):
        value = float(value)
    if type(value) is not kind:
        faults.append(Fault(where, f"must be {WORDS[kind]}, got {_shown(value)}"))
        return value
    if info.choices and str(value) not in info.choices:
        faults.append(Fault(where, f"must be one of {', '.join(info.choices)}; got {_shown(value)}"))
    if isinstance(value, int | float) and not isinstance(value, bool):
        _bounds(value, where, info, faults)
    return value


def _bounds(value: float, where: str, info: KeyInfo, faults: list[Fault]) -> None:
    if value != value or value in (float("inf"), float("-inf")):
        faults.append(Fault(where, f"must be a finite number, got {value}"))
    elif info.above is not None and not value > info.above:
        faults.append(Fault(where, f"must be greater than {info.above:g}, got {value:g}"))
    elif info.at_least is not None and value < info.at_least:
        faults.append(Fault(where, f"must be at least {info.at_least:g}, got {value:g}"))
    elif info.at_most is not None and value > info.at_most:
        faults.append(Fault(where, f"must be at most {info.at_most:g}, got {value:g}"))


def _join(where: str, name: str) -> str:
    return f"{where}.{name}" if where else name


def _shown(value: Any) -> str:
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "..."
