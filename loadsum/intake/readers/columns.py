"""Which column of a table is what: as the study file names it, or guessed and said."""

import re

from loadsum.errors import Fault, InputError

# Words by which a header is guessed, most telling first; what is guessed is said.
TIME_WORDS = ("timestamp", "datetime", "stamp", "time", "read_at", "start", "date")
CUSTOMER_WORDS = ("customer", "meter", "identifier", "account", "premise", "id")
VALUE_WORDS = ("kwh", "kw", "wh", "value", "energy", "power", "demand", "consumption", "reading")


def guessed_layout(columns: list[str]) -> str:
    named = [matching_header([column], CUSTOMER_WORDS) is not None for column in columns]
    valued = [matching_header([column], VALUE_WORDS) is not None for column in columns]
    clocks = sum(bool(re.fullmatch(r"\d{1,2}:\d\d(:\d\d)?", column)) for column in columns)
    if clocks >= 24:
        return "one row a day"
    return "one row a reading" if len(columns) <= 6 and any(named) and any(valued) else "one column a customer"


def matching_header(columns: list[str], words: tuple[str, ...]) -> str | None:
    for word in words:
        for column in columns:
            if re.search(rf"(^|[^a-z]){word}([^a-z]|$)", column.lower()):
                return column
    return None


def column_named(
    columns: list[str], wanted: str, words: tuple[str, ...], key: str, name: str, said: list[str]
) -> str | None:
    """The column that the study file names, or a guess, which is said."""
    if wanted:
        if wanted not in columns:
            known = ", ".join(columns[:12])
            raise InputError(name, [Fault(f"readings.{key}", f"{name} has no column {wanted!r}; it has: {known}")])
        return wanted
    found = matching_header(columns, words)
    if found is not None:
        said.append(f"{key}: {found}, guessed")
    return found
