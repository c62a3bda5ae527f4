"""Load to come and room left for it."""

from collections.abc import Mapping
from typing import Any

from loadsum.report.material import Material, Section, Unit


def section(m: Material, unit: Unit) -> Section | None:
    """Scenarios side by side, and the headroom of each rating."""
    scenarios, headroom = unit.rows("scenarios"), unit.rows("headroom")
    if not scenarios and not headroom:
        return None
    ratings = list(dict.fromkeys(row.get("rating_kva") for one in scenarios for row in one.get("by_rating") or ()))
    content: dict[str, Any] = {
        "ratings": [m.kva(rating) for rating in ratings],
        "scenarios": [
            {
                "name": one.get("name", ""),
                "note": one.get("note", ""),
                "cells": [
                    {
                        "hours": m.hours(found.get("hours_per_year")),
                        "notes": _notes(m, found),
                    }
                    for found in (_of(one, rating) for rating in ratings)
                ],
            }
            for one in scenarios
        ],
        "headroom": [
            {
                "rating": m.kva(row.get("rating_kva")),
                "what": row.get("what", ""),
                "count": _count(m, row),
                "kw": m.n.fixed(row.get("kw"), 1),
                "limited_by": m.t.name("criterion", str(row.get("limited_by") or "")) or m.n.none,
            }
            for row in headroom
        ],
    }
    return Section(
        block="scenarios",
        unit=unit.index if unit.several else -1,
        title=m.t("section.scenarios"),
        content=content,
        figures=(unit.figure("scenarios"),),
    )


def _notes(m: Material, found: Mapping[str, Any]) -> list[str]:
    """What is to be said of one scenario at one rating beside its hours."""
    notes = []
    if found.get("pickup_hours_per_outage") is not None:
        notes.append(m.t("scenarios.pickup", hours=m.hours(found["pickup_hours_per_outage"])))
    if found.get("meets") is False:
        notes.append(m.t("outcome.not met"))
    elif found.get("first_year"):
        notes.append(m.t("scenarios.fails", year=found["first_year"]))
    return notes


def _count(m: Material, row: Mapping[str, Any]) -> str:
    count = row.get("count")
    if count is None:
        return m.t("scenarios.none_at_all")
    return m.t("scenarios.at_least", count=m.n.fixed(count)) if row.get("at_least") else m.n.fixed(count)


def _of(scenario: Any, rating_kva: Any) -> dict[str, Any]:
    for row in scenario.get("by_rating") or ():
        if row.get("rating_kva") == rating_kva:
            return dict(row)
    return {}
