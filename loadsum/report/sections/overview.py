"""Several transformers in one study: all of them in one table, and a section for each that needs attention."""

from collections.abc import Sequence
from typing import Any

from loadsum.report.material import Material, Section, Unit
from loadsum.report.sections.verdict import needs_attention, verdict

MOST_IN_DETAIL = 12


def units_in_detail(m: Material) -> Sequence[Unit]:
    """Transformers that get sections of their own: the only one, or those that need attention."""
    if len(m.units) == 1:
        return m.units
    return [unit for unit in m.units if needs_attention(unit)][:MOST_IN_DETAIL]


def table(m: Material, units: Sequence[Unit]) -> list[dict[str, Any]]:
    """One line a transformer."""
    rows = []
    for unit in units:
        found = verdict(m, unit)
        installed = unit.results.get("installed_kva")
        rows.append(
            {
                "id": unit.id,
                "installed": m.plain(installed) if installed else m.n.none,
                "verdict": unit.results.get("reason") or found.sentence,
                "hours": m.hours(found.hours),
                "anchor": "",
            }
        )
    return rows


def section(m: Material) -> Section:
    """All transformers of the study."""
    detailed = {unit.index for unit in units_in_detail(m)}
    rows = table(m, m.units)
    for unit, row in zip(m.units, rows, strict=True):
        row["anchor"] = f"unit-{unit.index + 1}" if unit.index in detailed else ""
    return Section(block="overview", title=m.t("section.overview"), content={"rows": rows})


def unit_section(m: Material, unit: Unit, parts: Sequence[Section]) -> Section:
    """One transformer of several."""
    found = verdict(m, unit)
    reason = unit.results.get("reason") or ""
    return Section(
        block="unit",
        unit=unit.index,
        title=m.t("word.transformer", id=unit.id),
        content={"parts": parts, "lines": [reason] if reason else [found.sentence, *found.reasons]},
    )
