"""Sections of the report in the order a reviewer asks; each is left out where the results hold nothing for it."""

from collections.abc import Callable, Sequence

from loadsum.report.material import Material, Section, Unit
from loadsum.report.sections import (
    data,
    demand,
    evidence,
    first_page,
    foundations,
    future,
    overview,
    peaks,
    ratings,
    reconciliation,
    sign_off,
    thermal,
)

OF_A_TRANSFORMER: Sequence[Callable[[Material, Unit], Section | None]] = (
    ratings.section,
    demand.map_section,
    demand.curve_section,
    demand.diagnostics_section,
    peaks.section,
    peaks.diversity_section,
    thermal.section,
    thermal.losses_section,
    future.section,
    evidence.section,
)
# A study of several transformers stays readable: those that need attention get these, the rest is in results.json.
OF_ONE_OF_SEVERAL: Sequence[Callable[[Material, Unit], Section | None]] = (
    ratings.section,
    demand.map_section,
    demand.curve_section,
    thermal.section,
)
OF_THE_STUDY: Sequence[Callable[[Material], Section | None]] = (
    data.section,
    reconciliation.section,
    foundations.method_section,
    foundations.assumptions_section,
    foundations.cautions_section,
    foundations.unchecked_section,
    foundations.inputs_section,
    foundations.references_section,
    sign_off.section,
)


def sections(m: Material, units: Sequence[Unit]) -> tuple[Section, ...]:
    """Every section that the results can fill.

    Parameters
    ----------
    m : Material
        Results and words.
    units : sequence of Unit
        Transformers that get sections of their own; with several in the study each gets one with parts.
    """
    made: list[Section | None] = []
    if len(m.units) > 1:
        made.append(overview.section(m))
    for unit in units:
        makers = OF_ONE_OF_SEVERAL if unit.several else OF_A_TRANSFORMER
        parts = [part for part in (make(m, unit) for make in makers) if part is not None]
        if unit.several:
            made.append(overview.unit_section(m, unit, parts))
        else:
            made.extend(parts)
    made.extend(make(m) for make in OF_THE_STUDY)
    return tuple(section for section in made if section is not None)


__all__ = ["first_page", "sections"]
