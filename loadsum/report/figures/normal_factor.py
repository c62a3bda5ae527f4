"""How far the customary models are off, against the probability itself."""

import numpy as np

from loadsum.report.figures.exceedance_curve import pooled_floor, values, whole_points
from loadsum.report.figures.plate import INK, MODELS, DrawnFigure, axes_mm, decades, plate
from loadsum.report.material import Material, Unit

NAME = "normal-factor"


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """Probability by the normal law and by independent customers, as a multiple of the adopted model's."""
    curve = unit.part("curve")
    if not curve or not curve.get("normal"):
        return None
    adopted = values(curve, "adopted")
    floor = pooled_floor(unit)
    inside = (adopted <= 0.5) & (adopted >= floor) & whole_points(curve)
    if inside.sum() < 5:
        return None
    share = adopted[inside]
    lines = {
        name: np.maximum(values(curve, name)[inside] / share, 1e-12)
        for name in MODELS
        if name != "adopted" and curve.get(name)
    }
    lowest = max(min(float(line.min()) for line in lines.values()), 1e-4)
    highest = max(2.0, min(max(float(line.max()) for line in lines.values()), 1e3))
    with plate(52.0) as fig:
        ax = axes_mm(fig, 19.0, 12.0, 40.0, 4.0)
        ax.axhspan(0.9, 1.1, color="#e2e2e2", zorder=-1)
        ax.axhline(1.0, color=INK, linewidth=0.6)
        for name, line in lines.items():
            colour, dashes, width = MODELS[name]
            ax.plot(share, line, color=colour, linestyle=dashes, linewidth=1.3 * width)
        decades(ax, "x", floor, 0.5, lambda s: m.n.percent(s, 1))
        decades(ax, "y", 0.7 * lowest, 1.4 * highest, lambda f: m.n.significant(f, 1))
        ax.set_xlim(0.5, floor)
        ax.set_ylim(0.7 * lowest, 1.4 * highest)
        ends = sorted(((float(line[-1]), name) for name, line in lines.items()), reverse=True)
        span = np.log(2.0 * highest / lowest)
        last = np.inf
        for end, name in [(1.0, "adopted"), *ends]:
            y = min(np.log(max(end, lowest)), last - 0.085 * span)
            last = y
            ax.annotate(
                m.t(f"model.{name}"),
                (floor, max(end, 0.75 * lowest)),
                xytext=(floor / 1.05, float(np.exp(y))),
                va="center",
                ha="left",
                annotation_clip=False,
            )
        ax.text(0.48, 1.13, m.t(f"figure.{NAME}.near"), va="bottom", ha="left", fontsize=7.5)
        ax.set_xlabel(m.t(f"figure.{NAME}.axis_share"))
        ax.set_ylabel(m.t(f"figure.{NAME}.axis_factor"))
    parts = []
    for wanted in (0.1, 0.01, 0.001):
        if floor <= wanted <= share.max():
            at = {name: float(np.interp(-np.log(wanted), -np.log(share), line)) for name, line in lines.items()}
            known = {name: m.n.significant(at.get(name), 2) for name in MODELS}
            parts.append(m.t(f"figure.{NAME}.alt_part", share=m.n.percent(wanted, 1), **known))
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note"),
        alt=m.t(f"figure.{NAME}.alt", parts=" ".join(parts)),
        figure=fig,
    )
