"""Sections of the report in the order a reviewer asks; each is left out where the results hold nothing for it."""

from collections.abc import Callable, Sequence

from loadsum.report.material import Material, Section
from loadsum.report.sections import data, demand, first_page, foundations, ratings, sign_off

SECTIONS: Sequence[Callable[[Material], Section | None]] = (
    ratings.section,
    demand.map_section,
    demand.curve_section,
    data.section,
    foundations.method_section,
    foundations.assumptions_section,
    foundations.cautions_section,
    foundations.unchecked_section,
    foundations.inputs_section,
    foundations.references_section,
    sign_off.section,
)


def sections(material: Material) -> tuple[Section, ...]:
    """Every section that the results can fill."""
    return tuple(s for s in (make(material) for make in SECTIONS) if s is not None)


__all__ = ["first_page", "sections"]
