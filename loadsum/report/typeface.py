"""The fonts of the report: the shipped ones only, whatever the machine has, and what they can print."""

import atexit
import functools
import os
import shutil
import tempfile
import unicodedata
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from xml.sax.saxutils import escape

import matplotlib
from fontTools.ttLib import TTFont

TEXT_FAMILY = "Source Sans 3"
FALLBACK_FAMILY = "DejaVu Sans"
SHIPPED = Path(__file__).parent / "fonts"
REGULAR = SHIPPED / "SourceSans3-Regular.ttf"
SEMIBOLD = SHIPPED / "SourceSans3-SemiBold.ttf"


def font_files() -> tuple[Path, ...]:
    """Every font file that the report may use: text face in two weights, then the wider fallback in two weights."""
    wide = Path(matplotlib.get_data_path()) / "fonts" / "ttf"
    return REGULAR, SEMIBOLD, wide / "DejaVuSans.ttf", wide / "DejaVuSans-Bold.ttf"


@functools.cache
def covered_characters() -> frozenset[int]:
    """Code points that the report can print in both weights."""
    maps = []
    for path in font_files():
        with TTFont(path, lazy=True) as font:
            maps.append(frozenset(font.getBestCmap()))
    return frozenset((maps[0] | maps[2]) & (maps[1] | maps[3]))


def missing_characters(text: str) -> tuple[str, ...]:
    """Characters of a text that no shipped font can print, each once, in the order met.

    Private-use characters count as missing even where a font holds a glyph: nobody could read them back out.
    """
    known = covered_characters()
    missing: dict[str, None] = {}
    for character in text:
        if character not in missing and character not in "\n\t " and not _printable(character, known):
            missing[character] = None
    return tuple(missing)


def character_name(character: str) -> str:
    """A character by number and name, ``U+1F4A9 (PILE OF POO)``."""
    return f"U+{ord(character):04X} ({unicodedata.name(character, 'unnamed')})"


def _printable(character: str, known: frozenset[int]) -> bool:
    return ord(character) in known and unicodedata.category(character) not in {"Co", "Cc", "Cs", "Cn"}


@functools.cache
def _private_configuration() -> Path:
    """A fontconfig file that knows the shipped fonts and nothing else; made once a process, removed at its end."""
    folder = Path(tempfile.mkdtemp(prefix="loadsum-fonts-"))
    atexit.register(shutil.rmtree, folder, ignore_errors=True)
    for path in font_files():
        shutil.copyfile(path, folder / path.name)
    configuration = folder / "fonts.conf"
    place = escape(str(folder))
    configuration.write_text(
        '<?xml version="1.0"?>\n<!DOCTYPE fontconfig SYSTEM "urn:fontconfig:fonts.dtd">\n'
        f"<fontconfig><dir>{place}</dir><cachedir>{place}</cachedir></fontconfig>\n",
        encoding="utf-8",
    )
    return configuration


@contextmanager
def shipped_fonts_only() -> Iterator[None]:
    """Let the text renderer see the shipped fonts only, while inside."""
    with _environment({"FONTCONFIG_FILE": str(_private_configuration()), "SOURCE_DATE_EPOCH": "0"}):
        yield


@contextmanager
def _environment(values: Mapping[str, str]) -> Iterator[None]:
    before = {name: os.environ.get(name) for name in values}
    os.environ.update(values)
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value
