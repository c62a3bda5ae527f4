"""Demand by hour of the day: quantile bands with the ratings over them."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from loadsum.report.figures.plate import GREY, INK, WIDTH_MM, DrawnFigure, axes_mm, clock_axis, plate
from loadsum.report.material import Material, Unit
from loadsum.report.notation import NO_BREAK

NAME = "demand-by-hour"
MOST_CLASSES, MOST_IN_LINE = 8, 4
HEIGHT_MM = 47.0
# Level of each band's upper edge, the probability above it, and the band's tone.
BANDS = (("q90_kw", 0.1, "#8f8f8f"), ("q99_kw", 0.01, "#bdbdbd"), ("q999_kw", 0.001, "#e2e2e2"))


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """Every class of days, seasons side by side; those with the highest 99 % level where there are more than fit."""
    wanted = ("interval", "q50_kw", "q90_kw", "q99_kw", "q999_kw")
    rows = [row for row in unit.rows("hours") if all(row.get(name) is not None for name in wanted)]
    if not rows:
        return None
    by_class: dict[tuple[str, str], list[Mapping[str, Any]]] = {}
    for row in rows:
        by_class.setdefault((row["season"], row["day_type"]), []).append(row)
    top = {name: max(r["q99_kw"] for r in group) for name, group in by_class.items()}
    loaded = sorted(top, key=lambda name: -top[name])
    shown = [name for name in by_class if name in loaded[:MOST_CLASSES]]
    grid = _grid(shown)
    highest = max(
        row["q999_kw" if _supports(by_class[name], 0.001) else "q99_kw"] for name in shown for row in by_class[name]
    )
    ratings = [(m.kva(rating), kw) for rating, kw in ratings_kw(unit)]
    above = [kw for _, kw in ratings if kw > highest]
    limit = 1.06 * max([highest, *above[:1]])
    columns = max(len(line) for line in grid)
    height = HEIGHT_MM if len(grid) > 1 else 56.0
    with plate(height * len(grid)) as fig:
        width = (WIDTH_MM - 25.0 - 4.0 * (columns - 1)) / columns
        for down, line in enumerate(grid):
            for place, name in enumerate(line):
                left = 12.0 + place * (width + 4.0)
                ax = axes_mm(
                    fig, left, (len(grid) - 1 - down) * height + 7.0, WIDTH_MM - left - width, down * height + 9.0
                )
                last = place == len(line) - 1
                _panel(m, ax, by_class[name], ratings, limit, last=last, labelled=name == loaded[0])
                clock_axis(ax, last=last)
                if place:
                    ax.set_yticklabels([])
                ax.set_title("\n".join(name), loc="left", pad=2, fontsize=7.5, linespacing=1.05)
            fig.axes[-len(line)].set_ylabel(m.t(f"figure.{NAME}.axis"))
    peak = sorted(by_class[loaded[0]], key=lambda row: row["q99_kw"] or 0.0)[-1]
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note")
        + (m.t(f"figure.{NAME}.most", shown=len(shown), all=len(by_class)) if len(shown) < len(by_class) else ""),
        alt=m.t(
            f"figure.{NAME}.alt",
            where=m.hour_class(peak),
            median=m.n.fixed(peak.get("q50_kw"), 1),
            q90=m.n.fixed(peak.get("q90_kw"), 1),
            q99=m.n.fixed(peak.get("q99_kw"), 1),
        ),
        figure=fig,
    )


def _grid(shown: Sequence[tuple[str, str]]) -> list[list[tuple[str, str]]]:
    """Classes in lines: one line a type of day where that fits, else as they come."""
    kinds = list(dict.fromkeys(kind for _, kind in shown))
    lines = [[name for name in shown if name[1] == kind] for kind in kinds]
    if max(len(line) for line in lines) <= MOST_IN_LINE and len(lines) <= MOST_CLASSES // 2:
        return lines
    return [list(shown[first : first + MOST_IN_LINE]) for first in range(0, len(shown), MOST_IN_LINE)]


def ratings_kw(unit: Unit) -> list[tuple[float, float]]:
    """Each rating of the study, and its nameplate at the group's power factor. [kVA, kW]"""
    pf = unit.results.get("power_factor") or 1.0
    ratings = (unit.part("hour_map") or {}).get("ratings_kva") or unit.part("ratings_kva") or ()
    return [(float(rating), float(rating) * pf) for rating in ratings if rating is not None]


def _supports(rows: Sequence[Mapping[str, Any]], probability: float) -> bool:
    return all((row.get("floor") or 0.0) <= probability for row in rows)


def _panel(
    m: Material,
    ax: Any,
    rows: Sequence[Mapping[str, Any]],
    ratings: Sequence[tuple[str, float]],
    top: float,
    *,
    last: bool,
    labelled: bool,
) -> None:
    length_h = m.interval_min / 60.0
    x = np.array([(row["interval"] + 0.5) * length_h for row in rows])
    below = np.array([row["q50_kw"] for row in rows], dtype=np.float64)
    at = int(np.argmax(below))
    ax.plot(x, below, color=INK, linewidth=1.4)
    labels = [(float(below[at]), "50" + NO_BREAK + "%")]
    for name, probability, tone in BANDS:
        if not _supports(rows, probability):
            break
        edge = np.array([row[name] for row in rows], dtype=np.float64)
        ax.fill_between(x, below, edge, color=tone, linewidth=0, zorder=0)
        labels.append((float(edge[at]), m.plain(100.0 * (1.0 - probability), 2) + NO_BREAK + "%"))
        below = edge
    ax.plot(x, below, color=INK, linewidth=0.5, linestyle=(0, (4, 2)))
    if labelled:
        _label_levels(ax, x[at], labels, top)
    for text, kw in ratings:
        if kw < top:
            ax.axhline(kw, color=GREY, linewidth=0.8, linestyle=(0, (1, 1.6)), zorder=3)
            if last:
                ax.text(24.4, kw, text, va="center", ha="left", clip_on=False)
    ax.set_ylim(0, top)


def _label_levels(ax: Any, x: float, labels: Sequence[tuple[float, str]], top: float) -> None:
    """Names of the levels to the left of the highest hour, never closer than a line of text, with a thin leader."""
    to_left = x > 12.0
    x_text = x - 6.0 if to_left else x + 6.0
    y_text = -1.0
    for y, text in labels:
        y_text = max(y, y_text + 0.1 * top)
        ax.annotate(
            text,
            (x, y),
            xytext=(x_text, y_text + 0.02 * top),
            ha="right" if to_left else "left",
            va="center",
            fontsize=7.5,
            arrowprops={"arrowstyle": "-", "linewidth": 0.35, "color": INK, "shrinkA": 1, "shrinkB": 0},
            bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.6, "alpha": 1.0},
            zorder=4,
        )
