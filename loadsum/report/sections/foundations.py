"""What the study stands on: method, assumptions, cautions, what was not checked, inputs, references."""

from typing import Any

from loadsum.report import renderer
from loadsum.report.material import Material, Section
from loadsum.report.notation import NO_BREAK
from loadsum.report.sections.first_page import all_assumptions


def method_section(m: Material) -> Section:
    """How the figures were made, in words a planner can check."""
    paragraphs = [
        m.t(f"method.{name}", interval=f"{m.interval_min}{NO_BREAK}min", seed=m.results.get("seed"))
        for name in m.t.entry("method_order")
    ]
    return Section(block="method", title=m.t("section.method"), content={"paragraphs": paragraphs})


def assumptions_section(m: Material) -> Section | None:
    """Register of assumptions: value, source, who decided, what the verdict does when it moves."""
    rows = all_assumptions(m)
    if not rows:
        return None
    content = {
        "rows": [
            {
                "name": row.get("name", ""),
                "value": _value(m, row),
                "source": row.get("source") or m.n.none,
                "decided_by": row.get("decided_by") or m.n.none,
                "effect": row.get("effect") or m.n.none,
            }
            for row in rows
        ]
    }
    return Section(block="assumptions", title=m.t("section.assumptions"), content=content)


def _value(m: Material, row: Any) -> str:
    value = row.get("value")
    text = m.plain(value) if isinstance(value, int | float) and not isinstance(value, bool) else str(value or "")
    return text + (NO_BREAK + row["unit"] if row.get("unit") else "")


def cautions_section(m: Material) -> Section:
    """Cautions that every report carries, with the standards of the study's region."""
    region = m.study.get("region") or "international"
    standards = m.t.entry("standards").get(region.replace(" ", "_")) or m.t.entry("standards.international")
    items = [
        {
            "title": item["title"],
            # Identifiers count as shown unless the results say that they were replaced.
            "text": item["text"] if m.results.get("pseudonymised") else item.get("text_named", item["text"]),
            "standards": [standards[k] for k in item.get("standards", ())],
        }
        for item in m.t.entry("caution")
    ]
    return Section(
        block="cautions",
        title=m.t("section.cautions"),
        content={"items": items, "region": m.t.name("region", region.replace(" ", "_"))},
    )


def unchecked_section(m: Material) -> Section:
    """What this study did not look at."""
    items = list(m.t.entry("unchecked.always"))
    items += [m.t(f"unchecked.{part}") for part in parts_left_out(m)]
    items += [str(text) for text in m.results.get("not_checked") or ()]
    return Section(block="unchecked", title=m.t("section.unchecked"), content={"items": items})


def parts_left_out(m: Material) -> list[str]:
    """Parts of a whole study that these results do not hold."""
    return [part for part in m.t.entry("unchecked.parts") if not _present(m, part)]


def _present(m: Material, part: str) -> bool:
    return bool(m.part(part)) or any(unit.part(part) for unit in m.units)


def inputs_section(m: Material) -> Section | None:
    """Inputs with their digests and the choices made in reading them, versions, attachments."""
    inputs, program = m.rows("inputs"), m.part("program") or {}
    if not inputs and not program:
        return None
    content = {
        "rows": [
            {
                "name": row.get("name", ""),
                "format": row.get("format", ""),
                "bytes": m.n.fixed(row.get("bytes")),
                "digest": row.get("sha256", ""),
                "choices": [str(c) for c in row.get("choices") or ()],
            }
            for row in inputs
        ],
        "program": f"{program.get('name', 'loadsum')} {program.get('version', '')}",
        "versions": sorted({**(program.get("dependencies") or {}), **renderer.versions()}.items()),
        "seed": m.results.get("seed"),
    }
    return Section(block="inputs", title=m.t("section.inputs"), content=content)


def references_section(m: Material) -> Section:
    """References of the parts that were used, each with how its content was had."""
    rows = [row for row in m.t.entry("reference") if not row["part"] or _present(m, row["part"])]
    rows += [row for row in m.rows("references") if row.get("text") not in {known["text"] for known in rows}]
    content = {
        "rows": [
            {
                "text": row.get("text") or row.get("citation", ""),
                "read": m.t.name("provenance", row.get("provenance", "")),
            }
            for row in rows
        ]
    }
    return Section(block="references", title=m.t("section.references"), content=content)
