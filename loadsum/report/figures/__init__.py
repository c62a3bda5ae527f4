"""Figures of the report, each telling one thing, readable in black and white."""

from collections.abc import Callable, Mapping, Sequence
from typing import Any

from loadsum.report.figures import demand_by_hour, exceedance_curve, exceedance_map
from loadsum.report.figures.plate import DrawnFigure, png, svg
from loadsum.report.material import Material

FIGURES: Sequence[Callable[[Material], DrawnFigure | None]] = (
    exceedance_map.figure,
    demand_by_hour.figure,
    exceedance_curve.figure,
)


def drawn(m: Material) -> dict[str, DrawnFigure]:
    """Every figure that the results can fill, by name."""
    made = [make(m) for make in FIGURES]
    return {figure.name: figure for figure in made if figure is not None}


def draw(results: Mapping[str, Any]) -> dict[str, bytes]:
    """Every figure as SVG and as PNG at print size, by file name, for pasting into other documents.

    Parameters
    ----------
    results : mapping
        Results as read from results.json.
    """
    from loadsum.report.document import material

    m, _ = material(results)
    files: dict[str, bytes] = {}
    for name, figure in drawn(m).items():
        files[f"{name}.svg"] = svg(figure.figure)
        files[f"{name}.png"] = png(figure.figure)
    return files


__all__ = ["DrawnFigure", "draw", "drawn", "png", "svg"]
