"""One value of a study file or customer table: what is wrong with it, and how a message shows it."""

import datetime as dt
import difflib
import json
from typing import Any

from loadsum.errors import Fault
from loadsum.study.keys import KeyInfo

WORDS = {str: "text in quotes", bool: "true or false", int: "a whole number", float: "a number"}


def value_faults(value: str | bool | int | float, where: str, info: KeyInfo) -> list[Fault]:
    """Faults of one value of the right type against the choices and bounds of its key."""
    if info.choices and str(value) not in info.choices and not (value == "" and info.blank):
        near = difflib.get_close_matches(str(value), info.choices, n=1, cutoff=0.6)
        hint = f"; did you mean {shown(near[0])}?" if near and isinstance(value, str) else ""
        return [Fault(where, f"must be one of {', '.join(info.choices)}; got {shown(value)}{hint}")]
    if isinstance(value, bool) or not isinstance(value, int | float):
        return []
    if value != value or value in (float("inf"), float("-inf")):
        return [Fault(where, f"must be a finite number, got {value}")]
    if info.above is not None and not value > info.above:
        return [Fault(where, f"must be greater than {info.above:g}, got {value:g}")]
    if info.at_least is not None and value < info.at_least:
        return [Fault(where, f"must be at least {info.at_least:g}, got {value:g}")]
    if info.at_most is not None and value > info.at_most:
        return [Fault(where, f"must be at most {info.at_most:g}, got {value:g}")]
    return []


def shown(value: Any) -> str:
    """A value as the study file would show it, shortened."""
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list):
        return "a list"
    text = str(value) if isinstance(value, dt.date | dt.time) else json.dumps(value, ensure_ascii=False)
    return text if len(text) <= 60 else text[:57] + "..."
