"""Demand over the year: when the rating is exceeded, and by how much."""

from loadsum.report.material import Material, Section, Unit


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
        content={},
        figures=(unit.figure("exceedance-curve"), unit.figure("normal-factor")),
    )
