"""The ratings compared: hours, probability, criteria, margins."""

from typing import Any

from loadsum.report.material import Material, Section, Unit
from loadsum.report.sections.verdict import exceedance_rows


def section(m: Material, unit: Unit) -> Section | None:
    """Table of ratings and table of criteria of one transformer."""
    if not exceedance_rows(unit.results):
        return None
    return Section(
        block="ratings",
        unit=unit.index if unit.several else -1,
        title=m.t("section.ratings"),
        content=_tables(m, unit),
    )


def _tables(m: Material, unit: Unit) -> dict[str, Any]:
    selection = unit.part("selection") or {}
    chosen = selection.get("rating_kva")
    rows = [
        {
            "rating": m.plain(row.get("rating_kva")),
            "chosen": row.get("rating_kva") == chosen,
            "of": m.t.name("loading", str(row.get("of"))),
            "level": m.plain(row.get("level_kva"), 1),
            "hours": m.hours(row.get("hours_per_year")),
            "interval": m.between(row.get("hours_low"), row.get("hours_high"), m.hours),
            "highest": m.n.probability(row.get("highest_probability"), row.get("floor")),
            "where": m.hour_class(row.get("highest_at")),
            "normal": _factor(m, row.get("normal_factor")),
        }
        for row in exceedance_rows(unit.results)
    ]
    criteria = [
        {
            "name": m.t.name("criterion", criterion.get("quantity", "")),
            "of": m.t.name("loading", criterion.get("of", "")),
            "limit": m.n.significant(criterion.get("limit")),
            "statistic": criterion.get("statistic", ""),
            "source": criterion.get("source") or m.t("ratings.untraced"),
            "by_rating": [
                {
                    "rating": m.plain(row.get("rating_kva")),
                    "value": m.n.significant(row.get("value")),
                    "margin": m.n.significant(row.get("margin")),
                    "meets": m.t("word.yes" if row.get("meets") else "word.no"),
                }
                for row in criterion.get("by_rating") or ()
            ],
        }
        for criterion in selection.get("criteria") or ()
    ]
    return {"rows": rows, "criteria": criteria}


def _factor(m: Material, factor: float | None) -> str:
    return m.n.none if factor is None else m.n.significant(factor, 2)
