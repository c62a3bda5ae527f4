"""The customers' sum against the meter of the group."""

from collections.abc import Mapping
from typing import Any

from loadsum.report.figures.reconciliation import NAME, overall
from loadsum.report.material import Material, Section

LONGEST_TABLE = 24


def section(m: Material) -> Section | None:
    """One row for each meter, season and day type; longest tables are cut and said to be in the results."""
    found = m.rows("reconciliation")
    if not found:
        return None
    rows = [_row(m, group, part) for group in found for part in group.get("by_class") or ()]
    return Section(
        block="reconciliation",
        title=m.t("section.reconciliation"),
        content={
            "said": [_said(m, group) for group in found[:LONGEST_TABLE]],
            "rows": rows[:LONGEST_TABLE],
            "more": max(len(rows) - LONGEST_TABLE, len(found) - LONGEST_TABLE, 0),
            "several": len(found) > 1,
        },
        figures=(NAME,),
    )


def name_of(m: Material, group: Mapping[str, Any]) -> str:
    """What a meter measures, in words."""
    return str(group.get("transformer") or m.t("reconciliation.whole"))


def _said(m: Material, group: Mapping[str, Any]) -> str:
    return m.t(
        "reconciliation.said",
        meter=name_of(m, group),
        customers=m.n.fixed(group.get("customers")),
        intervals=m.n.fixed(group.get("intervals")),
        measured=m.n.fixed(group.get("measured_kwh")),
        summed=m.n.fixed(group.get("summed_kwh")),
        share=m.n.percent(group.get("unaccounted_share")),
        every=m.n.percent(group.get("every_hour_share")),
    )


def _row(m: Material, group: Mapping[str, Any], part: Mapping[str, Any]) -> dict[str, str]:
    measured, summed = overall(part.get("measured_kw")), overall(part.get("summed_kw"))
    apart = [(value, n) for n, value in enumerate(part.get("unaccounted_kw") or ()) if value is not None]
    most, at = max(apart, key=lambda pair: abs(pair[0])) if apart else (None, 0)
    share = None if measured is None or summed is None or measured == 0.0 else (measured - summed) / measured
    return {
        "meter": name_of(m, group),
        "class": ", ".join((str(part.get("season", "")), str(part.get("day_type", "")))),
        "measured": m.n.fixed(measured, 2),
        "summed": m.n.fixed(summed, 2),
        "share": m.n.percent(share),
        "most": m.n.fixed(most, 2),
        "at": f"{at * m.interval_min // 60:02d}:{at * m.interval_min % 60:02d}",
    }
