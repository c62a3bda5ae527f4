"""The sign-off block: who answers for the study, and a field for each signature, left empty."""

from collections.abc import Mapping, Sequence
from typing import Any

from loadsum.report.material import Material, Section

DEFAULT_ROLES = ("prepared", "checked", "responsible engineer")


def signers(results: Mapping[str, Any]) -> Sequence[tuple[str, Mapping[str, Any]]]:
    """Every expected signature: name of its field in the PDF, and the person.

    Parameters
    ----------
    results : mapping
        Results as read from JSON.
    """
    people = results.get("people") or [{"role": role} for role in DEFAULT_ROLES]
    fields: list[tuple[str, Mapping[str, Any]]] = []
    for person in people:
        base = "signature-" + "".join(c if c.isascii() and c.isalnum() else "-" for c in str(person.get("role", "")))
        taken = sum(1 for name, _ in fields if name == base or name.startswith(base + "-no-"))
        fields.append((base if taken == 0 else f"{base}-no-{taken + 1}", person))
    return fields


def section(m: Material) -> Section:
    """Roles, names, registrations, dates and signature fields; the revision table."""
    study = m.study
    rows = [
        {
            "field": field,
            "role": m.t.name("person", str(person.get("role", ""))),
            "name": person.get("name") or "",
            "registration": person.get("registration") or "",
        }
        for field, person in signers(m.results)
    ]
    history = study.get("revisions") or [
        {"revision": study.get("revision"), "date": study.get("date"), "status": study.get("status"), "note": ""}
    ]
    revisions = [
        {
            "revision": entry.get("revision") or m.n.none,
            "date": m.n.date(entry.get("date")),
            "status": m.t(f"status.{entry['status']}.word") if entry.get("status") else m.n.none,
            "note": entry.get("note") or m.n.none,
        }
        for entry in history
    ]
    return Section(block="sign-off", title=m.t("section.sign_off"), content={"rows": rows, "revisions": revisions})
