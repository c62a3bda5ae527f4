"""A study rerun with a changed assumption: ``--with key=value`` put into the values of the study file."""

import copy
import re
import tomllib
from collections.abc import Sequence
from typing import Any

from loadsum.errors import Fault, InputError

NOTED = "# Values that stood for those above when the study was made:"
STEP = re.compile(r"([A-Za-z_]\w*)(?:\[(\d+)\])?")


def with_overrides(tree: dict[str, Any], overrides: Sequence[str]) -> dict[str, Any]:
    """The values of a study file with some of them changed; the values given are not touched.

    Parameters
    ----------
    tree : dict
        Values as read from TOML.
    overrides : sequence of str
        Each ``key=value``: a dotted key as messages print it (``transformer.power_factor``, ``criterion[2].limit``,
        ``transformer.ratings_kva[3]``) and a TOML value; text may stand without quotes.

    Raises
    ------
    InputError
        A text that is no override, or a key that leads nowhere; all of them together. Whether the key is known and
        the value fits is the loader's business.

    Notes
    -----
    A key of a table that stands several times needs the number of the table; one that stands once does not. A table
    that the study file lacks is made.
    """
    changed = copy.deepcopy(tree)
    faults = []
    for text in overrides:
        key, sign, value = text.partition("=")
        steps = [STEP.fullmatch(part.strip()) for part in key.split(".")]
        if not sign or not all(steps):
            faults.append(Fault(f"--with {text}", 'must be key=value, such as "transformer.power_factor=0.9"'))
            continue
        path = [(step[1], int(step[2]) if step[2] else 0) for step in steps if step]
        message = _put(changed, path, toml_value(value.strip()))
        if message:
            faults.append(Fault(f"--with {key.strip()}", message))
    if faults:
        raise InputError("command line", faults)
    return changed


def with_values_noted(study_file: str, overrides: Sequence[str]) -> str:
    """The text of a study file with the values that stood for some of its own noted at its end."""
    if not overrides:
        return study_file
    lines = [f"# with {text}" for text in overrides]
    return "\n".join([study_file.rstrip("\n"), *([] if noted_values(study_file) else ["", NOTED]), *lines]) + "\n"


def noted_values(study_file: str) -> tuple[str, ...]:
    """The ``key=value`` texts noted at the end of a study file that a report carries."""
    _, heading, noted = study_file.rpartition(f"\n{NOTED}\n")
    lines = noted.splitlines() if heading else []
    return tuple(line.removeprefix("# with ") for line in lines if line.startswith("# with "))


def toml_value(text: str) -> Any:
    """A value in TOML notation; what is none is text."""
    try:
        return tomllib.loads(f"value = {text}")["value"]
    except tomllib.TOMLDecodeError:
        return text


def _put(tree: dict[str, Any], path: Sequence[tuple[str, int]], value: Any) -> str:
    """Set one value in place; says what is wrong with the path, or nothing."""
    here: Any = tree
    for name, number in path[:-1]:
        if not isinstance(here, dict):
            return f"leads through {name}, which stands in no table"
        inside = here.setdefault(name, {})
        if isinstance(inside, list):
            if number == 0 and len(inside) > 1:
                return f"there are {len(inside)} tables [[{name}]]; say which, as in {name}[1]"
            if number > len(inside) or not inside:
                return f"there is no {name}[{number or 1}]; the study file has {len(inside)}"
            inside = inside[max(number, 1) - 1]
        elif number > 1:
            return f"there is no {name}[{number}]; the study file has 1"
        here = inside
    name, number = path[-1]
    if not isinstance(here, dict):
        return f"{name} stands in no table"
    if not number:
        here[name] = value
        return ""
    members = here.get(name)
    if not isinstance(members, list) or number > len(members):
        return f"there is no {name}[{number}]; the list has {len(members) if isinstance(members, list) else 0} entries"
    members[number - 1] = value
    return ""
