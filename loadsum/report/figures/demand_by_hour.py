"""Demand by hour of the day: quantile bands with the ratings over them."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from loadsum.report.figures.plate import GREY, INK, DrawnFigure, axes_mm, clock_axis, plate
from loadsum.report.material import Material, Unit
from loadsum.report.notation import NO_BREAK

NAME = "demand-by-hour"
# Level of each band's upper edge, the probability above it, and the band's tone.
BANDS = (("q90_kw", 0.1, "#8f8f8f"), ("q99_kw", 0.01, "#bdbdbd"), ("q999_kw", 0.001, "#e2e2e2"))


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """The class of days with the highest 99 % level, and beside it the one with the lowest."""
    wanted = ("interval", "q50_kw", "q90_kw", "q99_kw", "q999_kw")
    rows = [row for row in unit.rows("hours") if all(row.get(name) is not None for name in wanted)]
    if not rows:
        return None
    by_class: dict[tuple[str, str], list[Mapping[str, Any]]] = {}
    for row in rows:
        by_class.setdefault((row["season"], row["day_type"]), []).append(row)
    top = {name: max(r["q99_kw"] for r in group) for name, group in by_class.items()}
    shown = list(dict.fromkeys([max(top, key=lambda k: top[k]), min(top, key=lambda k: top[k])]))
    drawn_rows = [row for name in shown for row in by_class[name]]
    highest = max(row["q999_kw" if _supports(by_class[shown[0]], 0.001) else "q99_kw"] for row in drawn_rows)
    ratings = [(m.kva(rating), kw) for rating, kw in ratings_kw(unit)]
    above = [kw for _, kw in ratings if kw > highest]
    limit = 1.06 * max([highest, *above[:1]])
    with plate(68.0) as fig:
        width = 60.0 if len(shown) == 2 else 132.0
        for place, name in enumerate(shown):
            left = 13.0 + place * (width + 13.0)
            ax = axes_mm(fig, left, 8.0, 166.0 - left - width, 7.0)
            _panel(m, ax, by_class[name], ratings, limit, last=place == len(shown) - 1)
            ax.set_title(", ".join(name), loc="left", pad=4)
            if place == 0:
                ax.set_ylabel(m.t(f"figure.{NAME}.axis"))
    peak = sorted(by_class[shown[0]], key=lambda row: row["q99_kw"] or 0.0)[-1]
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note"),
        alt=m.t(
            f"figure.{NAME}.alt",
            where=m.hour_class(peak),
            median=m.n.fixed(peak.get("q50_kw"), 1),
            q90=m.n.fixed(peak.get("q90_kw"), 1),
            q99=m.n.fixed(peak.get("q99_kw"), 1),
        ),
        figure=fig,
    )


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
    _label_levels(ax, x[at], labels, top)
    for text, kw in ratings:
        if kw < top:
            ax.axhline(kw, color=GREY, linewidth=0.8, linestyle=(0, (1, 1.6)), zorder=3)
            if last:
                ax.text(24.4, kw, text, va="center", ha="left", clip_on=False)
    ax.set_ylim(0, top)
    clock_axis(ax)


def _label_levels(ax: Any, x: float, labels: Sequence[tuple[float, str]], top: float) -> None:
    """Names of the levels to the left of the highest hour, never closer than a line of text, with a thin leader."""
    to_left = x > 12.0
    x_text = x - 4.5 if to_left else x + 4.5
    y_text = -1.0
    for y, text in labels:
        y_text = max(y, y_text + 0.062 * top)
        ax.annotate(
            text,
            (x, y),
            xytext=(x_text, y_text + 0.02 * top),
            ha="right" if to_left else "left",
            va="center",
            fontsize=7.0,
            arrowprops={"arrowstyle": "-", "linewidth": 0.35, "color": INK, "shrinkA": 1, "shrinkB": 0},
            bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.6, "alpha": 1.0},
            zorder=4,
        )
