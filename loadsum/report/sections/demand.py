"""Demand over the year: when the rating is exceeded, and by how much."""

from loadsum.report.material import Material, Section


def map_section(m: Material) -> Section | None:
    """Hour by season: exceedance map and quantiles of demand."""
    if not m.rows("hours"):
        return None
    return Section(
        anchor="hours",
        title=m.t("section.hours"),
        content={"interval": m.interval_min},
        figures=("exceedance-map", "demand-by-hour"),
    )


def curve_section(m: Material) -> Section | None:
    """Exceedance against level, the adopted model beside the customary ones."""
    if not any(t.get("curve") for t in m.transformers):
        return None
    return Section(anchor="curve", title=m.t("section.curve"), content={}, figures=("exceedance-curve",))
