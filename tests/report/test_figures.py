"""What a reader of a drawing needs: no text cut at its edge, none printed over another."""

import itertools
from typing import Any

import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.text import Text
from matplotlib.transforms import Bbox

from loadsum.report import figures
from loadsum.report.document import material
from loadsum.report.figures.plate import SETTINGS
from loadsum.report.sections.overview import units_in_detail

MOST_OVERLAP = 0.25  # share of the smaller text's box, which has room above and below its letters


@pytest.fixture(scope="module")
def drawn(results: dict[str, Any]) -> dict[str, figures.DrawnFigure]:
    m, _ = material(results)
    return figures.drawn(m, units_in_detail(m))


def texts(figure: Any) -> list[tuple[str, Bbox]]:
    """Every text of a drawing with its box. [px]"""
    import matplotlib as mpl

    with mpl.rc_context(SETTINGS):
        canvas = FigureCanvasAgg(figure)
        canvas.draw()
        renderer = canvas.get_renderer()
        hidden = unseen(figure)
        found = [text for text in figure.findobj(Text) if text.get_visible() and text.get_text().strip()]
        return [(text.get_text(), text.get_window_extent(renderer)) for text in found if id(text) not in hidden]


def unseen(figure: Any) -> set[int]:
    """Labels of ticks that are not drawn, by identity: those beyond the limits and those no longer in use."""
    found = set()
    for axes in figure.axes:
        for axis in (axes.xaxis, axes.yaxis):
            low, high = sorted(axis.get_view_interval())
            drawn = [tick for tick in axis.get_major_ticks() if low <= tick.get_loc() <= high] if axes.axison else []
            found |= {id(label) for t in axis.majorTicks if t not in drawn for label in (t.label1, t.label2)}
    return found


def test_no_text_of_a_figure_is_cut_at_its_edge(drawn: dict[str, figures.DrawnFigure]) -> None:
    cut = [
        f"{name}: {text!r}"
        for name, figure in drawn.items()
        for text, box in texts(figure.figure)
        if box.x0 < -1 or box.y0 < -1 or box.x1 > figure.figure.bbox.x1 + 1 or box.y1 > figure.figure.bbox.y1 + 1
    ]
    assert cut == []


def test_no_text_of_a_figure_is_printed_over_another(drawn: dict[str, figures.DrawnFigure]) -> None:
    over = []
    for name, figure in drawn.items():
        for (one, a), (two, b) in itertools.combinations(texts(figure.figure), 2):
            shared = Bbox.intersection(a, b)
            if shared is None:
                continue
            smaller = min(a.width * a.height, b.width * b.height)
            if shared.width * shared.height > MOST_OVERLAP * smaller:
                over.append(f"{name}: {one!r} and {two!r}")
    assert over == []


def test_no_text_of_a_figure_is_smaller_than_seven_points(drawn: dict[str, figures.DrawnFigure]) -> None:
    small = [
        f"{name}: {text.get_text()!r}"
        for name, figure in drawn.items()
        for text in figure.figure.findobj(Text)
        if text.get_text().strip() and text.get_fontsize() < 7.0
    ]
    assert small == []
