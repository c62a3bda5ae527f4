"""Pseudonyms of customers: keyed, stable within a study, and made again only by whoever holds the key."""

import hashlib
import hmac
import re
import secrets
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from loadsum.errors import Fault, InputError

ALPHABET = "23456789ABCDEFGHJKLMNPQRSTUVWXYZ"  # 32 signs that are not taken for one another
SIGNS = 5
KEY_BYTES = 32
HEAD = "# Key of the pseudonyms of a study: keep it, and keep it private. It turns names into pseudonyms again.\n"


@dataclass(frozen=True, slots=True)
class Pseudonyms:
    """Pseudonym of each customer of a study.

    Parameters
    ----------
    names : mapping of str to str
        Identifier to pseudonym; one to one.
    """

    names: Mapping[str, str]

    def __call__(self, identifier: str) -> str:
        """Pseudonym of a customer; an identifier that is none of the study's is a bug."""
        return self.names[identifier]

    def text(self, text: str) -> str:
        """A text in which every telling identifier that stands as a word of its own is replaced.

        An identifier such as ``7`` tells nothing and may be any number; it is replaced only as the name of a file.
        """
        known = [name for name in self.names if name and name in text]
        if not known:
            return text
        longest_first = sorted(known, key=len, reverse=True)
        words = "|".join(re.escape(name) + ("" if _telling(name) else r"(?=\.[a-z])") for name in longest_first)
        return re.sub(rf"(?<!\w)(?:{words})(?!\w)", lambda found: self.names[found[0]], text)

    def toml(self, text: str) -> str:
        """A study file in which every identifier in quotes, and every telling one elsewhere, is replaced."""
        quoted = re.compile(r"(['\"])([^'\"\n]*)\1")
        return self.text(quoted.sub(lambda m: f"{m[1]}{self.names.get(m[2], m[2])}{m[1]}", text))

    def cause(self, words: str) -> str:
        """A cause in words, ``customer X added``, with the pseudonym of its customer."""
        return re.sub(r"(?<=\bcustomer )(.+)(?= (?:added|gone|replaced)$)", lambda m: self.names.get(m[1], m[1]), words)

    def results(self, value: Any, place: str = "") -> Any:
        """Results as JSON knows them, with pseudonyms instead of identifiers.

        Replaced are the ``id`` of every customer, the ``customer`` of every finding, the customers of the calendar of
        readings, and telling identifiers in any text.
        """
        if isinstance(value, str):
            return self.names.get(value, value) if place in ("customer", "customers.id") else self.text(value)
        if isinstance(value, Mapping):
            if place == "customers":
                if set(value) <= set(self.names):  # by customer
                    return {self.names[name]: self.results(inside) for name, inside in value.items()}
                return {name: self.results(inside, f"customers.{name}") for name, inside in value.items()}
            return {name: self.results(inside, name) for name, inside in value.items()}
        if isinstance(value, list | tuple):
            return [self.results(inside, place) for inside in value]
        return value


def _telling(identifier: str) -> bool:
    """Whether an identifier cannot be taken for a number or a short word."""
    return len(identifier) >= 5 or (len(identifier) >= 3 and not identifier.isdigit() and not identifier.isalpha())


def pseudonyms(identifiers: Iterable[str], key: bytes) -> Pseudonyms:
    """Pseudonyms of some customers under a key.

    Parameters
    ----------
    identifiers : iterable of str
        Identifiers as in the meter files.
    key : bytes
        Secret key; the same key gives the same pseudonym to the same identifier, whatever the other customers.

    Notes
    -----
    The first signs of HMAC-SHA-256 of the identifier [1]_. Should two identifiers share them (for 1000 customers about
    1 in 70), both take as many more signs as tell them apart.

    References
    ----------
    .. [1] RFC 2104, HMAC: Keyed-Hashing for Message Authentication, 1997; cited from memory.
    """
    if len(key) < 16:
        raise ValueError(f"a key of {len(key)} bytes can be guessed; it needs at least 16")
    known = dict.fromkeys(identifiers)
    whole = {name: _signs(hmac.new(key, name.encode("utf-8"), hashlib.sha256).digest()) for name in known}
    signs = SIGNS
    names: dict[str, str] = {}
    left = list(known)
    while left:
        heads: dict[str, list[str]] = {}
        for name in left:
            heads.setdefault(whole[name][:signs], []).append(name)
        names |= {alike[0]: f"C-{head}" for head, alike in heads.items() if len(alike) == 1}
        left = [name for alike in heads.values() if len(alike) > 1 for name in alike]
        signs += 1
    return Pseudonyms({name: names[name] for name in known})


def _signs(digest: bytes) -> str:
    """A digest in an alphabet of 32 signs."""
    number = int.from_bytes(digest, "big")
    return "".join(ALPHABET[(number >> (5 * n)) & 31] for n in range(len(digest) * 8 // 5))


def read_key(path: Path) -> bytes:
    """The key that a key file holds.

    Raises
    ------
    InputError
        The file cannot be read or is no key file.
    """
    try:
        text = path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(path.name, [Fault(path.name, f"the key file cannot be read: {error}")]) from error
    lines = [line.strip() for line in text.splitlines() if line.strip() and not line.startswith("#")]
    if len(lines) != 1 or not re.fullmatch(rf"[0-9a-f]{{{2 * KEY_BYTES}}}", lines[0]):
        raise InputError(
            path.name,
            [Fault(path.name, f"is no key file: one line of {2 * KEY_BYTES} hexadecimal signs is expected")],
        )
    return bytes.fromhex(lines[0])


def key_beside(study_file: Path, name: str) -> tuple[bytes, bool]:
    """The key of a study, and whether it was made now because there was none.

    Raises
    ------
    InputError
        The file of that name is no key file.
    OSError
        The new key file cannot be written.
    """
    path = study_file.parent / name
    if path.exists():
        return read_key(path), False
    key = secrets.token_bytes(KEY_BYTES)
    write_key(path, key)
    return key, True


def write_key(path: Path, key: bytes) -> None:
    """Write a key file that only its owner may read; an existing file is never overwritten.

    Raises
    ------
    FileExistsError
        There is a file of that name.
    """
    path.touch(mode=0o600, exist_ok=False)
    path.write_text(f"{HEAD}{key.hex()}\n", encoding="utf-8")
