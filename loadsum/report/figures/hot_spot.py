"""Hot-spot temperature and ageing of each rating, as distributions."""

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from loadsum.report.figures.plate import GREY, INK, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material, Unit

NAME = "hot-spot"
DASHES: tuple[Any, ...] = ("solid", (0, (7, 2)), (0, (2.2, 1.3)), (0, (7, 1.6, 1.2, 1.6)), (0, (1, 1.4)))
MOST_TICKS = 5


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """Share of years whose highest hot spot is above a temperature, and of years that age more than an amount."""
    rows = [
        row
        for row in (unit.part("thermal") or {}).get("by_rating") or ()
        if row.get("hot_spot_quantiles_c") and row.get("ageing_quantiles_pu")
    ]
    if not rows:
        return None
    with plate(54.0) as fig:
        left = axes_mm(fig, 16.0, 12.0, 90.0, 5.0)
        right = axes_mm(fig, 93.0, 12.0, 13.0, 5.0)
        for index, row in enumerate(rows[: len(DASHES)]):
            for ax, name in ((left, "hot_spot_quantiles_c"), (right, "ageing_quantiles_pu")):
                values = _known(row, name)
                if name.endswith("_c") and m.fahrenheit:
                    values = 1.8 * values + 32.0
                share = 1.0 - (np.arange(values.size) + 0.5) / values.size
                ax.plot(values, 100.0 * share, color=INK, linestyle=DASHES[index], linewidth=1.2)
                at = int(values.size * (0.25 + 0.5 * index / max(len(rows) - 1, 1)))
                ax.annotate(
                    m.kva(row["rating_kva"]),
                    (values[at], 100.0 * share[at]),
                    xytext=(4, 1),
                    textcoords="offset points",
                    fontsize=7.5,
                    bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.8},
                    zorder=3 + index,
                )
        limit = (unit.part("thermal") or {}).get("hot_spot_limit_c")
        if limit is not None:
            x = 1.8 * limit + 32.0 if m.fahrenheit else limit
            left.axvline(x, color=GREY, linewidth=0.8, linestyle=(0, (1, 1.6)))
            left.annotate(
                m.t(f"figure.{NAME}.limit"),
                (x, 100.0),
                xytext=(0, 2),
                textcoords="offset points",
                ha="center",
                fontsize=7.5,
                annotation_clip=False,
            )
        for ax in (left, right):
            ax.set_ylim(0, 100)
        right.set_xscale("log")
        right.axvline(1.0, color=GREY, linewidth=0.8, linestyle=(0, (1, 1.6)))
        low, high = right.get_xlim()
        ticks = [t for t in (1e-5, 1e-4, 1e-3, 0.01, 0.1, 1.0, 10.0, 100.0) if low <= t <= high]
        ticks = ticks[:: 1 + (len(ticks) - 1) // MOST_TICKS]
        right.set_xticks(ticks, [m.n.significant(t, 1) for t in ticks])
        right.set_xticks([], minor=True)
        left.set_ylabel(m.t(f"figure.{NAME}.axis_share"))
        left.set_xlabel(m.t(f"figure.{NAME}.axis_temperature", unit="°F" if m.fahrenheit else "°C"))
        right.set_xlabel(m.t(f"figure.{NAME}.axis_ageing"))
    parts = [
        m.t(
            f"figure.{NAME}.alt_part",
            rating=m.kva(row["rating_kva"]),
            temperature=m.temperature(float(np.median(_known(row, "hot_spot_quantiles_c")))),
            ageing=m.n.significant(float(np.median(_known(row, "ageing_quantiles_pu"))), 2),
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


def _known(row: Mapping[str, Any], name: str) -> NDArray[np.float64]:
    """Quantiles of one rating, without those that are not numbers."""
    return np.array([value for value in row[name] if value is not None], dtype=np.float64)
