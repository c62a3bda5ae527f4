"""Hold-out calibration: how often held-out demand exceeded a level, against how often it should have."""

from collections.abc import Mapping
from typing import Any

import numpy as np

from loadsum.report.figures.plate import INK, MODELS, PURPLE, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material, Unit

NAME = "calibration"
LOOKS: dict[str, tuple[str, Any, float]] = {**MODELS, "observed_sum": (PURPLE, (0, (1, 1.4)), 1.0)}


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """Observed share over expected share at each level, for every model tested."""
    rows = [
        row
        for row in (unit.part("evidence") or {}).get("levels") or ()
        if row.get("expected_share") and row.get("observed_share") is not None
    ]
    models = [name for name in LOOKS if any(row.get("model", "adopted") == name for row in rows)]
    if not models:
        return None
    with plate(58.0) as fig:
        ax = axes_mm(fig, 19.0, 12.0, 44.0, 3.0)
        ax.axhline(1.0, color=INK, linewidth=0.6)
        ends: list[tuple[float, str]] = []
        lowest, highest = 0.5, 2.0
        for name in models:
            mine = sorted(
                (row for row in rows if row.get("model", "adopted") == name), key=lambda row: -row["expected_share"]
            )
            x = np.array([row["expected_share"] for row in mine])
            y = np.maximum(np.array([row["observed_share"] for row in mine]) / x, 0.02)
            colour, dashes, width = LOOKS[name]
            ax.plot(x, y, "o", linestyle=dashes, color=colour, linewidth=width, markersize=3)
            if name == "adopted":
                _chance(ax, mine)
            ends.append((float(y[-1]), name))
            lowest, highest = min(lowest, float(y.min())), max(highest, float(y.max()))
        ax.set_xscale("log")
        ax.set_yscale("log")
        shares = sorted({row["expected_share"] for row in rows}, reverse=True)
        ax.set_xlim(1.3 * shares[0], 0.8 * shares[-1])
        ax.set_ylim(0.7 * lowest, 1.4 * highest)
        ax.set_xticks(shares, [m.n.percent(share, 2) for share in shares])
        ax.set_xticks([], minor=True)
        ticks = [
            t
            for t in (0.02, 0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0)
            if lowest * 0.7 <= t <= highest * 1.4
        ]
        ax.set_yticks(ticks, [m.plain(t) for t in ticks])
        ax.set_yticks([], minor=True)
        last = -np.inf
        span = np.log(2.0 * highest / lowest)
        for end, name in sorted(ends):
            last = max(float(np.log(end)), last + 0.085 * span)
            ax.annotate(
                m.t(f"model.{name}"),
                (0.8 * shares[-1], end),
                xytext=(0.76 * shares[-1], float(np.exp(last))),
                va="center",
                ha="left",
                annotation_clip=False,
            )
        ax.set_xlabel(m.t(f"figure.{NAME}.axis_level"))
        ax.set_ylabel(m.t(f"figure.{NAME}.axis_factor"))
    parts = [
        m.t(
            f"figure.{NAME}.alt_part",
            model=m.t(f"model.{row.get('model', 'adopted')}"),
            expected=m.n.percent(row["expected_share"], 2),
            observed=m.n.percent(row["observed_share"], 2),
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


def _chance(ax: Any, rows: list[Mapping[str, Any]]) -> None:
    """Range that chance allows around the right answer."""
    known = [row for row in rows if row.get("chance_low") is not None and row.get("chance_high") is not None]
    if known:
        x = np.array([row["expected_share"] for row in known])
        low, high = (np.maximum(np.array([row[k] for row in known]) / x, 0.02) for k in ("chance_low", "chance_high"))
        ax.fill_between(x, low, high, color="#dcdcdc", linewidth=0, zorder=0)
