"""Page 1: what was asked, what was found, what to do, what it rests on."""

from collections.abc import Mapping
from typing import Any

from loadsum.report.material import Material
from loadsum.report.notation import NO_BREAK
from loadsum.report.sections.verdict import exceedance_of, verdict


def content(m: Material) -> dict[str, Any]:
    """What page 1 prints."""
    return {
        "facts": _facts(m),
        "question": m.study.get("question") or m.t("first_page.no_question"),
        "findings": [_finding(m, transformer) for transformer in m.transformers[:6]],
        "more": _more(m),
        "coverage": coverage(m),
        "rests_on": _rests_on(m),
        "warnings": _warnings(m),
        "status": m.t(f"status.{m.study.get('status') or 'draft'}.sentence"),
    }


def _facts(m: Material) -> list[tuple[str, str]]:
    study = m.study
    return [
        (m.t("fact.reference"), study.get("reference") or m.n.none),
        (m.t("fact.revision"), study.get("revision") or m.n.none),
        (m.t("fact.date"), m.n.date(study.get("date"))),
        (m.t("fact.status"), m.t(f"status.{study.get('status') or 'draft'}.word")),
    ]


def _finding(m: Material, transformer: Mapping[str, Any]) -> dict[str, Any]:
    found = verdict(m, transformer)
    lines = [found.sentence, *found.reasons]
    return {
        "id": transformer.get("id") or "",
        "rating": found.headline,
        "lines": lines,
        "action": found.action,
        "chosen": exceedance_of(transformer, found.rating_kva) is not None,
    }


def _more(m: Material) -> str:
    rest = len(m.transformers) - 6
    return m.t("first_page.more_transformers", count=rest) if rest > 0 else ""


def coverage(m: Material) -> str:
    """Whose readings, from when to when, and what part of the year they speak for."""
    c = m.part("coverage")
    if not c:
        return m.t("first_page.no_coverage")
    metered = [row for row in m.rows("customers") if row.get("readings")]
    text = m.t(
        "first_page.coverage",
        customers=len(metered),
        days=m.n.fixed(c.get("days")),
        first=m.n.date(c.get("first_day")),
        last=m.n.date(c.get("last_day")),
        covered=m.n.fixed(c.get("covered_hours")),
        hours=m.n.fixed(c.get("hours_in_year")),
        share=m.n.percent((c.get("covered_hours") or 0.0) / (c.get("hours_in_year") or 1.0), 3),
    )
    uncovered = c.get("uncovered") or []
    if uncovered:
        listed = "; ".join(uncovered[:4]) + ("; …" if len(uncovered) > 4 else "")
        text += " " + m.t("first_page.uncovered", classes=listed)
    return text


def _rests_on(m: Material) -> list[str]:
    lines = [m.t("first_page.model", interval=f"{m.interval_min}{NO_BREAK}min")]
    count = len(m.rows("assumptions"))
    if count:
        lines.append(m.t("first_page.assumptions", count=count))
    if m.part("evidence") is None:
        lines.append(m.t("first_page.no_hold_out"))
    return lines


def _warnings(m: Material) -> list[str]:
    return [str(text) for text in m.results.get("warnings") or []]
