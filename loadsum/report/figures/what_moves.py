"""What moves the expected exceedance hours of the rating: one row a cause, the strongest first."""

from collections.abc import Mapping
from typing import Any

import numpy as np

from loadsum.report.figures.plate import GREY, INK, PALE, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material, Unit

NAME = "what-moves"
LOWEST = 0.01


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """Expected hours when each thing is moved, beside those of the study; none where hardly any come of it."""
    found = unit.part("what_moves")
    if not found or not found.get("moves"):
        return None
    moves, base = found["moves"], found["base_h"]
    hours = [base, *(move[end] for move in moves for end in ("low_h", "high_h"))]
    if max(hours) < 2.0 * LOWEST:
        return None
    lowest = max(min(hours), LOWEST)
    with plate(20.0 + 6.5 * len(moves)) as fig:
        ax = axes_mm(fig, 58.0, 11.0, 8.0, 6.0)
        ax.axvline(max(base, LOWEST), color=GREY, linewidth=0.8, linestyle=(0, (4, 2)))
        ax.annotate(
            m.t(f"figure.{NAME}.base", hours=m.hours(base)),
            (max(base, LOWEST), -0.5),
            xytext=(0, 3),
            textcoords="offset points",
            ha="center",
            annotation_clip=False,
        )
        for y, move in enumerate(moves):
            ax.axhline(y, color=PALE, linewidth=0.5, zorder=0)
            ends = np.clip([move["low_h"], move["high_h"]], LOWEST, None)
            ax.plot([*ends, max(base, LOWEST)], [y] * 3, color=INK, linewidth=1.4, solid_capstyle="butt")
            ax.plot(ends[:1], [y], "o", color=INK, markersize=4.5, markerfacecolor="white")
            ax.plot(ends[1:], [y], "o", color=INK, markersize=4.5)
        ax.set_xscale("log")
        ax.set_xlim(0.6 * lowest, 1.8 * max(max(hours), 2.0 * lowest))
        ticks = [t for t in (0.01, 0.1, 1.0, 10.0, 100.0, 1000.0) if 0.6 * lowest <= t <= 1.8 * max(hours)]
        ax.set_xticks(ticks, [("≤ " if t == LOWEST else "") + m.plain(t) for t in ticks])
        ax.set_xticks([], minor=True)
        ax.set_ylim(len(moves) - 0.5, -0.5)
        ax.set_yticks(range(len(moves)), [_named(m, move) for move in moves])
        ax.tick_params(axis="y", length=0)
        ax.set_xlabel(m.t(f"figure.{NAME}.axis"))
    parts = [
        m.t(
            f"figure.{NAME}.alt_part",
            what=_named(m, move),
            hours=m.hours(move["low_h"])
            if move["low_h"] == move["high_h"]
            else f"{m.hours(move['low_h'])} / {m.hours(move['high_h'])}",
        )
        for move in moves
    ]
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title", rating=m.kva(found["rating_kva"])),
        note=m.t(f"figure.{NAME}.note"),
        alt=m.t(f"figure.{NAME}.alt", base=m.hours(base), parts=" ".join(parts)),
        figure=fig,
    )


def _named(m: Material, move: Mapping[str, Any]) -> str:
    if move.get("low") is None:
        return m.t(f"figure.{NAME}.part.{move['what']}")
    key = "demand" if move["what"] == "demand" else "power_factor"
    low, high = (m.n.fixed(move[end], 2) for end in ("low", "high"))
    return m.t(f"figure.{NAME}.{key}", low=low, high=high)
