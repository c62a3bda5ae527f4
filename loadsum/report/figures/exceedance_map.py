"""Map of exceedance probability by hour of the day and class of days."""

import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from loadsum.report.figures.plate import INK, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material

NAME = "exceedance-map"
# Decades of probability, each with its tone and hatch: dark is likely, white is not seen.
STEPS = ((0.1, "#3b3b3b", ""), (0.01, "#7d7d7d", ""), (0.001, "#b9b9b9", "////"), (0.0, "#e6e6e6", ""))


def figure(m: Material) -> DrawnFigure | None:
    """The map for the recommended rating, or for the first where none is recommended."""
    rows = [row for row in m.rows("hours") if row.get("above")]
    if not rows:
        return None
    transformer = m.transformers[0]
    levels = [row.get("rating_kva") for row in transformer.get("exceedance") or ()]
    chosen = (transformer.get("selection") or {}).get("rating_kva")
    index = levels.index(chosen) if chosen in levels else 0
    rating = m.kva(levels[index])
    return _draw(m, rows, index, rating)


def _draw(m: Material, rows: Sequence[Mapping[str, Any]], index: int, rating: str) -> DrawnFigure:
    classes = list(dict.fromkeys((row["season"], row["day_type"]) for row in rows))
    length_h = m.interval_min / 60.0
    with plate(14.0 + 5.6 * len(classes) + 10.0) as fig:
        ax = axes_mm(fig, 45.0, 9.0, 26.0, 8.0)
        for row in rows:
            y = classes.index((row["season"], row["day_type"]))
            p, floor = row["above"][index], row.get("floor") or 0.0
            tone, hatch = _tone(p, floor)
            ax.fill_between(
                [row["interval"] * length_h, (row["interval"] + 1) * length_h],
                y + 0.04,
                y + 0.96,
                facecolor=tone,
                edgecolor="#555555" if hatch else tone,
                hatch=hatch or None,
                linewidth=0.0,
            )
        ax.set_xlim(0, 24)
        ax.set_ylim(len(classes), 0)
        ax.set_yticks(np.arange(len(classes)) + 0.5, [f"{s}, {d}" for s, d in classes])
        ax.set_xticks(range(0, 25, 3), [f"{h:02d}:00" for h in range(0, 25, 3)])
        ax.tick_params(axis="y", length=0)
        for side in ("left", "bottom"):
            ax.spines[side].set_visible(False)
        _key(m, ax, len(classes))
    worst = max(rows, key=lambda row: row["above"][index])
    hours = sum((row.get("hours_per_year") or 0.0) * row["above"][index] for row in rows)
    alt = m.t(
        f"figure.{NAME}.alt",
        rating=rating,
        classes=len(classes),
        highest=m.n.probability(worst["above"][index], worst.get("floor")),
        where=m.hour_class(worst),
        hours=m.hours(hours),
    )
    return DrawnFigure(
        name=NAME,
        title=m.t(f"figure.{NAME}.title", rating=rating),
        note=m.t(f"figure.{NAME}.note"),
        alt=alt,
        figure=fig,
    )


def _tone(p: float | None, floor: float) -> tuple[str, str]:
    if p is None or not math.isfinite(p) or (p < floor and p < 0.001):
        return "#ffffff", ""
    for limit, tone, hatch in STEPS:
        if p >= limit:
            return tone, hatch
    return "#ffffff", ""


def _key(m: Material, ax: Any, classes: int) -> None:
    labels = [*m.t.entry(f"figure.{NAME}.steps"), m.t(f"figure.{NAME}.below")]
    tones = [*STEPS, (0.0, "#ffffff", "")]
    height = classes / 8.0
    for place, (label, (_, tone, hatch)) in enumerate(zip(labels, tones, strict=True)):
        y = 0.1 * classes + place * 1.15 * height
        ax.fill_between(
            [24.8, 25.8],
            y,
            y + 0.8 * height,
            facecolor=tone,
            edgecolor="#555555",
            hatch=hatch or None,
            linewidth=0.4,
            clip_on=False,
        )
        ax.text(26.1, y + 0.4 * height, label, va="center", ha="left", color=INK, clip_on=False)
