"""Figures of the report, each telling one thing, readable in black and white."""

from collections.abc import Callable, Mapping, Sequence

from loadsum.report.figures import (
    calibration,
    criterion_margins,
    demand_by_hour,
    exceedance_curve,
    exceedance_map,
    hot_spot,
    maximum_by_number,
    normal_factor,
    pit_histogram,
    quality_calendar,
    rare_levels,
    reconciliation,
    scenarios,
    what_moves,
)
from loadsum.report.figures.plate import DrawnFigure, png, svg
from loadsum.report.material import Material, Unit

OF_A_TRANSFORMER: Sequence[Callable[[Material, Unit], DrawnFigure | None]] = (
    criterion_margins.figure,
    what_moves.figure,
    exceedance_map.figure,
    demand_by_hour.figure,
    exceedance_curve.figure,
    normal_factor.figure,
    rare_levels.figure,
    maximum_by_number.figure,
    hot_spot.figure,
    scenarios.figure,
    calibration.figure,
    pit_histogram.figure,
)
OF_ONE_OF_SEVERAL: Sequence[Callable[[Material, Unit], DrawnFigure | None]] = (
    exceedance_map.figure,
    exceedance_curve.figure,
)
OF_A_TEST: Sequence[Callable[[Material, Unit], DrawnFigure | None]] = (calibration.figure, pit_histogram.figure)
OF_THE_STUDY: Sequence[Callable[[Material], DrawnFigure | None]] = (quality_calendar.figure, reconciliation.figure)


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


def of_a_test(m: Material) -> dict[str, DrawnFigure]:
    """Figures of a hold-out test that is a document of its own, by name."""
    made = [make(m, unit) for unit in m.units for make in OF_A_TEST]
    return {figure.name: figure for figure in made if figure is not None}


def files(figures: Mapping[str, DrawnFigure], drawings: Mapping[str, bytes]) -> dict[str, bytes]:
    """Every figure as SVG and as PNG at print size, by file name, for pasting into other documents.

    Parameters
    ----------
    figures : mapping of str to DrawnFigure
        Figures by name.
    drawings : mapping of str to bytes
        The same as SVG, as the report has them.
    """
    made: dict[str, bytes] = {}
    for name, figure in figures.items():
        made[f"{name}.svg"] = drawings[name]
        made[f"{name}.png"] = png(figure.figure)
    return made


__all__ = ["DrawnFigure", "drawn", "files", "of_a_test", "png", "svg"]
