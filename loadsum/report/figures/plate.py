"""The plate every figure is drawn on: size, fonts, lines and signs that stay apart in grey."""

import functools
import io
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

import matplotlib as mpl
from matplotlib import font_manager
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from loadsum.report.typeface import FALLBACK_FAMILY, TEXT_FAMILY, font_files

WIDTH_MM = 166.0
INK = "#111111"
GREY = "#6b6b6b"
PALE = "#d9d9d9"
# Okabe and Ito's palette, told apart in grey by line style and width.
BLUE, ORANGE, GREEN, PURPLE = "#0072b2", "#d55e00", "#009e73", "#cc79a7"

SETTINGS: Any = {
    "font.family": [TEXT_FAMILY, FALLBACK_FAMILY],
    "font.size": 8.0,
    "axes.linewidth": 0.5,
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "axes.labelsize": 8.0,
    "axes.titlesize": 8.0,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "xtick.labelsize": 8.0,
    "ytick.labelsize": 8.0,
    "xtick.major.width": 0.5,
    "ytick.major.width": 0.5,
    "xtick.minor.width": 0.3,
    "ytick.minor.width": 0.3,
    "lines.linewidth": 1.0,
    "hatch.linewidth": 0.4,
    "svg.fonttype": "none",
    "svg.hashsalt": "loadsum",
    "axes.unicode_minus": True,
    "path.simplify": True,
}


@dataclass(frozen=True, slots=True, kw_only=True)
class DrawnFigure:
    """A figure with its words.

    Parameters
    ----------
    name : str
        Name in the document and of its files.
    title : str
        What it shows.
    note : str
        What to see in it.
    alt : str
        What a reader who does not see it needs, with the numbers.
    figure : matplotlib.figure.Figure
        The drawing.
    """

    name: str
    title: str
    note: str
    alt: str
    figure: Figure


@functools.cache
def _register_fonts() -> None:
    for path in font_files():
        font_manager.fontManager.addfont(path)


@contextmanager
def plate(height_mm: float, width_mm: float = WIDTH_MM) -> Iterator[Figure]:
    """A figure as wide as the text, with the report's settings in force while it is drawn."""
    _register_fonts()
    with mpl.rc_context(SETTINGS):
        yield Figure(figsize=(width_mm / 25.4, height_mm / 25.4))


def axes_mm(figure: Figure, left: float, bottom: float, right: float, top: float, **options: Any) -> Axes:
    """Axes with margins to the edges of the figure. [mm]"""
    width, height = (25.4 * float(side) for side in figure.get_size_inches())
    return figure.add_axes(
        (left / width, bottom / height, (width - left - right) / width, (height - bottom - top) / height), **options
    )


def svg(figure: Figure) -> bytes:
    """The drawing as SVG; the same figure gives the same bytes."""
    with mpl.rc_context(SETTINGS):
        target = io.BytesIO()
        figure.savefig(target, format="svg", metadata={"Date": None, "Creator": None})
    return target.getvalue()


def png(figure: Figure, dots_per_inch: int = 300) -> bytes:
    """The drawing as PNG at print size."""
    with mpl.rc_context(SETTINGS):
        target = io.BytesIO()
        figure.savefig(target, format="png", dpi=dots_per_inch, metadata={"Software": None})
    return target.getvalue()
