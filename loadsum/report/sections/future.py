"""Load to come and room left for it."""

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
                        "fails": m.t("scenarios.fails", year=found["first_year"]) if found.get("first_year") else "",
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
                "count": m.n.fixed(row.get("count")),
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


def _of(scenario: Any, rating_kva: Any) -> dict[str, Any]:
    for row in scenario.get("by_rating") or ():
        if row.get("rating_kva") == rating_kva:
            return dict(row)
    return {}
