"""A report checked years later: signatures, attachments, inputs, pages and every number, by computing it again."""

import hashlib
import tempfile
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from loadsum import __version__
from loadsum.errors import Fault, InputError, LoadsumError, MissingExtraError
from loadsum.report import renderer
from loadsum.report.archive import MANIFEST, RESULTS_FILE, STUDY_FILE, results_digest
from loadsum.report.differences import TOLERANCE, differences
from loadsum.report.document import render
from loadsum.report.limits import COMPUTING_S, DRAWING_S, TakesTooLongError, bounded, too_much
from loadsum.report.received import Received, read_report
from loadsum.report.sections.sign_off import signers
from loadsum.report.signature import signatures
from loadsum.report.templates import templates_digest

AGREES, DIFFERS = 0, 3
MOST_LISTED = 40
Recompute = Callable[[Path, Path], Mapping[str, Any]]


@dataclass(slots=True, kw_only=True)
class Audit:
    """What an audit found.

    Parameters
    ----------
    checked : list of str
        What agrees, or could not be judged, one sentence each.
    differs : list of str
        What does not agree, one sentence each.
    """

    checked: list[str] = field(default_factory=list)
    differs: list[str] = field(default_factory=list)

    @property
    def exit_status(self) -> int:
        """0 where everything that was checked agrees, 3 where something differs."""
        return DIFFERS if self.differs else AGREES

    def text(self) -> str:
        """The findings, those that differ first."""
        lines = [f"differs: {line}" for line in self.differs] + [f"checked: {line}" for line in self.checked]
        verdict = "does not agree" if self.differs else "agrees with what was checked"
        return "\n".join([*lines, f"The report {verdict}."])


def audit(
    report: Path,
    *,
    inputs: Path | None = None,
    recompute: Recompute | None = None,
    overrides: Path | None = None,
) -> Audit:
    """Check a report that came back from outside.

    Nothing in it is trusted: it is read within bounds, no content of it is run, and of the disk nothing but files
    inside ``inputs`` is read.

    Parameters
    ----------
    report : Path
        The PDF.
    inputs : Path or None
        Folder with the input files; None leaves inputs and numbers unchecked.
    recompute : callable or None
        Computes the study again: called with the attached study file, written to a folder of its own, and the folder
        of inputs; returns results as read from JSON. It must read nothing outside that folder.
    overrides : Path or None
        The utility's own templates that the report was drawn with.

    Raises
    ------
    InputError
        The file is no report of this program at all.
    MissingExtraError
        The package that reads PDF is not installed.
    """
    try:
        content = report.read_bytes()
    except OSError as error:
        raise InputError(str(report), [Fault("file", f"cannot be read: {error.strerror}")]) from error
    found = Audit()
    try:
        received = read_report(content, str(report))
    except MissingExtraError:
        raise
    except InputError as error:
        if b"%PDF-" not in content[:1024]:
            raise
        found.differs.extend(fault.message for fault in error.faults)
        return found
    _active_content(received, found)
    _attachments(received, found)
    results = received.results
    if results is None:
        found.differs.append(f"{RESULTS_FILE} is not attached or cannot be read, so nothing else can be checked")
        return found
    _signatures(received, results, found)
    _pages(received, results, overrides, found)
    if inputs is None:
        found.checked.append("inputs and numbers: not checked, no folder of inputs was given")
        return found
    if _inputs(results, inputs, found) and recompute is not None:
        _numbers(received, results, inputs, recompute, found)
    return found


def _active_content(received: Received, found: Audit) -> None:
    if received.active:
        found.differs.append(f"the PDF carries active content, which no report has: {', '.join(received.active)}")


def _attachments(received: Received, found: Audit) -> None:
    manifest = received.json(MANIFEST)
    if manifest is None or not isinstance(manifest.get("attachments"), dict):
        found.differs.append(f"{MANIFEST} is not attached or cannot be read")
        return
    listed: dict[str, Any] = manifest["attachments"]
    for name, entry in listed.items():
        there = received.attachments.get(name)
        if there is None:
            found.differs.append(f"attachment {name[:80]} is missing")
        elif not isinstance(entry, dict) or there.digest() != entry.get("sha256"):
            found.differs.append(f"attachment {name[:80]} is not the one that the report was made with")
    for name in received.attachments:
        if name not in listed and name != MANIFEST:
            found.differs.append(f"attachment {name[:80]} was added")
    results = received.results
    if results is not None and manifest.get("results_sha256") != _digest_or_none(results):
        found.differs.append(f"{RESULTS_FILE} is not the one that the report was made with")
    if not found.differs:
        found.checked.append(f"attachments: {len(listed)} intact")


def _digest_or_none(results: Mapping[str, Any]) -> str | None:
    try:
        return results_digest(results)
    except ValueError:
        return None


