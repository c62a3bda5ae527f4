"""Where held-out demand fell in the adopted model's distribution: ten parts that should hold as much each."""

import numpy as np

from loadsum.report.figures.plate import INK, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material, Unit

NAME = "pit-histogram"


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """Share of held-out demand intervals in each tenth of the distribution."""
    counts = np.array((unit.part("evidence") or {}).get("pit_counts") or (), dtype=np.float64)
    if not counts.sum() > 0.0:
        return None
    share = counts / counts.sum()
    tenths = np.arange(counts.size)
    with plate(40.0) as fig:
        ax = axes_mm(fig, 19.0, 12.0, 44.0, 3.0)
        ax.bar(tenths + 0.5, share, width=0.86, color="#9a9a9a", edgecolor=INK, linewidth=0.4)
        ax.axhline(1.0 / counts.size, color=INK, linewidth=0.8, linestyle=(0, (4, 2)))
        ax.annotate(
            m.t(f"figure.{NAME}.meant"),
            (counts.size, 1.0 / counts.size),
            xytext=(4, 0),
            textcoords="offset points",
            va="center",
            annotation_clip=False,
        )
        ax.set_xlim(0, counts.size)
        ax.set_ylim(0.0, 1.15 * max(float(share.max()), 2.0 / counts.size))
        ax.set_xticks(
            range(0, counts.size + 1, 2), [m.n.percent(k / counts.size, 2) for k in range(0, counts.size + 1, 2)]
        )
        ticks = [0.0, 0.1, 0.2]
        ax.set_yticks(ticks, [m.n.percent(tick, 2) for tick in ticks])
        ax.set_xlabel(m.t(f"figure.{NAME}.axis_part"))
        ax.set_ylabel(m.t(f"figure.{NAME}.axis_share"))
    parts = ", ".join(m.n.percent(value, 2) for value in share.tolist())
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note"),
        alt=m.t(f"figure.{NAME}.alt", parts=parts),
        figure=fig,
    )
