"""The plate every figure is drawn on: size, fonts, lines and signs that stay apart in grey."""

import functools
import io
import math
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

import matplotlib as mpl
from matplotlib import font_manager
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from loadsum.report.typeface import FALLBACK_FAMILY, TEXT_FAMILY, font_files

WIDTH_MM = 166.0
ROOM_FOR_HOURS_MM = 40.0  # narrower axes name every twelfth hour only
INK = "#111111"
GREY = "#6b6b6b"
PALE = "#d9d9d9"
DOTTED = (0, (1, 1.6))
# Okabe and Ito's palette; in grey the lines are told apart by their dashes.
BLUE, ORANGE, GREEN, PURPLE = "#0072b2", "#d55e00", "#009e73", "#cc79a7"
# One look for each model wherever it is drawn: colour, dashes, width.
MODELS: dict[str, tuple[str, Any, float]] = {
    "adopted": (INK, "solid", 1.7),
    "normal": (BLUE, (0, (7, 2)), 1.0),
    "independent": (ORANGE, (0, (2.2, 1.3)), 1.1),
    "normal_independent": (GREEN, (0, (7, 1.6, 1.2, 1.6)), 0.9),
}

# Settings that are about windows and not about what is drawn.
WINDOWS = ("backend", "interactive", "toolbar", "webagg", "keymap", "tk.", "macosx", "date.epoch", "savefig.directory")
# Every setting of the drawing library at its own default, whatever the user has set, and then ours.
SETTINGS: Any = {
    **{name: value for name, value in mpl.rcParamsDefault.items() if not name.startswith(WINDOWS)},
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
    "xtick.major.size": 2.5,
    "ytick.major.size": 2.5,
    "xtick.minor.size": 1.5,
    "ytick.minor.size": 1.5,
    "lines.linewidth": 1.0,
    "hatch.linewidth": 0.4,
    "svg.fonttype": "none",
    "svg.hashsalt": "loadsum",
    "axes.unicode_minus": True,
    "path.simplify": True,
    "text.parse_math": False,
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
    """Axes with margins to the edges of the figure; fixed margins need no trial layout. [mm]"""
    width, height = (25.4 * float(side) for side in figure.get_size_inches())
    return figure.add_axes(
        (left / width, bottom / height, (width - left - right) / width, (height - bottom - top) / height), **options
    )


def clock_axis(ax: Any, *, last: bool = True) -> None:
    """Hours of the day along the bottom; ``last`` labels midnight at the right end as well."""
    ax.set_xlim(0, 24)
    every = 6 if 25.4 * ax.figure.get_size_inches()[0] * ax.get_position().width > ROOM_FOR_HOURS_MM else 12
    ax.set_xticks(
        range(0, 25, 6), [f"{h:02d}:00" if h % every == 0 and (h < 24 or last) else "" for h in range(0, 25, 6)]
    )


def spread(places: Sequence[float], gap: float, lowest: float, highest: float) -> list[float]:
    """Places of labels, in the order given, moved as little as keeps them ``gap`` apart and inside the plate.

    Parameters
    ----------
    places : sequence of float
        Where each label would stand.
    gap : float
        Least distance between two labels.
    lowest, highest : float
        Bounds of all labels; where they are too many for that, they go on below ``lowest``.
    """
    order = sorted(range(len(places)), key=lambda k: places[k])
    moved = [0.0] * len(places)
    last = lowest - gap
    for k in order:
        last = moved[k] = max(places[k], last + gap)
    bound = highest
    for k in reversed(order):
        moved[k] = min(moved[k], bound)
        bound = moved[k] - gap
    return moved


def decades(ax: Any, axis: str, lowest: float, highest: float, text: Any) -> None:
    """A logarithmic axis with its decades labelled by ``text``."""
    first, last = _decade(lowest, up=True), _decade(highest, up=False)
    places = [10.0**power for power in range(first, last + 1)]
    labels = [text(place) for place in places]
    if axis == "x":
        ax.set_xscale("log")
        ax.set_xticks(places, labels)
        ax.set_xticks([], minor=True)
    else:
        ax.set_yscale("log")
        ax.set_yticks(places, labels)
        ax.set_yticks([], minor=True)


def _decade(value: float, *, up: bool) -> int:

    power = math.log10(value)
    return math.ceil(power - 1e-9) if up else math.floor(power + 1e-9)


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
        figure.savefig(
            target, format="png", dpi=dots_per_inch, metadata={"Software": None}, pil_kwargs={"compress_level": 2}
        )
    return target.getvalue()
