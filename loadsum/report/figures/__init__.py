"""Figures of the report, each telling one thing, readable in black and white."""

from collections.abc import Callable, Mapping, Sequence
from typing import Any

from loadsum.report.figures import (
    calibration,
    criterion_margins,
    demand_by_hour,
    exceedance_curve,
    exceedance_map,
    hot_spot,
    maximum_by_number,
    normal_factor,
    quality_calendar,
    rare_levels,
    scenarios,
)
from loadsum.report.figures.plate import DrawnFigure, png, svg
from loadsum.report.material import Material, Unit

OF_A_TRANSFORMER: Sequence[Callable[[Material, Unit], DrawnFigure | None]] = (
    criterion_margins.figure,
    exceedance_map.figure,
    demand_by_hour.figure,
    exceedance_curve.figure,
    normal_factor.figure,
    rare_levels.figure,
    maximum_by_number.figure,
    hot_spot.figure,
    scenarios.figure,
    calibration.figure,
)
OF_ONE_OF_SEVERAL: Sequence[Callable[[Material, Unit], DrawnFigure | None]] = (
    exceedance_map.figure,
    exceedance_curve.figure,
)
OF_THE_STUDY: Sequence[Callable[[Material], DrawnFigure | None]] = (quality_calendar.figure,)


def drawn(m: Material, units: Sequence[Unit]) -> dict[str, DrawnFigure]:
    """Every figure that the results can fill, by name.

    Parameters
    ----------
    m : Material
        Results and words.
    units : sequence of Unit
        Transformers whose figures are wanted.
    """
    made = [make(m, unit) for unit in units for make in (OF_ONE_OF_SEVERAL if unit.several else OF_A_TRANSFORMER)]
    made += [make(m) for make in OF_THE_STUDY]
    return {figure.name: figure for figure in made if figure is not None}


def draw(results: Mapping[str, Any]) -> dict[str, bytes]:
    """Every figure as SVG and as PNG at print size, by file name, for pasting into other documents.

    Parameters
    ----------
    results : mapping
        Results as read from results.json.

    Raises
    ------
    InputError
        A character of the results is in no font of the report.
    """
    from loadsum.report.document import material
    from loadsum.report.sections.overview import units_in_detail

    m, _ = material(results)
    files: dict[str, bytes] = {}
    for name, figure in drawn(m, units_in_detail(m)).items():
        files[f"{name}.svg"] = svg(figure.figure)
        files[f"{name}.png"] = png(figure.figure)
    return files


__all__ = ["DrawnFigure", "draw", "drawn", "png", "svg"]
