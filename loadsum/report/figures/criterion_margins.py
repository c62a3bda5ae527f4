"""Margin of every rating against every criterion, as a share of the limit."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from loadsum.report.figures.plate import GREY, INK, PALE, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material, Unit
from loadsum.report.sections.verdict import limit_text, meets_text, quantity_text

NAME = "criterion-margins"
LOWEST, HIGHEST = 1e-3, 1e2
LETTER = 0.075  # width of a digit on the axis [decades]
LEVELS = (5, -5, 12, -12)  # heights of a label over or under its dot [pt]


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """Value of each criterion's figure as a multiple of its limit, one dot a rating."""
    criteria = [
        criterion
        for criterion in (unit.part("selection") or {}).get("criteria") or ()
        if criterion.get("limit") and any(row.get("value") is not None for row in criterion.get("by_rating") or ())
    ]
    if not criteria:
        return None
    with plate(16.0 + 11.0 * len(criteria)) as fig:
        ax = axes_mm(fig, 58.0, 12.0, 4.0, 2.0)
        ax.axvspan(1.0, HIGHEST * 2, color="#ededed", zorder=-1)
        ax.axvline(1.0, color=INK, linewidth=0.8)
        for y, criterion in enumerate(criteria):
            _row(m, ax, y, criterion)
        ax.set_xscale("log")
        ax.set_xlim(LOWEST, HIGHEST * 2)
        ax.set_ylim(len(criteria) - 0.35, -0.6)
        ax.set_yticks(range(len(criteria)), [_name(m, criterion) for criterion in criteria])
        ax.tick_params(axis="y", length=0)
        ticks = [0.001, 0.01, 0.1, 1.0, 10.0, 100.0]
        ax.set_xticks(ticks, [m.n.significant(tick, 1) for tick in ticks])
        ax.set_xticks([], minor=True)
        ax.spines["left"].set_visible(False)
        ax.set_xlabel(m.t(f"figure.{NAME}.axis"))
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note"),
        alt=" ".join(_alt(m, criterion) for criterion in criteria),
        figure=fig,
    )


def _name(m: Material, criterion: Mapping[str, Any]) -> str:
    words = m.t.name("criterion", str(criterion.get("quantity"))).split(" ")
    half = (len(words) + 1) // 2 if len(words) > 3 else len(words)
    return " ".join(words[:half]) + ("\n" + " ".join(words[half:]) if half < len(words) else "")


def _row(m: Material, ax: Any, y: int, criterion: Mapping[str, Any]) -> None:
    ax.axhline(y, color=PALE, linewidth=0.5, zorder=0)
    places: list[tuple[int, float, float]] = []
    for row in criterion["by_rating"]:
        if row.get("value") is None:
            continue
        share = float(np.clip(row["value"] / criterion["limit"], LOWEST * 1.9, HIGHEST * 1.7))
        cut = share != row["value"] / criterion["limit"]
        if row.get("low") is not None and row.get("high") is not None:
            ends = np.clip([row["low"] / criterion["limit"], row["high"] / criterion["limit"]], LOWEST, HIGHEST * 2)
            ax.plot(ends, [y, y], color=GREY, linewidth=1.6, solid_capstyle="butt")
        meets = row.get("meets")
        good = meets is True or meets == "yes"
        ax.plot(
            [share],
            [y],
            "<" if cut and share < 1 else ">" if cut else "o",
            markersize=4.6,
            markeredgecolor=INK,
            markerfacecolor=INK if good else "white",
            markeredgewidth=0.8,
            zorder=3,
        )
        text = m.plain(row["rating_kva"])
        level = _free_level(places, float(np.log10(share)), 0.5 * LETTER * (len(text) + 1))
        ax.annotate(
            text,
            (share, y),
            xytext=(0, LEVELS[level]),
            textcoords="offset points",
            ha="center",
            va="bottom" if LEVELS[level] > 0 else "top",
            fontsize=7.5,
        )


def _free_level(taken: list[tuple[int, float, float]], place: float, half: float) -> int:
    """First level at which a text of that half width meets no other; the last one where none is free. [decades]"""
    for level in range(len(LEVELS)):
        if not any(other == level and abs(place - at) < half + width for other, at, width in taken):
            break
    taken.append((level, place, half))
    return level


def _alt(m: Material, criterion: Mapping[str, Any]) -> str:
    quantity = str(criterion.get("quantity"))
    parts: Sequence[str] = [
        m.t(
            f"figure.{NAME}.alt_part",
            rating=m.kva(row["rating_kva"]),
            value=quantity_text(m, quantity, row.get("value")),
            meets=meets_text(m, row),
        )
        for row in criterion.get("by_rating") or ()
    ]
    return m.t(
        f"figure.{NAME}.alt",
        name=m.t.name("criterion", quantity),
        limit=limit_text(m, quantity, criterion.get("limit")),
        parts=", ".join(parts),
    )
