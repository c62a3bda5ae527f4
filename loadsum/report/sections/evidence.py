"""The model tested on readings it had not seen, for a reader who is no statistician."""

from collections.abc import Mapping
from typing import Any

from loadsum.report.material import Material, Section, Unit
from loadsum.report.notation import NO_BREAK


def section(m: Material, unit: Unit) -> Section | None:
    """One sentence, one figure, one table."""
    found = unit.part("evidence")
    if not found:
        return None
    levels = found.get("levels") or ()
    return Section(
        block="evidence",
        unit=unit.index if unit.several else -1,
        title=m.t("section.evidence"),
        content={
            "sentence": str(found.get("sentence") or ""),
            "how": str(found.get("how") or ""),
            "rows": [_row(m, row) for row in levels if row.get("model", "adopted") == "adopted"],
            "others": [_other(m, row) for row in found.get("models") or ()],
        },
        figures=(unit.figure("calibration"), unit.figure("pit-histogram")),
    )


def _row(m: Material, row: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "level": m.plain(100.0 * (row.get("expected_share") or 0.0)) + NO_BREAK + "%",
        "expected": m.n.fixed(row.get("expected_count"), 1),
        "found": m.n.fixed(row.get("observed_count")),
        "share": m.n.percent(row.get("observed_share"), 2),
        "chance": m.between(row.get("chance_low"), row.get("chance_high"), lambda v: m.n.percent(v, 2)),
    }


def _other(m: Material, row: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "name": m.t.name("model", str(row.get("model") or "")),
        "loss": m.n.significant(row.get("pinball_kw"), 3),
        "crps": m.n.significant(row.get("crps_kw"), 3),
    }
