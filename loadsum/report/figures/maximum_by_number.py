"""Maximum demand against number of customers, with handbook laws over it."""

from typing import Any

import numpy as np

from loadsum.report.figures.plate import BLUE, GREEN, INK, ORANGE, PURPLE, DrawnFigure, axes_mm, plate, spread
from loadsum.report.material import Material, Unit

NAME = "maximum-by-number"
LAWS = ((BLUE, (0, (7, 2))), (ORANGE, (0, (2.2, 1.3))), (GREEN, (0, (7, 1.6, 1.2, 1.6))), (PURPLE, (0, (1, 1.4))))


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """Expected maximum and its 90 % level for groups of the class, and what each law gives."""
    growth = (unit.part("diversity") or {}).get("growth")
    if not growth or len(growth.get("customers") or ()) < 2 or None in growth["customers"]:
        return None
    n = np.array(growth["customers"], dtype=np.float64)
    lines: list[tuple[str, Any, str, Any, float]] = [
        (m.t(f"figure.{NAME}.expected"), _array(growth, "expected_kw"), INK, "solid", 1.6),
    ]
    if growth.get("q90_kw"):
        lines.append((m.t(f"figure.{NAME}.q90"), _array(growth, "q90_kw"), INK, (0, (4, 2)), 0.8))
    laws = (unit.part("diversity") or {}).get("laws") or ()
    for (colour, dashes), law in zip(LAWS, laws, strict=False):
        lines.append((str(law.get("name", "")), _array(law, "kw"), colour, dashes, 1.0))
    with plate(48.0) as fig:
        ax = axes_mm(fig, 19.0, 12.0, 44.0, 3.0)
        for _, values, colour, dashes, width in lines:
            ax.plot(n[: values.size], values, color=colour, linestyle=dashes, linewidth=width)
        ax.set_xlim(float(n[0]), float(n[-1]))
        top = 1.05 * max(float(np.nanmax(values)) for _, values, *_ in lines)
        ax.set_ylim(0, top)
        heights = spread([float(values[-1]) for _, values, *_ in lines], 0.105 * top, 0.0, 0.96 * top)
        for (name, values, *_), height in zip(lines, heights, strict=True):
            ax.annotate(
                name,
                (float(n[-1]), float(values[-1])),
                xytext=(float(n[-1] + 0.02 * (n[-1] - n[0])), height),
                va="center",
                ha="left",
                annotation_clip=False,
            )
        ax.set_xlabel(m.t(f"figure.{NAME}.axis_number"))
        ax.set_ylabel(m.t(f"figure.{NAME}.axis_demand"))
    parts = [f"{name}: {m.n.fixed(float(values[-1]), 1)} kW" for name, values, *_ in lines]
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note") + " " + m.t(f"figure.{NAME}.laws" if laws else f"figure.{NAME}.no_laws"),
        alt=m.t(f"figure.{NAME}.alt", number=m.n.fixed(float(n[-1])), parts=", ".join(parts)),
        figure=fig,
    )


def _array(table: Any, name: str) -> Any:
    return np.array([np.nan if v is None else v for v in table[name]], dtype=np.float64)
