"""Study file (TOML) to a checked Study; every fault at once, with its dotted key and what to do."""

import dataclasses
import datetime as dt
import difflib
import tomllib
import types
import typing
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from loadsum.errors import Fault, InputError
from loadsum.study.checks import check_files, check_study
from loadsum.study.customertable import with_customer_table
from loadsum.study.keys import KeyInfo
from loadsum.study.overrides import with_overrides
from loadsum.study.tables import Study
from loadsum.study.values import WORDS, shown, value_faults


def load_study(path: Path, overrides: Sequence[str] = ()) -> Study:
    """The study that a file describes, with the rows of its customer table.

    Parameters
    ----------
    path : Path
        Study file.
    overrides : sequence of str
        ``key=value`` each: values that stand for those of the file.

    Raises
    ------
    InputError
        The file cannot be read, or it or its customer table holds faults; all of them are reported together.
    """
    return study_from(with_overrides(read_tree(path), overrides), path.name, path.parent)


def read_tree(path: Path) -> dict[str, Any]:
    """The TOML values of a study file, unchecked.

    Raises
    ------
    InputError
        The file cannot be read or is not TOML.
    """
    try:
        return tomllib.loads(path.read_text(encoding="utf-8-sig"))
    except OSError as error:
        raise InputError(path.name, [Fault(path.name, f"cannot be read: {error.strerror}")]) from error
    except UnicodeDecodeError as error:
        raise InputError(
            path.name, [Fault(path.name, f"is not UTF-8 text: {error.reason} at byte {error.start}")]
        ) from error
    except tomllib.TOMLDecodeError as error:
        raise InputError(path.name, [Fault(path.name, f"is not TOML: {error}")]) from error


def study_from(tree: dict[str, Any], source: str, folder: Path | None = None) -> Study:
    """The study that a tree of TOML values describes.

    Parameters
    ----------
    tree : dict
        Values as read from TOML.
    source : str
        Name of the file, for messages.
    folder : Path or None
        Folder of the study file; where given, the files that the study names must be there.

    Raises
    ------
    InputError
        All faults together.
    """
    faults: list[Fault] = []
    study = typing.cast(Study, _table(Study, tree, "", faults))
    if folder is not None:
        study, found = with_customer_table(study, folder)
        faults.extend(found)
        faults.extend(_new(check_files(study, folder), faults))
    faults.extend(_new(check_study(study), faults))
    if faults:
        raise InputError(source, faults)
    return study


def _new(found: list[Fault], known: list[Fault]) -> list[Fault]:
    """Faults between keys that are not the mere consequence of a fault already found in one of those keys."""
    places = [fault.where for fault in known]
    return [fault for fault in found if not any(_touches(fault.where, place) for place in places)]


def _touches(a: str, b: str) -> bool:
    return a == b or a.startswith((f"{b}.", f"{b}[")) or b.startswith((f"{a}.", f"{a}["))


def _table(kind: type, tree: Any, where: str, faults: list[Fault]) -> Any:
    """One table of the file as its dataclass; a faulty key is reported and stands in with a neutral value."""
    if not isinstance(tree, dict):
        faults.append(Fault(where, f"must be a table, got {shown(tree)}"))
        tree = {}
        where = ""  # its keys are not reported one by one
        faults = []
    fields = {field.name: field for field in dataclasses.fields(kind)}
    hints = typing.get_type_hints(kind)
    meant = set()
    for name in tree:
        if name not in fields:
            near = difflib.get_close_matches(name, fields, n=1, cutoff=0.6)
            meant.update(near)
            given = ", which is given already" if near and near[0] in tree else ""
            advice = f"did you mean {near[0]}{given}?" if near else _elsewhere(name, fields)
            faults.append(Fault(_join(where, name), f"unknown key; {advice}"))
    values: dict[str, Any] = {}
    for name, field in fields.items():
        info: KeyInfo = field.metadata["key"]
        if name in tree:
            values[name] = _value(hints[name], tree[name], _join(where, name), info, faults)
        elif field.default is dataclasses.MISSING and field.default_factory is dataclasses.MISSING:
            values[name] = _neutral(hints[name])
            if name not in meant:
                faults.append(Fault(_join(where, name), f"missing; {info.advice}" if info.advice else "missing"))
    return kind(**values)


def _value(kind: Any, value: Any, where: str, info: KeyInfo, faults: list[Fault]) -> Any:
    """One value, checked against its type, choices and bounds."""
    if dataclasses.is_dataclass(kind) and isinstance(kind, type):
        return _table(kind, value, where, faults)
    if typing.get_origin(kind) is tuple:
        (member, _) = typing.get_args(kind)
        if dataclasses.is_dataclass(member) and isinstance(member, type) and isinstance(value, dict):
            return (_table(member, value, where, faults),)  # one table where several may stand
        if not isinstance(value, list):
            faults.append(Fault(where, f"must be a list, got {shown(value)}"))
            return ()
        alone = dataclasses.is_dataclass(member) and len(value) == 1  # one table of several bears no number
        return tuple(
            _value(member, item, where if alone else f"{where}[{n}]", info, faults)
            for n, item in enumerate(value, start=1)
        )
    if isinstance(kind, types.UnionType):
        kind = next(part for part in typing.get_args(kind) if part is not types.NoneType)
    if kind is float and isinstance(value, int) and not isinstance(value, bool):
        value = float(value)
    if kind is str and type(value) in (dt.date, dt.datetime):  # a date without quotes
        value = value.isoformat()
    if type(value) is not kind:
        faults.append(Fault(where, f"must be {WORDS[kind]}, got {shown(value)}"))
        return _neutral(kind)
    faults.extend(value_faults(value, where, info))
    return value


def _elsewhere(name: str, fields: dict[str, Any]) -> str:
    """Where an unknown key that resembles none of its table may belong."""
    for table, kind in tables_of(Study).items():
        if name in {field.name for field in dataclasses.fields(kind)}:
            return f"it belongs to [{table}]"
    return f"known here: {', '.join(sorted(fields))}"


def tables_of(kind: type) -> dict[str, type]:
    """The tables that stand directly in a table, by name."""
    found = {}
    for name, hint in typing.get_type_hints(kind).items():
        member = typing.get_args(hint)[0] if typing.get_origin(hint) is tuple else hint
        if dataclasses.is_dataclass(member) and isinstance(member, type):
            found[name] = member
    return found


def _neutral(kind: Any) -> Any:
    """A value of a type that stands where a faulty or missing one was reported; never used in a study."""
    if dataclasses.is_dataclass(kind) and isinstance(kind, type):
        return _table(kind, {}, "", [])
    if typing.get_origin(kind) is tuple:
        return ()
    if isinstance(kind, types.UnionType):
        return None
    return kind()


def _join(where: str, name: str) -> str:
    return f"{where}.{name}" if where else name
