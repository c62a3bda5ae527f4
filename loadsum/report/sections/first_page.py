"""Page 1: what was asked, what was found, what to do, what it rests on."""

from collections.abc import Mapping, Sequence
from typing import Any

from loadsum.report.figures.exceedance_curve import pooled_floor
from loadsum.report.material import Material, Unit
from loadsum.report.notation import NO_BREAK
from loadsum.report.sections.overview import table
from loadsum.report.sections.verdict import exceedance_of, exceedance_rows, meets_text, needs_attention, verdict

MOST_ON_FIRST_PAGE = 8
MOST_RATINGS = 6
MOST_WARNINGS = 3
HOURS_IN_YEAR = 8766.0


def content(m: Material) -> dict[str, Any]:
    """What page 1 prints."""
    return {
        "facts": _facts(m),
        "question": m.study.get("question") or m.t("first_page.no_question"),
        "finding": _finding(m, m.units[0]) if len(m.units) == 1 else None,
        "overview": _overview(m) if len(m.units) > 1 else None,
        "coverage": coverage(m),
        "rests_on": _rests_on(m),
        "warnings": _warnings(m),
        "status": m.t(f"status.{m.study.get('status') or 'draft'}.sentence"),
    }


def lines(first: Mapping[str, Any]) -> int:
    """Lines that page 1 will take, roughly, so that it can be set tighter when they are many."""
    finding, overview = first["finding"] or {}, first["overview"] or {}
    texts = [first["question"], *finding.get("lines", ()), finding.get("action", ""), first["coverage"]]
    texts += [*first["rests_on"], *first["warnings"], first["status"]]
    rows = [*finding.get("ratings", ()), *overview.get("rows", ())]
    return sum(1 + len(text) // 88 for text in texts) + len(rows) + (2 if rows else 0)


def _facts(m: Material) -> list[tuple[str, str]]:
    study = m.study
    return [
        (m.t("fact.reference"), study.get("reference") or m.n.none),
        (m.t("fact.revision"), study.get("revision") or m.n.none),
        (m.t("fact.date"), m.n.date(study.get("date"))),
        (m.t("fact.status"), m.t(f"status.{study.get('status') or 'draft'}.word")),
    ]


def _finding(m: Material, unit: Unit) -> dict[str, Any]:
    found = verdict(m, unit)
    reason = unit.results.get("reason")
    return {
        "rating": found.headline,
        "lines": [reason] if reason else [found.sentence, *found.reasons],
        "action": found.action,
        "ratings": _ratings(m, unit),
    }


def _ratings(m: Material, unit: Unit) -> list[dict[str, Any]]:
    """The few figures of each rating that answer the question at a glance."""
    chosen = (unit.part("selection") or {}).get("rating_kva")
    rows = []
    ratings = list(dict.fromkeys(row.get("rating_kva") for row in exceedance_rows(unit.results)))
    first = max(0, (ratings.index(chosen) if chosen in ratings else 0) - MOST_RATINGS + 2)
    for rating in ratings[first : first + MOST_RATINGS]:
        row = exceedance_of(unit.results, rating) or {}
        rows.append(
            {
                "rating": m.plain(rating),
                "chosen": rating == chosen,
                "hours": m.hours(row.get("hours_per_year")),
                "interval": m.between(row.get("hours_low"), row.get("hours_high"), m.hours),
                "highest": m.n.probability(row.get("highest_probability"), row.get("floor")),
                "meets": _meets_all(m, unit, rating),
            }
        )
    return rows


def _meets_all(m: Material, unit: Unit, rating: float | None) -> str:
    """Whether a rating meets every criterion; the worst outcome where it does not."""
    found = [
        row
        for criterion in (unit.part("selection") or {}).get("criteria") or ()
        for row in criterion.get("by_rating") or ()
        if row.get("rating_kva") == rating
    ]
    for wanted in (False, None, True):
        for row in found:
            if row.get("meets") is wanted:
                return m.t("word.no") if wanted is False else m.t("word.yes") if wanted else meets_text(m, row)
    return m.n.none


def _overview(m: Material) -> dict[str, Any]:
    """How many transformers need attention, and the first of them."""
    units = [unit for unit in m.units if needs_attention(unit)]
    return {
        "headline": m.t("first_page.of_units", count=len(units), all=len(m.units)),
        "rows": table(m, units[:MOST_ON_FIRST_PAGE]),
        "more": m.t("first_page.more_units", count=len(units) - MOST_ON_FIRST_PAGE)
        if len(units) > MOST_ON_FIRST_PAGE
        else "",
    }


def all_customers(m: Material) -> Sequence[Mapping[str, Any]]:
    """Customers of every transformer, each once."""
    listed = list(m.rows("customers"))
    if not listed:
        for unit in m.units:
            listed.extend(unit.rows("customers"))
    return list({str(row.get("id")): row for row in listed}.values())


def all_assumptions(m: Material) -> Sequence[Mapping[str, Any]]:
    """Assumptions of the study and of every transformer, each once."""
    listed = [*m.rows("assumptions"), *(row for unit in m.units if unit.several for row in unit.rows("assumptions"))]
    if len(m.units) == 1:
        listed = list(m.units[0].rows("assumptions"))
    return list(
        {(row.get("name"), row.get("value"), row.get("unit"), row.get("source")): row for row in listed}.values()
    )


def coverage(m: Material) -> str:
    """Whose readings, from when to when, and what part of the year they speak for."""
    c = m.part("coverage") or _worst_coverage(m)
    if not c:
        return m.t("first_page.no_coverage")
    metered = [row for row in all_customers(m) if row.get("readings")]
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


def _worst_coverage(m: Material) -> Mapping[str, Any] | None:
    """Coverage of the transformer with the least of it."""
    found = [unit.part("coverage") for unit in m.units if unit.part("coverage")]
    return min(found, key=lambda c: c.get("covered_hours") or 0.0) if found else None


def _rests_on(m: Material) -> list[str]:
    lines = [m.t("first_page.model", interval=f"{m.interval_min}{NO_BREAK}min")]
    count = len(all_assumptions(m))
    if count:
        lines.append(m.t("first_page.assumptions", count=count))
    lines.extend(_beyond(m))
    if not any(unit.part("evidence") for unit in m.units):
        lines.append(m.t("first_page.no_hold_out"))
    sentences = [text for unit in m.units for text, passed in _tested(unit) if passed]
    lines.extend([text for text in dict.fromkeys(sentences) if text][:2])
    return lines


def _beyond(m: Material) -> list[str]:
    """That expected hours so few come from the shape of the model, where page 1 prints such."""
    if len(m.units) != 1 or not m.units[0].part("curve"):
        return []
    unit = m.units[0]
    hours = pooled_floor(unit) * float((unit.part("coverage") or {}).get("covered_hours") or HOURS_IN_YEAR)
    few = any((row.get("hours_per_year") or 0.0) < hours for row in exceedance_rows(unit.results))
    return [m.t("first_page.beyond", hours=m.n.significant(hours, 1))] if few else []


def _warnings(m: Material) -> list[str]:
    """Warnings of the study, and every hold-out test that the model failed, in its own words."""
    failed = [
        (m.t("word.transformer", id=unit.id) + ": " if unit.several else "") + text
        for unit in m.units
        for text, passed in _tested(unit)
        if not passed
    ]
    return [*(str(text) for text in m.results.get("warnings") or []), *failed][:MOST_WARNINGS]


def _tested(unit: Unit) -> Sequence[tuple[str, bool]]:
    """The hold-out test's sentence and whether the model passed; empty where there was no test."""
    found = unit.part("evidence") or {}
    return [(str(found["sentence"]), found.get("passed") is not False)] if found.get("sentence") else []
