"""The ratings compared: hours, probability, criteria, margins."""

from collections.abc import Mapping
from typing import Any

from loadsum.report.material import Material, Section
from loadsum.report.sections.verdict import exceedance_rows


def section(m: Material) -> Section | None:
    """Table of ratings and table of criteria for each transformer."""
    tables = [_transformer(m, transformer) for transformer in m.transformers if exceedance_rows(transformer)]
    if not tables:
        return None
    return Section(
        anchor="ratings",
        title=m.t("section.ratings"),
        content={"transformers": tables, "several": len(m.transformers) > 1},
    )


def _transformer(m: Material, transformer: Mapping[str, Any]) -> dict[str, Any]:
    selection = transformer.get("selection") or {}
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
        for row in exceedance_rows(transformer)
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
    return {"id": transformer.get("id") or "", "rows": rows, "criteria": criteria}


def _factor(m: Material, factor: float | None) -> str:
    return m.n.none if factor is None else m.n.significant(factor, 2)