def _signatures(received: Received, results: Mapping[str, Any], found: Audit) -> None:
    try:
        states = signatures(received)
    except MissingExtraError:
        raise
    except InputError as error:
        found.differs.extend(f"signatures: {fault.message}" for fault in error.faults)
        return
    for state in states:
        if state.good:
            found.checked.append(
                f"signature {state.field}: stands; signer {state.signer}, certificate issued by {state.issuer}, "
                f"time as the signer's clock had it {state.time}; whether to trust that issuer is yours to decide"
            )
        else:
            found.differs.append(f"signature {state.field}: does not stand: {state.reason}")
    signed = {state.field for state in states}
    missing = [
        " ".join(part for part in (str(person.get("role") or ""), str(person.get("name") or "")) if part)
        for name, person in signers(results)
        if name not in signed
    ]
    status = (results.get("study") or {}).get("status")
    if missing and (status == "issued" or states):
        found.differs.append(f"signatures missing: {'; '.join(missing)[:400]}")
    elif missing:
        found.checked.append(f"signatures: none; the report is {status or 'a draft'}")


def _pages(received: Received, results: Mapping[str, Any], overrides: Path | None, found: Audit) -> None:
    """Draw the report again from its own attachments and compare, where the same versions are at hand."""
    manifest = received.json(MANIFEST) or {}
    made_by = str((results.get("program") or {}).get("version"))
    if made_by != __version__:
        found.checked.append(f"pages: made by {made_by[:40]}, this is {__version__}; not drawn again")
        return
    if manifest.get("renderer") != renderer.versions():
        found.checked.append("pages: made with other versions of the renderer; not drawn again")
        return
    if manifest.get("templates_sha256") != templates_digest(overrides):
        found.checked.append("pages: drawn with templates that are not at hand; not drawn again")
        return
    others = [a for name, a in received.attachments.items() if name != MANIFEST]
    excess = too_much(results)
    if excess:
        found.differs.append(
            f"the attached results hold more than any report of this program: {excess}; not drawn again"
        )
        return
    try:
        with bounded(DRAWING_S):
            again = render(results, attachments=others, overrides=overrides)
    except (TakesTooLongError, MemoryError) as error:
        found.differs.append(f"the attached results cannot be drawn within bounds: {str(error) or 'too much memory'}")
        return
    except (LoadsumError, KeyError, TypeError, ValueError, AttributeError) as error:
        found.differs.append(f"the attached results cannot be drawn: {type(error).__name__}: {str(error)[:200]}")
        return
    if received.content.startswith(again):
        found.checked.append("pages: drawn again from the attached results, the same to the byte")
    else:
        found.differs.append("the pages are not those that the attached results give")


def _inputs(results: Mapping[str, Any], folder: Path, found: Audit) -> bool:
    """Digests of the input files; whether all are there and unchanged."""
    intact = True
    count = 0
    for name, digest in _listed_inputs(results):
        path = _inside(folder, name)
        if path is None:
            intact = False
            found.differs.append(f"input {name[:120]}: not in {folder}")
            continue
        with path.open("rb") as file:
            if hashlib.file_digest(file, "sha256").hexdigest() != digest:
                intact = False
                found.differs.append(f"input {name[:120]}: is not the file that the study was made from")
        count += 1
    if intact:
        found.checked.append(f"inputs: {count} files, the same as the study was made from")
    return intact


def _listed_inputs(results: Mapping[str, Any]) -> Iterator[tuple[str, str]]:
    for entry in results.get("inputs") or ():
        if isinstance(entry, Mapping) and entry.get("name") != STUDY_FILE and entry.get("role") != "study file":
            yield str(entry.get("name")), str(entry.get("sha256"))


def _inside(folder: Path, name: str) -> Path | None:
    """A file by name, only if it truly lies inside the folder."""
    try:
        root = folder.resolve(strict=True)
        path = (root / name).resolve(strict=True)
    except (OSError, ValueError, RuntimeError):
        return None
    return path if path.is_relative_to(root) and path.is_file() else None


def _numbers(received: Received, results: Mapping[str, Any], inputs: Path, recompute: Recompute, found: Audit) -> None:
    study = received.attachments.get(STUDY_FILE)
    if study is None:
        found.differs.append(f"{STUDY_FILE} is not attached, so the numbers cannot be computed again")
        return
    with tempfile.TemporaryDirectory(prefix="loadsum-audit-") as place:
        path = Path(place) / STUDY_FILE
        path.write_bytes(study.content)
        try:
            with bounded(COMPUTING_S):
                again = recompute(path, inputs)
        except (TakesTooLongError, MemoryError) as error:
            told = str(error) or "too much memory"
            found.differs.append(f"the attached study cannot be computed within bounds: {told}")
            return
        except LoadsumError as error:
            found.differs.append(f"the attached study cannot be computed: {str(error)[:400]}")
            return
    apart = differences(results, again)
    made_by = str((results.get("program") or {}).get("version"))
    if not apart:
        found.checked.append(f"numbers: all computed again, the same to {TOLERANCE:g}")
        return
    lines = [str(one) for one in apart[:MOST_LISTED]]
    if len(apart) > MOST_LISTED:
        lines.append(f"and {len(apart) - MOST_LISTED} more")
    if made_by != __version__:
        found.checked.append(f"numbers: made by {made_by[:40]}; {len(apart)} are otherwise with {__version__}:")
        found.checked.extend(lines)
    else:
        found.differs.extend(lines)
