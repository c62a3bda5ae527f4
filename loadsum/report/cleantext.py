"""The user's own words made safe to print: no control characters, no hidden direction changes, no endless strings."""

import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from loadsum.errors import Fault
from loadsum.report.typeface import character_name, missing_characters

LONGEST_TEXT = 600
LONGEST_WORD = 80
# Keys whose text may be long because it is data for the attachment, not for the page.
HIDDEN = frozenset({"Cc", "Cf", "Cs"})


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """One text that is printed otherwise than it was given.

    Parameters
    ----------
    where : str
        Dotted key of the results.
    what : str
        ``"hidden characters left out"`` or ``"cut"``: key of the catalogue's table ``changed``.
    count : int
        Characters left out. [-]
    """

    where: str
    what: str
    count: int


@dataclass(frozen=True, slots=True, kw_only=True)
class CleanResults:
    """Results as they may be printed, what was changed for it, and what cannot be printed at all."""

    results: dict[str, Any]
    changes: tuple[Change, ...]
    faults: tuple[Fault, ...]


def clean(results: Mapping[str, Any]) -> CleanResults:
    """Every text of the results without what must not reach a page.

    Control, formatting and direction characters are left out, words above 80 and texts above 600 characters are cut
    at "…"; each is reported. Characters that no shipped font has are faults, named with their key.

    Parameters
    ----------
    results : mapping
        Results as read from JSON.
    """
    changes: list[Change] = []
    faults: list[Fault] = []

    def walk(value: Any, where: str) -> Any:
        if isinstance(value, str):
            return _text(value, where, changes, faults)
        if isinstance(value, Mapping):
            return {
                _text(str(key), where, changes, faults): walk(item, f"{where}.{key}" if where else str(key))
                for key, item in value.items()
            }
        if isinstance(value, list | tuple):
            return [walk(item, f"{where}[{index}]") for index, item in enumerate(value)]
        return value

    cleaned = walk(results, "")
    return CleanResults(results=cleaned, changes=tuple(changes), faults=tuple(faults))


def _text(text: str, where: str, changes: list[Change], faults: list[Fault]) -> str:
    if text.isascii() and text.isprintable() and len(text) <= LONGEST_WORD:
        return text
    spaced = "".join(" " if c in "\n\r\t\x0b\x0c\x85\u2028\u2029" else c for c in text)
    visible = "".join(c for c in spaced if unicodedata.category(c) not in HIDDEN)
    if len(visible) < len(spaced):
        changes.append(Change(where=where, what="hidden", count=len(spaced) - len(visible)))
    short = " ".join(_shortened(word, LONGEST_WORD) for word in _shortened(visible, LONGEST_TEXT).split(" "))
    if len(short) < len(visible):
        changes.append(Change(where=where, what="cut", count=len(visible) - len(short)))
    normal = unicodedata.normalize("NFC", short)
    for character in missing_characters(normal):
        faults.append(
            Fault(
                where[:LONGEST_TEXT], f"character {character_name(character)} is in no font of the report; replace it"
            )
        )
    return normal


def _shortened(text: str, longest: int) -> str:
    return text if len(text) <= longest else text[: longest - 1] + "…"
