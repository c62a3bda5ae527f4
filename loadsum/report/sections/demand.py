"""Demand over the year: when the rating is exceeded, and by how much."""

from collections.abc import Mapping
from typing import Any

from loadsum.report.material import Material, Section, Unit
from loadsum.report.notation import NO_BREAK

MANY_TIMES = 1e6


def map_section(m: Material, unit: Unit) -> Section | None:
    """Hour by season: exceedance map and quantiles of demand."""
    if not unit.rows("hours"):
        return None
    return Section(
        block="hours",
        unit=unit.index if unit.several else -1,
        title=m.t("section.hours"),
        content={"interval": m.interval_min},
        figures=(unit.figure("exceedance-map"), unit.figure("demand-by-hour")),
    )


def diagnostics_section(m: Material, unit: Unit) -> Section | None:
    """What justifies the model on these readings: correlation, variance against the observed sum, temperature."""
    rows = unit.rows("diagnostics")
    if not rows:
        return None
    below = max((row.get("share_below_zero") or 0.0 for row in rows), default=0.0)
    outside = max((row.get("record_days_outside") or 0 for row in rows), default=0)
    notes = []
    if below > 0.0:
        notes.append(m.t("diagnostics.below_zero", share=m.n.percent(below, 1)))
    if outside:
        notes.append(m.t("diagnostics.outside", days=sum(row.get("record_days_outside") or 0 for row in rows)))
    return Section(
        block="diagnostics",
        unit=unit.index if unit.several else -1,
        title=m.t("section.diagnostics"),
        content={
            "rows": [
                {
                    "class": ", ".join(str(row[k]) for k in ("season", "day_type") if row.get(k)),
                    "days": m.n.fixed(row.get("days")),
                    "correlation": m.n.fixed(row.get("correlation"), 2),
                    "correlation_interval": m.between(
                        row.get("correlation_low"), row.get("correlation_high"), lambda r: m.n.fixed(r, 2)
                    ).replace(" ", NO_BREAK),
                    "variance": m.n.fixed(row.get("variance_ratio"), 2),
                    "temperature": m.n.percent(row.get("temperature_explains"), 2)
                    if row.get("temperature_explains")
                    else m.n.none,
                }
                for row in rows
            ],
            "notes": notes,
        },
    )


def curve_section(m: Material, unit: Unit) -> Section | None:
    """Exceedance against level, the adopted model beside the customary ones."""
    if not unit.part("curve"):
        return None
    return Section(
        block="curve",
        unit=unit.index if unit.several else -1,
        title=m.t("section.curve"),
        content=_normal_family(m, unit),
        figures=(unit.figure("exceedance-curve"), unit.figure("normal-factor")),
    )


def _normal_family(m: Material, unit: Unit) -> dict[str, Any]:
    """Rows of the normal family at each rating, and from how many customers on the normal law would do."""
    found = unit.part("normal_family")
    if not found or not found.get("by_rating"):
        return {"family": [], "notes": []}
    rows = found["by_rating"]
    distances = [row["largest_distance"] for row in rows if row.get("largest_distance") is not None]
    notes = []
    if found.get("independent") and found.get("together"):
        alone, together = ([_reach(m, one) for one in found[name]] for name in ("independent", "together"))
        customers = m.n.fixed(found["customers"])
        notes.append(
            m.t("curve.reach", where=_where(m, found), percent=alone[0], permille=alone[1], customers=customers)
        )
        never = m.t("curve.reach_never")
        if together == [never, never]:
            notes.append(m.t("curve.reach_never_together"))
        else:
            notes.append(m.t("curve.reach_together", percent=together[0], permille=together[1]))
    if distances:
        notes.append(m.t("curve.distance", low=m.n.fixed(min(distances), 2), high=m.n.fixed(max(distances), 2)))
    return {"family": [_normal_row(m, row) for row in rows], "notes": notes}


def _normal_row(m: Material, row: Mapping[str, Any]) -> dict[str, str]:
    times = row.get("times_too_small")
    cumulants = row.get("cumulant_corrected")
    return {
        "rating": m.plain(row["rating_kva"]),
        "where": _where(m, row),
        "adopted": m.n.probability(row["adopted"], row["floor"]),
        "normal": m.n.percent(row["normal_covariance"]),
        "independent": m.n.percent(row["normal_independent"]),
        "cumulants": m.t("curve.below_zero") if cumulants is not None and cumulants < 0.0 else m.n.percent(cumulants),
        "saddlepoint": m.n.percent(row.get("saddlepoint")),
        "times": _times(m, times),
    }


def _times(m: Material, times: float | None) -> str:
    """How many times too small, as far as a figure says more than a word."""
    if times is None or times > MANY_TIMES:
        return m.t("curve.times_many")
    return m.t("curve.times", factor=m.n.significant(times, 2))


def _where(m: Material, row: Mapping[str, Any]) -> str:
    minutes = row["interval"] * m.interval_min
    return f"{row['season']}, {row['day_type']}, {minutes // 60:02d}:{minutes % 60:02d}"


def _reach(m: Material, one: Mapping[str, Any]) -> str:
    if one.get("customers") is not None:
        return m.t("curve.reach_from", count=m.n.significant(float(one["customers"]), 2))
    if not one.get("tried"):
        return m.t("curve.reach_never")
    return m.t("curve.reach_not", count=m.n.fixed(one["tried"][-1][0]))
