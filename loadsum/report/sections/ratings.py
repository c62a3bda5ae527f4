"""The ratings compared: hours, probability, criteria, margins."""

from collections.abc import Mapping, Sequence
from typing import Any

from loadsum.report.material import Material, Section, Unit
from loadsum.report.notation import NO_BREAK
from loadsum.report.sections.verdict import exceedance_rows, limit_text, meets_text, quantity_text

WITHIN = 0.01  # width of the rounding bracket, relative to its upper end, that is asked of the study
NO_WIDTH = 1e-9  # width below which nothing was rounded
LEAST_H = 1e-4  # expected hours a year below which a bracket says nothing


def section(m: Material, unit: Unit) -> Section | None:
    """Table of ratings and table of criteria of one transformer."""
    rows = exceedance_rows(unit.results)
    if not rows:
        return None
    return Section(
        block="ratings",
        unit=unit.index if unit.several else -1,
        title=m.t("section.ratings"),
        content={
            "rows": [_row(m, unit, row) for row in rows],
            "rounding": rounding_text(m, rows),
            "several_loadings": len({row.get("of") for row in rows}) > 1,
            "estimated": estimated(m, unit),
            "criteria": criteria(m, unit),
            "ratings": [m.kva(rating) for rating in _ratings(unit)],
        },
        figures=(unit.figure("criterion-margins"), unit.figure("what-moves")),
    )


def _row(m: Material, unit: Unit, row: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "rating": m.plain(row.get("rating_kva")),
        "chosen": row.get("rating_kva") == (unit.part("selection") or {}).get("rating_kva"),
        "of": m.t.name("loading_short", str(row.get("of"))),
        "level": m.plain(row.get("level_kva"), 1),
        "hours": m.hours(row.get("hours_per_year")),
        "interval": m.between(row.get("hours_low"), row.get("hours_high"), m.hours),
        "highest": m.n.probability(row.get("highest_probability"), row.get("floor")),
        "where": m.hour_class(row.get("highest_at")),
        "normal": _factor(m, row.get("normal_factor")),
    }


def rounding_text(m: Material, rows: Sequence[Mapping[str, Any]]) -> str:
    """How far rounding to the lattice leaves the expected hours open; empty where the results do not say.

    The widest bracket, relative to its upper end, of the rows whose upper end is not beyond all record.
    """
    ends = [(row.get("hours_lower"), row.get("hours_upper"), row) for row in rows]
    known = [(low, high, row) for low, high, row in ends if low is not None and high is not None and high > LEAST_H]
    if not known:
        return ""
    low, high, row = max(known, key=lambda one: (one[1] - one[0]) / one[1])
    width = (high - low) / high
    if width < NO_WIDTH:
        return m.t("ratings.rounding_none")
    said = {"width": m.n.significant(100.0 * width, 2), "level": m.kva(row.get("level_kva"))}
    return m.t("ratings.rounding_within" if width <= WITHIN else "ratings.rounding_wide", **said)


def _factor(m: Material, factor: float | None) -> str:
    if factor is None:
        return m.n.none
    return m.n.significant(factor, 2) if factor >= 0.001 else "<" + NO_BREAK + m.n.fixed(0.001, 3)


def _ratings(unit: Unit) -> Sequence[float]:
    """Ratings that the criteria speak of."""
    listed = [
        row["rating_kva"]
        for criterion in (unit.part("selection") or {}).get("criteria") or ()
        for row in criterion.get("by_rating") or ()
    ]
    return list(dict.fromkeys(listed))


def estimated(m: Material, unit: Unit) -> dict[str, Any] | None:
    """Expected hours without the estimated readings and with them; None where there are none."""
    found = unit.part("estimated")
    if not found:
        return None
    share = found.get("share") or 0.0
    return {
        "said": m.t(
            "ratings.estimated",
            readings=m.n.fixed(found.get("readings")),
            customers=m.n.fixed(found.get("customers")),
            share=m.n.percent(share, 1) if share >= 0.0005 else "<" + NO_BREAK + m.n.percent(0.001, 1),
            without=m.n.fixed(found.get("left_out_covered_h")),
            taken=m.n.fixed(found.get("taken_in_covered_h")),
        ),
        "rows": [
            {
                "rating": m.plain(row.get("rating_kva")),
                "of": m.t.name("loading", str(row.get("of"))),
                "left_out": m.hours(row.get("left_out_h")),
                "taken_in": m.hours(row.get("taken_in_h")),
            }
            for row in found.get("rows") or ()
        ],
    }


def criteria(m: Material, unit: Unit) -> list[dict[str, Any]]:
    """Every criterion with its value and margin for each rating."""
    found = []
    for criterion in (unit.part("selection") or {}).get("criteria") or ():
        by_rating = {row["rating_kva"]: row for row in criterion.get("by_rating") or ()}
        quantity = str(criterion.get("quantity", ""))
        found.append(
            {
                "name": m.t.name("criterion", quantity),
                "of": m.t.name("loading", str(criterion.get("of", ""))),
                "limit": limit_text(m, quantity, criterion.get("limit")),
                "statistic": m.t.name("statistic", str(criterion.get("statistic", ""))),
                "source": criterion.get("source") or m.t("ratings.untraced"),
                "cells": [_cell(m, quantity, by_rating.get(rating)) for rating in _ratings(unit)],
            }
        )
    return found


def _cell(m: Material, quantity: str, row: Mapping[str, Any] | None) -> dict[str, str]:
    if row is None:
        return {"value": m.n.none, "meets": ""}
    return {
        "value": quantity_text(m, quantity, row.get("value"), row.get("floor")),
        "meets": meets_text(m, row) + (", " + m.t("ratings.governs") if row.get("governs") else ""),
    }
