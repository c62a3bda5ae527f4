"""Peaks of the day and of the year, and the diversity of the group."""

from collections.abc import Mapping
from typing import Any

from loadsum.report.material import Material, Section, Unit
from loadsum.report.notation import NO_BREAK

FACTORS = (
    "maximum_kw",
    "sum_of_maxima_kw",
    "coincidence_factor",
    "diversity_factor",
    "admd_kw",
    "load_factor",
    "loss_factor",
    "loss_factor_by_formula",
    "utilisation_factor",
)


def section(m: Material, unit: Unit) -> Section | None:
    """Levels that days and years pass, and how often each rating is passed."""
    found = unit.part("peaks")
    if not found:
        return None
    return Section(
        block="peaks",
        unit=unit.index if unit.several else -1,
        title=m.t("section.peaks"),
        content={
            "assumption": _sentence(found.get("assumption")),
            "copula": str(found.get("copula") or ""),
            "rare": [_rare(m, row, "day") for row in found.get("daily") or ()]
            + [_rare(m, row, "year") for row in found.get("annual") or ()],
            "levels": [_level(m, row) for row in found.get("levels") or ()],
            "shifts": any(row.get("shift_kva") is not None for row in found.get("annual") or ()),
            "weather": _weather(m, found.get("weather_years")),
        },
        figures=(unit.figure("rare-levels"),),
    )


def _weather(m: Material, years: int | None) -> str:
    """How many years of temperature the annual figures are averaged over."""
    if not years:
        return ""
    return m.t("peaks.weather_once") if years == 1 else m.t("peaks.weather", years=years)


def _sentence(text: Any) -> str:
    """A text of the results as a sentence."""
    words = str(text or "").strip().rstrip(".")
    return words[:1].upper() + words[1:] + "." if words else ""


def one_in(m: Material, probability: float | None, period: str) -> str:
    """A probability per day or year as ``1 year in 10``."""
    if not probability:
        return m.n.none
    return m.t(f"peaks.one_{period}_in", count=m.plain(1.0 / probability, 1))


def _rare(m: Material, row: Mapping[str, Any], period: str) -> dict[str, Any]:
    level = m.n.fixed(row.get("level_kva"), 1)
    shift = row.get("shift_kva")
    return {
        "passed": one_in(m, row.get("probability"), period),
        "level": level if row.get("supported", True) else m.t("peaks.beyond", level=level),
        "between": m.between(row.get("lowest_kva"), row.get("highest_kva"), lambda v: m.n.fixed(v, 1)),
        "shift": m.n.none if shift is None else ("+" if shift > 0 else "") + m.n.fixed(shift, 1),
    }


def _level(m: Material, row: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "name": row.get("name", ""),
        "days": m.hours(row.get("days_per_year")),
        "year": m.n.percent(row.get("year")),
        "between": m.between(row.get("year_at_least"), row.get("year_at_most"), m.n.percent),
    }


def diversity_section(m: Material, unit: Unit) -> Section | None:
    """Coincidence and diversity factors, demand after diversity, load and loss factor, maximum against number."""
    found = unit.part("diversity")
    if not found:
        return None
    units = {"admd_kw": "kW", "maximum_kw": "kW", "sum_of_maxima_kw": "kW"}
    rows = [
        {
            "name": m.t(f"diversity.{name}"),
            "value": m.n.fixed(found[name], 2) + (NO_BREAK + units[name] if name in units else ""),
        }
        for name in FACTORS
        if found.get(name) is not None
    ]
    return Section(
        block="diversity",
        unit=unit.index if unit.several else -1,
        title=m.t("section.diversity"),
        content={"rows": rows, "period": _period(m, found), "laws": _laws(m, found), "customers": _number(found)},
        figures=(unit.figure("maximum-by-number"),),
    )


def _period(m: Material, found: Mapping[str, Any]) -> str:
    if not found.get("period_h"):
        return ""
    return m.t("diversity.period", hours=m.n.fixed(found["period_h"]), customers=found.get("customers"))


def _number(found: Mapping[str, Any]) -> int:
    """Largest number of customers that the laws are compared at."""
    return int(max((found.get("growth") or {}).get("customers") or [0]))


def _laws(m: Material, found: Mapping[str, Any]) -> list[dict[str, str]]:
    """Each law at the largest number of customers, and how far it is off there."""
    return [
        {
            "name": str(law.get("name", "")),
            "source": str(law.get("source") or m.t("ratings.untraced")),
            "kw": m.n.fixed((law.get("kw") or [None])[-1], 1),
            "over": m.n.fixed((law.get("over_expected") or [None])[-1], 2),
        }
        for law in found.get("laws") or ()
    ]
