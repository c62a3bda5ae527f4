"""Reports that exist already: drawn again, signed, audited."""

import json
import tomllib
from collections.abc import Mapping, Sequence
from pathlib import Path, PurePath
from typing import Any

from loadsum import pipeline
from loadsum.errors import Fault, InputError
from loadsum.intake.load import load_readings
from loadsum.progress import Progress, silent
from loadsum.report import document, signature
from loadsum.report.archive import STUDY_FILE
from loadsum.report.audit import Audit, audit
from loadsum.report.delivered import attachments
from loadsum.report.outputs import write_outputs
from loadsum.report.received import read_report, read_results
from loadsum.report.results import encode
from loadsum.study.load import study_from
from loadsum.study.overrides import noted_values, with_overrides, with_values_noted
from loadsum.study.pseudonyms import pseudonyms, read_key
from loadsum.study.tables import Study


def redraw(results: Path, *, out: Path, templates: Path | None) -> str:
    """Draw a report from results.json without computing anything again; returns what to tell the user."""
    found = read_results(results)
    study = results.parent / "study.toml"
    attached = attachments(found, study.read_bytes() if study.exists() else None)
    write_outputs(out.parent, {out.name: document.render(found, attachments=attached, overrides=templates)})
    return f"report: {out}"


def sign(report: Path, *, role: str, certificate: Path, passphrase: str, out: Path) -> str:
    """Sign an issued report in the field of a role; returns what to tell the user."""
    try:
        content, own = report.read_bytes(), certificate.read_bytes()
    except OSError as error:
        raise InputError(str(error.filename), [Fault("file", f"cannot be read: {error.strerror}")]) from error
    write_outputs(out.parent, {out.name: signature.sign(content, role=role, certificate=own, passphrase=passphrase)})
    return f"signed as {role}: {out}"


def audited(report: Path, *, inputs: Path | None, key: Path | None, templates: Path | None) -> Audit:
    """Check a report that came back: signatures, attachments, inputs, and every number computed again."""
    secret = read_key(key) if key is not None else None

    def again(study: Path, folder: Path) -> Mapping[str, Any]:
        return recomputed(study, folder, secret)

    return audit(report, inputs=inputs, recompute=again if inputs is not None else None, overrides=templates)


def recomputed(study: Path, folder: Path, key: bytes | None) -> dict[str, Any]:
    """Results of an attached study file from inputs in a folder, under the pseudonyms of the report.

    Raises
    ------
    InputError
        The study file leads outside the folder, holds faults, or needs the key of its pseudonyms.
    """
    text = _own_names(study.read_text(encoding="utf-8-sig"), folder, key)
    asked = _inside(text, folder, noted_values(text))
    results = encode(pipeline.compute(asked, folder, progress=silent))
    if asked.privacy.raw_identifiers:
        return _as_json(results)
    renamed = pseudonyms(pipeline.identifiers(asked, results), key or b"").results(results)
    return _as_json({**renamed, "pseudonymised": True})


def rerun(
    report: Path,
    *,
    inputs: Path,
    key: Path | None,
    out: Path,
    overrides: Sequence[str],
    progress: Progress,
    xlsx: bool = False,
) -> str:
    """Make the study that a report carries again with changed values; returns the differences they make.

    Parameters
    ----------
    report : Path
        A report with its study file attached.
    inputs : Path
        Folder of the study's input files.
    key : Path or None
        Key file of the customers' pseudonyms; needed unless the report shows raw identifiers.
    out : Path
        Folder for the outputs.
    overrides : sequence of str
        ``key=value`` each: values that stand for those of the study.
    progress : Progress
        Told how far the work is.
    xlsx : bool
        Whether the result tables are written as a workbook as well.

    Raises
    ------
    InputError
        The report cannot be read or carries no study file, the key is missing, or a value is at fault.
    """
    try:
        content = report.read_bytes()
    except OSError as error:
        raise InputError(report.name, [Fault("file", f"cannot be read: {error.strerror}")]) from error
    attached = read_report(content, report.name).attachments
    if STUDY_FILE not in attached:
        raise InputError(report.name, [Fault("attachments", f"there is no {STUDY_FILE} among them")])
    secret = read_key(key) if key is not None else None
    text = _own_names(attached[STUDY_FILE].content.decode("utf-8"), inputs, secret)
    noted = noted_values(text)
    asked, before = _inside(text, inputs, [*noted, *overrides]), _inside(text, inputs, noted)
    if secret is None and not asked.privacy.raw_identifiers:
        raise InputError(report.name, [Fault("--key", "customers are to stand under pseudonyms; give a key file")])
    study_file = with_values_noted(text, overrides)
    said = pipeline.deliver(
        asked,
        inputs,
        study_file,
        secret or b"",
        before=before if overrides else None,
        out=out,
        progress=progress,
        xlsx=xlsx,
    )
    return "\n".join(said)


def _own_names(text: str, folder: Path, key: bytes | None) -> str:
    """An attached study file with the customers' own names in place of their pseudonyms."""
    asked = _inside(text, folder, noted_values(text))
    if asked.privacy.raw_identifiers:
        return text
    if key is None:
        raise InputError(
            "report", [Fault("--key", "the report's customers stand under pseudonyms; give the key file of the study")]
        )
    metered = load_readings(asked, folder).readings.customers
    named = pseudonyms([*metered, *(customer.id for customer in asked.customer)], key)
    own = {pseudonym: name for name, pseudonym in named.names.items() if name in metered}
    for pseudonym, name in own.items():
        text = text.replace(f'"{pseudonym}"', json.dumps(name)).replace(f"'{pseudonym}'", json.dumps(name))
    return text


def _as_json(results: Mapping[str, Any]) -> dict[str, Any]:
    return dict(json.loads(json.dumps(results, allow_nan=False)))


def _inside(text: str, folder: Path, overrides: Sequence[str] = ()) -> Study:
    """The study that a text describes, refused where a file it names lies outside the folder."""
    tree = with_overrides(tomllib.loads(text), overrides)
    outside = [name for name in _file_names(tree) if PurePath(name).is_absolute() or ".." in PurePath(name).parts]
    root = folder.resolve()
    links = [p.name for p in folder.rglob("*") if p.is_symlink() and not p.resolve().is_relative_to(root)]
    if outside or links:
        named = (outside + links)[0]
        raise InputError("audit", [Fault("files", f"{named[:80]!r} leads outside the folder of inputs; not read")])
    return study_from(tree, "study.toml", folder)


def _file_names(tree: Any, key: str = "") -> list[str]:
    """Every text of a study file under a key that names a file."""
    if isinstance(tree, dict):
        return [name for inner, value in tree.items() for name in _file_names(value, inner)]
    if isinstance(tree, list):
        return [name for value in tree for name in _file_names(value, key)]
    names_a_file = key in ("files", "file", "record_file", "table", "profile", "profile_file", "key_file", "templates")
    return [tree] if names_a_file and isinstance(tree, str) else []
