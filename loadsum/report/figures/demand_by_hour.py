"""Demand by hour of the day: quantile bands with the ratings over them."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from loadsum.report.figures.plate import GREY, INK, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material
from loadsum.report.sections.verdict import exceedance_rows

NAME = "demand-by-hour"


def figure(m: Material) -> DrawnFigure | None:
    """The class of days with the highest 99.9 % level, and beside it the one with the lowest."""
    rows = m.rows("hours")
    if not rows:
        return None
    by_class: dict[tuple[str, str], list[Mapping[str, Any]]] = {}
    for row in rows:
        by_class.setdefault((row["season"], row["day_type"]), []).append(row)
    top = {name: max(r.get("q999_kw") or 0.0 for r in group) for name, group in by_class.items()}
    shown = list(dict.fromkeys([max(top, key=lambda k: top[k]), min(top, key=lambda k: top[k])]))
    ratings = _ratings(m, m.transformers[0])
    highest = max([top[name] for name in shown] + [kw for _, kw in ratings[:1]])
    with plate(62.0) as fig:
        for place, name in enumerate(shown):
            ax = axes_mm(fig, 12.0 + 77.0 * place, 9.0, 166.0 - 89.0 - 77.0 * place + 14.0, 6.0)
            _panel(m, ax, by_class[name], ratings, highest * 1.08, label_ratings=place == len(shown) - 1)
            ax.set_title(f"{name[0]}, {name[1]}", loc="left", pad=3)
            if place == 0:
                ax.set_ylabel(m.t(f"figure.{NAME}.axis"))
    peak = max(by_class[shown[0]], key=lambda r: r.get("q999_kw") or 0.0)
    alt = m.t(
        f"figure.{NAME}.alt",
        where=m.hour_class(peak),
        median=m.n.fixed(peak.get("q50_kw"), 1),
        q90=m.n.fixed(peak.get("q90_kw"), 1),
        q99=m.n.fixed(peak.get("q99_kw"), 1),
        q999=m.n.fixed(peak.get("q999_kw"), 1),
    )
    return DrawnFigure(
        name=NAME, title=m.t(f"figure.{NAME}.title"), note=m.t(f"figure.{NAME}.note"), alt=alt, figure=fig
    )


def _ratings(m: Material, transformer: Mapping[str, Any]) -> list[tuple[str, float]]:
    pf = transformer.get("power_factor") or 1.0
    rows = {row["rating_kva"]: row["rating_kva"] * pf for row in exceedance_rows(transformer) if row.get("rating_kva")}
    return [(m.kva(rating), kw) for rating, kw in rows.items()]


def _panel(
    m: Material,
    ax: Any,
    rows: Sequence[Mapping[str, Any]],
    ratings: Sequence[tuple[str, float]],
    top: float,
    *,
    label_ratings: bool,
) -> None:
    length_h = m.interval_min / 60.0
    x = np.array([(row["interval"] + 0.5) * length_h for row in rows])
    q50, q90, q99, q999 = (
        np.array([row.get(k) or np.nan for row in rows]) for k in ("q50_kw", "q90_kw", "q99_kw", "q999_kw")
    )
    ax.fill_between(x, q50, q90, color="#9a9a9a", linewidth=0)
    ax.fill_between(x, q90, q99, color="#c4c4c4", linewidth=0)
    ax.fill_between(x, q99, q999, color="#e4e4e4", linewidth=0)
    ax.plot(x, q50, color=INK, linewidth=1.4)
    ax.plot(x, q999, color=INK, linewidth=0.6, linestyle=(0, (4, 2)))
    at = int(np.nanargmax(q999))
    for values, text in ((q50, "50 %"), (q90, "90 %"), (q99, "99 %"), (q999, "99.9 %")):
        ax.annotate(
            text, (x[at], values[at]), xytext=(-3, 1), textcoords="offset points", ha="right", va="bottom", fontsize=7
        )
    for text, kw in ratings:
        if kw < top:
            ax.axhline(kw, color=GREY, linewidth=0.7, linestyle=(0, (1, 1.5)))
            if label_ratings:
                ax.text(24.3, kw, text, va="center", ha="left", clip_on=False)
    ax.set_xlim(0, 24)
    ax.set_ylim(0, top)
    ax.set_xticks(range(0, 25, 6), [f"{h:02d}:00" for h in range(0, 25, 6)])
