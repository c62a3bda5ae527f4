"""What the loading does to the transformer: temperature, ageing, losses, cost."""

from collections.abc import Mapping
from typing import Any

from loadsum.report.material import Material, Section, Unit


def section(m: Material, unit: Unit) -> Section | None:
    """Hot spot, top oil and ageing of each rating."""
    found = unit.part("thermal")
    if not found or not found.get("by_rating"):
        return None
    return Section(
        block="thermal",
        unit=unit.index if unit.several else -1,
        title=m.t("section.thermal"),
        content={
            "model": str(found.get("model") or ""),
            "rows": [_row(m, unit, row) for row in found["by_rating"]],
            "beside": _beside(m, found, unit.part("thermal_beside")),
            "assumed": [str(text) for text in found.get("assumed") or ()],
        },
        figures=(unit.figure("hot-spot"),),
    )


def _beside(m: Material, found: Mapping[str, Any], other: Mapping[str, Any] | None) -> dict[str, Any]:
    """Both guides on the same drawn years, one row a rating; empty where the other was not asked for."""
    if not other:
        return {}
    rows = [
        {
            "rating": m.plain(own["rating_kva"]),
            "cells": [
                form(row.get(part))
                for part, form in (
                    ("hot_spot_yearly_high_c", m.temperature),
                    ("top_oil_yearly_high_c", m.temperature),
                    ("probability_above_limit", m.n.percent),
                    ("ageing_pu", m.n.percent),
                )
                for row in (own, its)
            ],
        }
        for own, its in zip(found["by_rating"], other["by_rating"], strict=True)
    ]
    names = [str(one.get("model") or "").partition(",")[0] for one in (found, other)]
    stated = [str(text) for text in other.get("assumed") or () if text not in (found.get("assumed") or ())]
    return {"names": names, "rows": rows, "assumed": stated}


def _row(m: Material, unit: Unit, row: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "rating": m.plain(row.get("rating_kva")),
        "chosen": row.get("rating_kva") == (unit.part("selection") or {}).get("rating_kva"),
        "hot_spot": m.temperature(row.get("hot_spot_yearly_high_c")),
        "rare": m.temperature(row.get("hot_spot_1_year_in_10_c")),
        "top_oil": m.temperature(row.get("top_oil_yearly_high_c")),
        "above": m.n.percent(row.get("probability_above_limit")),
        "ageing": m.n.percent(row.get("ageing_pu")) if row.get("ageing_pu") is not None else m.n.none,
    }


def losses_section(m: Material, unit: Unit) -> Section | None:
    """Loss energy and cost of each rating."""
    found = unit.part("losses")
    if not found or not found.get("by_rating"):
        return None
    currency = str(found.get("currency") or "")
    rows = [
        {
            "rating": m.plain(row.get("rating_kva")),
            "chosen": row.get("rating_kva") == (unit.part("selection") or {}).get("rating_kva"),
            "no_load": m.n.fixed(row.get("no_load_kwh")),
            "load": m.n.fixed(row.get("load_kwh")),
            "worth": m.n.fixed(row.get("present_worth")),
            "owning": m.n.fixed(row.get("owning_cost")),
        }
        for row in found["by_rating"]
    ]
    return Section(
        block="losses",
        unit=unit.index if unit.several else -1,
        title=m.t("section.losses"),
        content={"rows": rows, "currency": currency, "money": any(row["worth"] != m.n.none for row in rows)},
    )
