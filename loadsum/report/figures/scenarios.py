"""Scenarios side by side: expected hours above each rating."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from loadsum.report.figures.plate import GREY, INK, PALE, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material, Unit

NAME = "scenarios"
SIGNS = ("o", "s", "D", "^", "v")
LOWEST = 0.01
NEAR = 0.45  # signs nearer than this share one label [decades]


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """One row a scenario, one sign a rating; filled where the criteria are met."""
    scenarios = [s for s in unit.rows("scenarios") if s.get("by_rating")]
    if not scenarios:
        return None
    limit = next(
        (
            c.get("limit")
            for c in (unit.part("selection") or {}).get("criteria") or ()
            if "hours" in str(c.get("quantity"))
        ),
        None,
    )
    ratings = list(dict.fromkeys(row["rating_kva"] for s in scenarios for row in s["by_rating"]))
    highest = max([10.0] + [row.get("hours_per_year") or 0.0 for s in scenarios for row in s["by_rating"]])
    with plate(22.0 + 8.0 * len(scenarios)) as fig:
        ax = axes_mm(fig, 58.0, 12.0, 6.0, 9.0)
        for y, scenario in enumerate(scenarios):
            ax.axhline(y, color=PALE, linewidth=0.5, zorder=0)
            for row in scenario["by_rating"]:
                if row.get("hours_per_year") is None:
                    continue
                hours = float(np.clip(row["hours_per_year"], LOWEST, None))
                sign = SIGNS[ratings.index(row["rating_kva"]) % len(SIGNS)]
                meets = row.get("meets")
                good = meets if isinstance(meets, bool) else limit is None or row["hours_per_year"] <= limit
                ax.plot(
                    [hours],
                    [y],
                    sign,
                    markersize=4.8,
                    markeredgecolor=INK,
                    markeredgewidth=0.8,
                    markerfacecolor=INK if good else "white",
                    zorder=3,
                    clip_on=False,
                )
        first = [row for row in scenarios[0]["by_rating"] if row.get("hours_per_year") is not None]
        for names, hours in _together(m, first):
            ax.annotate(
                names,
                (hours, 0),
                xytext=(0 if hours > LOWEST else -5, 7),
                textcoords="offset points",
                ha="center" if hours > LOWEST else "left",
                va="bottom",
                fontsize=7.5,
                annotation_clip=False,
            )
        if limit is not None:
            ax.axvline(limit, color=GREY, linewidth=0.8, linestyle=(0, (1, 1.6)))
            ax.annotate(
                m.t(f"figure.{NAME}.limit"),
                (limit, len(scenarios) - 0.5),
                xytext=(2, 2),
                textcoords="offset points",
                fontsize=7.5,
            )
        ax.set_xscale("log")
        ax.set_xlim(LOWEST, 2.0 * highest)
        ticks = [t for t in (0.01, 0.1, 1.0, 10.0, 100.0, 1000.0, 10000.0) if t <= 2.0 * highest]
        ax.set_xticks(ticks, [("≤ " if t == LOWEST else "") + m.plain(t) for t in ticks])
        ax.set_xticks([], minor=True)
        ax.set_ylim(len(scenarios) - 0.5, -0.5)
        ax.set_yticks(range(len(scenarios)), [str(s.get("name", ""))[:38] for s in scenarios])
        ax.tick_params(axis="y", length=0, pad=7)
        ax.spines["left"].set_visible(False)
        ax.set_xlabel(m.t(f"figure.{NAME}.axis"))
    parts = [
        f"{s.get('name', '')}: "
        + ", ".join(f"{m.kva(row['rating_kva'])} {m.hours(row.get('hours_per_year'))} h" for row in s["by_rating"])
        + "."
        for s in scenarios
    ]
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note"),
        alt=m.t(f"figure.{NAME}.alt", parts=" ".join(parts)),
        figure=fig,
    )


def _together(m: Material, rows: Sequence[Mapping[str, Any]]) -> list[tuple[str, float]]:
    """Names of the ratings by the place of their sign; those too near each other share one text."""
    groups: list[tuple[list[Any], float]] = []
    for row in sorted(rows, key=lambda row: float(row["hours_per_year"])):
        hours = max(float(row["hours_per_year"]), LOWEST)
        if groups and np.log10(hours / groups[-1][1]) < NEAR:
            groups[-1][0].append(row["rating_kva"])
        else:
            groups.append(([row["rating_kva"]], hours))
    ordered = [(sorted(ratings), hours) for ratings, hours in groups]
    return [(", ".join([*(m.plain(r) for r in ratings[:-1]), m.kva(ratings[-1])]), hours) for ratings, hours in ordered]
