"""Reports that exist already: drawn again, signed, audited."""

import json
import tomllib
from collections.abc import Mapping
from pathlib import Path, PurePath
from typing import Any

from loadsum import pipeline
from loadsum.errors import Fault, InputError
from loadsum.intake.load import load_readings
from loadsum.progress import silent
from loadsum.report import document, signature
from loadsum.report.audit import Audit, audit
from loadsum.report.outputs import write_outputs
from loadsum.report.received import read_results
from loadsum.report.results import encode
from loadsum.study.load import study_from
from loadsum.study.pseudonyms import pseudonyms, read_key
from loadsum.study.tables import Study


def redraw(results: Path, *, out: Path, templates: Path | None) -> str:
    """Draw a report from results.json without computing anything again; returns what to tell the user."""
    found = read_results(results)
    study = results.parent / "study.toml"
    attached = pipeline.attachments(found, study.read_bytes() if study.exists() else None)
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
    text = study.read_text(encoding="utf-8-sig")
    asked = _inside(text, folder)
    if asked.privacy.raw_identifiers:
        return _as_json(encode(pipeline.compute(asked, folder, progress=silent)))
    if key is None:
        raise InputError(
            "audit", [Fault("--key", "the report's customers stand under pseudonyms; give the key file of the study")]
        )
    metered = load_readings(asked, folder).readings.customers
    named = pseudonyms([*metered, *(customer.id for customer in asked.customer)], key)
    own = {pseudonym: name for name, pseudonym in named.names.items() if name in metered}
    for pseudonym, name in own.items():
        text = text.replace(f'"{pseudonym}"', json.dumps(name)).replace(f"'{pseudonym}'", json.dumps(name))
    asked = _inside(text, folder)
    results = encode(pipeline.compute(asked, folder, progress=silent))
    renamed = pseudonyms(pipeline.identifiers(asked, results), key).results(results)
    return _as_json({**renamed, "pseudonymised": True})


def _as_json(results: Mapping[str, Any]) -> dict[str, Any]:
    return dict(json.loads(json.dumps(results, allow_nan=False)))


def _inside(text: str, folder: Path) -> Study:
    """The study that a text describes, refused where a file it names lies outside the folder."""
    tree = tomllib.loads(text)
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
