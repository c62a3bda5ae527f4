"""Measured demand of the group and the sum of its customers by hour of the day."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from loadsum.report.figures.plate import GREY, INK, PALE, DrawnFigure, axes_mm, clock_axis, plate
from loadsum.report.material import Material

NAME = "reconciliation"


def overall(values: Sequence[float | None] | None) -> float | None:
    """Mean of what is known; None where nothing is."""
    known = [value for value in values or () if value is not None]
    return sum(known) / len(known) if known else None


def figure(m: Material) -> DrawnFigure | None:
    """The meter with the largest unaccounted share, in its two classes of days with the most intervals."""
    groups = [group for group in m.rows("reconciliation") if group.get("by_class")]
    if not groups:
        return None
    group = max(groups, key=lambda one: abs(one.get("unaccounted_share") or 0.0))
    shown = sorted(group["by_class"], key=lambda part: -part["intervals"])[:2]
    top = max(_highest(part) for part in shown)
    bottom = min(0.0, *(_lowest(part) for part in shown))
    name = group.get("transformer") or m.t("reconciliation.whole")
    with plate(62.0) as fig:
        width = 66.0 if len(shown) == 2 else 145.0
        for place, part in enumerate(shown):
            left = 13.0 + place * (width + 13.0)
            ax = axes_mm(fig, left, 8.0, 166.0 - left - width, 7.0)
            _panel(m, ax, part, labelled=place == 0)
            ax.set_ylim(1.08 * bottom, 1.16 * top if top > 0.0 else 1.0)
            ax.set_title(", ".join((part["season"], part["day_type"])), loc="left", pad=4)
            if place == 0:
                ax.set_ylabel(m.t(f"figure.{NAME}.axis"))
    first = shown[0]
    apart = [(value, n) for n, value in enumerate(first["unaccounted_kw"]) if value is not None]
    most, at = max(apart, key=lambda pair: abs(pair[0]))
    return DrawnFigure(
        name=NAME,
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note", meter=name),
        alt=m.t(
            f"figure.{NAME}.alt",
            meter=name,
            share=m.n.percent(group.get("unaccounted_share")),
            where=", ".join((first["season"], first["day_type"])),
            measured=m.n.fixed(overall(first["measured_kw"]), 2),
            summed=m.n.fixed(overall(first["summed_kw"]), 2),
            most=m.n.fixed(most, 2),
            at=f"{at * m.interval_min // 60:02d}:{at * m.interval_min % 60:02d}",
        ),
        figure=fig,
    )


def _array(values: Sequence[float | None]) -> Any:
    return np.array([np.nan if value is None else value for value in values], dtype=np.float64)


def _highest(part: Mapping[str, Any]) -> float:
    return float(np.nanmax([_array(part["measured_kw"]), _array(part["summed_kw"])]))


def _lowest(part: Mapping[str, Any]) -> float:
    return float(np.nanmin([_array(part[name]) for name in ("measured_kw", "summed_kw", "unaccounted_kw")]))


def _panel(m: Material, ax: Any, part: Mapping[str, Any], *, labelled: bool) -> None:
    measured, summed, apart = (_array(part[name]) for name in ("measured_kw", "summed_kw", "unaccounted_kw"))
    x = (np.arange(measured.size) + 0.5) * m.interval_min / 60.0
    ax.bar(x, apart, width=0.8 * m.interval_min / 60.0, color=PALE, edgecolor=GREY, linewidth=0.3, zorder=1)
    (line,) = ax.plot(x, measured, color=INK, linewidth=1.5, zorder=3)
    (dashed,) = ax.plot(x, summed, color=INK, linewidth=1.0, linestyle=(0, (4, 2)), zorder=3)
    ax.axhline(0.0, color=INK, linewidth=0.4)
    if labelled:
        bar = ax.patches[0]
        ax.legend([line, dashed, bar], m.t.entry(f"figure.{NAME}.key"), loc="upper left", frameon=False, fontsize=7.0)
    clock_axis(ax)
