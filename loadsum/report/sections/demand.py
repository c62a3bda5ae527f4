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
