"""Input files: found, opened within bounds, and named with their digests."""

import gzip
import hashlib
import io
import zipfile
import zlib
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

from loadsum.errors import Fault, InputError

LARGEST_BYTES = 8 * 2**30  # of one file once unpacked
LARGEST_RATIO = 200  # unpacked to packed; delimited readings reach about 30


@dataclass(frozen=True, slots=True, kw_only=True)
class InputFile:
    """One input and how it was read.

    Parameters
    ----------
    name : str
        Path relative to the study file.
    sha256 : str
        Digest of its bytes.
    bytes : int
        Size. [byte]
    format, layout : str
        What it was read as.
    choices : tuple of str
        The choices made in reading it, in words.
    """

    name: str
    sha256: str
    bytes: int
    format: str
    layout: str
    choices: tuple[str, ...]


def matching(folder: Path, pattern: str, where: str) -> list[Path]:
    """Files that a pattern, a file name or a folder name stands for, in order of name.

    Raises
    ------
    InputError
        Nothing matches, or the pattern leads out of reach.
    """
    target = folder / pattern
    if target.is_dir():
        found = sorted(path for path in target.rglob("*") if path.is_file() and not path.name.startswith("."))
    elif target.is_file():
        found = [target]
    elif Path(pattern).is_absolute():
        found = []
    else:
        found = sorted(path for path in folder.glob(pattern) if path.is_file())
    if not found:
        raise InputError("study file", [Fault(where, f"no file matches {pattern!r} beside the study file")])
    return found


def digest(path: Path) -> tuple[str, int]:
    """SHA-256 and size of a file. [-, byte]"""
    total, size = hashlib.sha256(), 0
    with path.open("rb") as file:
        while piece := file.read(2**20):
            total.update(piece)
            size += len(piece)
    return total.hexdigest(), size


def unpacked(path: Path) -> Iterator[tuple[str, bytes]]:
    """Content of a file, or of each file inside a .zip, with the name by which faults call it.

    Raises
    ------
    InputError
        The file cannot be read or unpacked, is empty, or unpacks to more than is believable.
    """
    suffix = path.suffix.lower()
    try:
        if suffix == ".gz":
            packed = _bytes_of(path)
            with gzip.open(io.BytesIO(packed)) as file:
                yield path.name, _bounded(file.read, len(packed), path.name)
        elif suffix == ".zip":
            yield from _members(_bytes_of(path), path.name)
        else:
            yield path.name, _not_empty(_bytes_of(path), path.name)  # kept by nobody here: it may be large
    except (OSError, EOFError, zlib.error, zipfile.BadZipFile, NotImplementedError, RuntimeError) as error:
        raise InputError(path.name, [Fault(path.name, f"cannot be unpacked: {error}; is it complete?")]) from error


def _bytes_of(path: Path) -> bytes:
    try:
        return path.read_bytes()
    except OSError as error:
        raise InputError(path.name, [Fault(path.name, f"cannot be read: {error.strerror}")]) from error


def _members(packed: bytes, name: str) -> Iterator[tuple[str, bytes]]:
    with zipfile.ZipFile(io.BytesIO(packed)) as archive:
        members = [info for info in archive.infolist() if not info.is_dir()]
        if not members:
            raise InputError(name, [Fault(name, "holds no file")])
        for info in sorted(members, key=lambda member: member.filename):
            if info.filename.startswith(("/", "\\")) or ".." in Path(info.filename).parts or "\\" in info.filename:
                raise InputError(name, [Fault(name, f"holds a file that points outside it: {info.filename[:80]!r}")])
            with archive.open(info) as file:
                inside = f"{name}/{info.filename}"
                yield inside, _bounded(file.read, max(info.compress_size, 1), inside)


def _bounded(read: Callable[[int], bytes], packed_bytes: int, name: str) -> bytes:
    limit = min(LARGEST_BYTES, max(packed_bytes * LARGEST_RATIO, 2**20))
    content = read(limit + 1)
    if len(content) > limit:
        raise InputError(name, [Fault(name, f"unpacks to more than {LARGEST_RATIO} times its size; not read")])
    return _not_empty(content, name)


def _not_empty(content: bytes, name: str) -> bytes:
    if not content[:64].strip() and not content.strip():
        raise InputError(name, [Fault(name, "is empty")])
    return content
