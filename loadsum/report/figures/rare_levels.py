"""Levels that years pass, with the bounds that hold whatever the dependence."""

import numpy as np

from loadsum.report.figures.demand_by_hour import ratings_kw
from loadsum.report.figures.plate import DOTTED, GREY, INK, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material, Unit
from loadsum.report.sections.peaks import one_in

NAME = "rare-levels"


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """Level passed in 1 year of 2, 5, 10 and 20, against the ratings."""
    rows = [r for r in (unit.part("peaks") or {}).get("annual") or () if r.get("level_kva") is not None]
    if len(rows) < 2:
        return None
    x = np.arange(len(rows), dtype=np.float64)
    level, low, high = (
        np.array([np.nan if row.get(k) is None else row[k] for row in rows], dtype=np.float64)
        for k in ("level_kva", "lowest_kva", "highest_kva")
    )
    with plate(44.0) as fig:
        ax = axes_mm(fig, 19.0, 8.0, 40.0, 3.0)
        ax.fill_between(x, low, high, color="#d6d6d6", linewidth=0)
        ax.plot(x, level, "-o", color=INK, linewidth=1.4, markersize=3.5)
        top = float(np.nanmax([level.max(), np.nanmax(high)])) * 1.08
        bottom = 0.0
        right = float(x[-1]) + 0.25
        for rating, _ in ratings_kw(unit):
            if bottom < rating <= top:
                ax.axhline(rating, color=GREY, linewidth=0.8, linestyle=DOTTED)
                ax.text(right + 0.04, rating, m.kva(rating), va="center", ha="left", clip_on=False)
        ax.annotate(
            m.t(f"figure.{NAME}.level"), (x[0], level[0]), xytext=(0, 5), textcoords="offset points", fontsize=7
        )
        ax.annotate(
            m.t(f"figure.{NAME}.bounds"),
            (x[0], low[0]),
            xytext=(0, -3),
            textcoords="offset points",
            fontsize=7,
            va="top",
        )
        ax.set_xticks(x, [one_in(m, row.get("probability"), "year") for row in rows])
        ax.set_xlim(-0.25, right)
        ax.set_ylim(bottom, top)
        ax.set_ylabel(m.t(f"figure.{NAME}.axis"))
    parts = [
        m.t(
            f"figure.{NAME}.alt_part",
            passed=one_in(m, row.get("probability"), "year"),
            level=m.n.fixed(row.get("level_kva"), 1),
            between=m.between(row.get("lowest_kva"), row.get("highest_kva"), lambda v: m.n.fixed(v, 1)),
        )
        for row in rows
    ]
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note"),
        alt=m.t(f"figure.{NAME}.alt", parts=" ".join(parts)),
        figure=fig,
    )
