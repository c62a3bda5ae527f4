"""What is put into the PDF beside its pages, so that the study can be checked and repeated in ten years."""

import datetime as dt
import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Literal, TypeAlias

from loadsum.report import renderer

MANIFEST = "manifest.json"
STUDY_FILE = "study.toml"
RESULTS_FILE = "results.json"
Relationship: TypeAlias = Literal["Source", "Data", "Supplement"]
EARLIEST = dt.datetime(1980, 1, 1, tzinfo=dt.UTC)


@dataclass(frozen=True, slots=True, kw_only=True)
class Attachment:
    """A file inside the PDF.

    Parameters
    ----------
    name : str
        File name, without folders.
    content : bytes
        Content.
    description : str
        What it is, in one line.
    relationship : {"Source", "Data", "Supplement"}
        ``Source`` for what the study was made from, ``Data`` for what its figures and tables show.
    """

    name: str
    content: bytes
    description: str
    relationship: Relationship = "Data"

    def __post_init__(self) -> None:
        if not self.name or "/" in self.name or "\\" in self.name or self.name.startswith("."):
            raise ValueError(f"an attachment's name is a plain file name, got {self.name!r}")

    def digest(self) -> str:
        """SHA-256 of the content."""
        return hashlib.sha256(self.content).hexdigest()


def manifest(results: Mapping[str, Any], attachments: Sequence[Attachment], templates_digest: str) -> Attachment:
    """The list of what is attached, with digests, versions and the digest of the templates.

    Parameters
    ----------
    results : mapping
        Results that the report is made from.
    attachments : sequence of Attachment
        Everything else that is attached.
    templates_digest : str
        SHA-256 over the templates in use.
    """
    listed = {
        "attachments": {
            a.name: {"sha256": a.digest(), "bytes": len(a.content), "description": a.description} for a in attachments
        },
        "inputs": {str(i.get("name")): i.get("sha256") for i in results.get("inputs") or []},
        "program": results.get("program") or {},
        "renderer": renderer.versions(),
        "results_sha256": results_digest(results),
        "schema_version": 1,
        "templates_sha256": templates_digest,
    }
    text = json.dumps(listed, sort_keys=True, ensure_ascii=False, indent=1) + "\n"
    return Attachment(name=MANIFEST, content=text.encode(), description="Digests of everything attached, and versions")


def results_digest(results: Mapping[str, Any]) -> str:
    """SHA-256 of results in their canonical JSON form."""
    text = json.dumps(results, sort_keys=True, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    return hashlib.sha256(text.encode()).hexdigest()


def fixed_time(iso_date: str) -> dt.datetime:
    """Midnight UTC of the study's date, which every date in the PDF shows; 1980-01-01 where it has none."""
    try:
        return dt.datetime.combine(dt.date.fromisoformat(iso_date[:10]), dt.time(), tzinfo=dt.UTC)
    except ValueError:
        return EARLIEST


def embedded_files(attachments: Sequence[Attachment], iso_date: str) -> list[Any]:
    """Attachments in the renderer's own type, sorted by name as a PDF name tree must be."""
    weasyprint = renderer.load()
    when = fixed_time(iso_date)
    return [
        weasyprint.Attachment(
            string=a.content,
            name=a.name,
            description=a.description,
            relationship=a.relationship,
            created=when,
            modified=when,
        )
        for a in sorted(attachments, key=lambda a: a.name)
    ]
