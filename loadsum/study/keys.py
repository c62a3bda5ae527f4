"""Every key of the study file, once: the loader, the JSON schema and the reference page are made from these tables.

A table of the TOML file is a frozen dataclass; a key is a field made by :func:`key`, which carries what the
loader checks and what the reference page says. Units are part of a key's name.
"""

from collections.abc import Callable
from dataclasses import MISSING, dataclass, field
from typing import Any


@dataclass(frozen=True, slots=True, kw_only=True)
class KeyInfo:
    """What is known about one key beside its type.

    Parameters
    ----------
    doc : str
        What the key means, with its unit, as the reference page prints it.
    example : str
        A value in TOML notation.
    choices : tuple of str
        The only values allowed; empty when any value of the type is.
    above, at_least, at_most : float or None
        Bounds of a number, or of every number in a list.
    advice : str
        What to do when a required key is missing.
    blank : bool
        Whether empty text may stand beside the choices; so where the key's default is empty.
    """

    doc: str
    example: str = ""
    choices: tuple[str, ...] = ()
    above: float | None = None
    at_least: float | None = None
    at_most: float | None = None
    advice: str = ""
    blank: bool = False


def key(doc: str, *, default: Any = MISSING, default_factory: Callable[[], Any] | Any = MISSING, **info: Any) -> Any:
    """A dataclass field that is a key of the study file; without a default the key is required."""
    known = KeyInfo(doc=doc, blank=default == "", **info)
    return field(default=default, default_factory=default_factory, metadata={"key": known})
