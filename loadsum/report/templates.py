"""Templates and texts of the report: the project's own, each replaceable by a file of the utility's."""

import functools
import hashlib
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import jinja2
from markupsafe import Markup

import loadsum
from loadsum.errors import Fault, InputError, MachineError

_BLANK = re.compile(r"\{([a-z_0-9]+)\}")
LOGO_TYPES = {"logo.svg": "image/svg+xml", "logo.png": "image/png"}


def templates_folder() -> Path:
    """The folder of the project's templates: inside the installed package, or beside it in a checkout.

    Raises
    ------
    MachineError
        Neither place holds them: the installation is broken.
    """
    package = Path(loadsum.__file__).parent
    for folder in (package / "_data" / "report_templates", package.parent / "report_templates"):
        if (folder / "report.html.j2").is_file():
            return folder
    raise MachineError(f"the report's templates are missing from the installation at {package}; install loadsum again")


@dataclass(frozen=True, slots=True)
class Catalogue:
    """Every sentence of the report in one language.

    Parameters
    ----------
    texts : mapping
        Nested tables of sentences, blanks written ``{name}``.
    language : str
        BCP 47 tag.
    """

    texts: Mapping[str, Any]
    language: str

    def __call__(self, place: str, /, **blanks: object) -> str:
        """The sentence at a dotted place, its blanks filled.

        Raises
        ------
        KeyError
            The catalogue has no such sentence, or a blank has no value: a fault of the program or of the catalogue.
        """
        text = self.entry(place)
        if not isinstance(text, str):
            raise KeyError(f"{place} is no sentence of the catalogue")
        return _BLANK.sub(lambda blank: str(blanks[blank[1]]), text)

    def entry(self, place: str) -> Any:
        """The entry at a dotted place: a sentence, a list or a table."""
        value: Any = self.texts
        for part in place.split("."):
            if not isinstance(value, Mapping) or part not in value:
                raise KeyError(f"the text catalogue has no {place}")
            value = value[part]
        return value

    def has(self, place: str) -> bool:
        """Whether there is an entry at a dotted place."""
        value: Any = self.texts
        for part in place.split("."):
            if not isinstance(value, Mapping) or part not in value:
                return False
            value = value[part]
        return True

    def name(self, place: str, word: str) -> str:
        """The catalogue's name for a word of the results, the word itself where it has none."""
        return self(f"{place}.{word}") if word and self.has(f"{place}.{word}") else word


def _merged(base: Mapping[str, Any], over: Mapping[str, Any]) -> dict[str, Any]:
    result = dict(base)
    for name, value in over.items():
        before = result.get(name)
        result[name] = _merged(before, value) if isinstance(before, Mapping) and isinstance(value, Mapping) else value
    return result


@functools.cache
def _own_texts(language: str) -> dict[str, Any]:
    return tomllib.loads((templates_folder() / "text" / f"{language}.toml").read_text(encoding="utf-8"))


def catalogue(language: str, overrides: Path | None = None) -> Catalogue:
    """The text catalogue of a language, with the sentences that the utility replaces.

    Raises
    ------
    InputError
        The utility's ``text/LANGUAGE.toml`` is not TOML.
    """
    texts = _own_texts(language)
    own = overrides / "text" / f"{language}.toml" if overrides is not None else None
    if own is not None and own.is_file():
        try:
            texts = _merged(texts, tomllib.loads(own.read_text(encoding="utf-8")))
        except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
            raise InputError(str(own), [Fault("text", f"not a TOML file in UTF-8: {error}")]) from error
    return Catalogue(texts, language)


@functools.cache
def environment(overrides: Path | None = None) -> jinja2.Environment:
    """Template environment in which every value is escaped, and the utility's files go before the project's."""
    folders = [*([overrides] if overrides is not None else []), templates_folder()]
    return jinja2.Environment(
        loader=jinja2.FileSystemLoader([str(folder) for folder in folders]),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )


def marked_up(text: str) -> Markup:
    """A sentence of the catalogue whose ``*words*`` are printed strong; everything else in it is escaped."""
    parts = text.split("*")
    return Markup("").join(
        Markup("<strong>{}</strong>").format(part) if index % 2 else Markup("{}").format(part)
        for index, part in enumerate(parts)
    )


def logo(overrides: Path | None) -> tuple[str, bytes] | None:
    """Media type and content of the utility's logo, where its folder has one."""
    for name, kind in LOGO_TYPES.items():
        if overrides is not None and (overrides / name).is_file():
            return kind, (overrides / name).read_bytes()
    return None


def templates_digest(overrides: Path | None = None) -> str:
    """SHA-256 over every template and text in use, so that a reader knows whether a redraw used the same ones."""
    digest = hashlib.sha256()
    for folder in (templates_folder(), *([overrides] if overrides is not None else [])):
        for path in sorted(p for p in folder.rglob("*") if p.is_file()):
            content = path.read_bytes()
            digest.update(f"{path.relative_to(folder).as_posix()} {len(content)}\n".encode())
            digest.update(content)
    return digest.hexdigest()
