"""Exceedance against level: the adopted model beside the customary ones."""

from collections.abc import Mapping
from typing import Any

import numpy as np

from loadsum.report.figures.plate import BLUE, GREEN, GREY, INK, ORANGE, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material
from loadsum.report.sections.verdict import exceedance_rows

NAME = "exceedance-curve"
STYLES = {
    "normal": (BLUE, (0, (6, 2)), 0.9),
    "independent": (ORANGE, (0, (2, 1.2)), 0.9),
    "normal_independent": (GREEN, (0, (6, 1.5, 1, 1.5)), 0.8),
}


def figure(m: Material) -> DrawnFigure | None:
    """The curve of the first transformer."""
    transformer = m.transformers[0]
    curve = transformer.get("curve")
    if not curve or not curve.get("levels_kw"):
        return None
    levels = _array(curve, "levels_kw")
    adopted = _array(curve, "adopted")
    floor = curve.get("floor") or 1e-6
    lowest = max(floor / 30.0, 1e-9)
    with plate(78.0) as fig:
        ax = axes_mm(fig, 16.0, 11.0, 30.0, 10.0)
        if curve.get("lower") and curve.get("upper"):
            lower, upper = _array(curve, "lower"), _array(curve, "upper")
            ax.fill_between(
                levels, np.clip(lower, lowest / 10, 1), np.clip(upper, lowest / 10, 1), color="#c9c9c9", lw=0
            )
        ends = [(_seen(levels, adopted, lowest), m.t(f"figure.{NAME}.adopted"))]
        for name, (colour, dashes, width) in STYLES.items():
            if curve.get(name):
                values = _array(curve, name)
                ax.plot(levels, values, color=colour, linestyle=dashes, linewidth=width)
                ends.append((_seen(levels, values, lowest), m.t(f"figure.{NAME}.{name}")))
        ax.plot(levels, adopted, color=INK, linewidth=1.6)
        if curve.get("observed"):
            observed = _array(curve, "observed")
            ax.plot(levels[observed > 0][::4], observed[observed > 0][::4], ".", color=INK, markersize=2.5)
        ax.axhline(floor, color=GREY, linewidth=0.5)
        ax.text(levels[0], floor, " " + m.t(f"figure.{NAME}.floor"), va="bottom", ha="left", fontsize=7, color=GREY)
        ax.set_yscale("log")
        ax.set_ylim(lowest, 1.0)
        right = levels[-1]
        ax.set_xlim(levels[0], right)
        _label_ends(ax, ends, lowest)
        pf = transformer.get("power_factor") or 1.0
        for row in exceedance_rows(transformer):
            kw = row["rating_kva"] * pf
            if levels[0] < kw < right:
                ax.axvline(kw, color=GREY, linewidth=0.7, linestyle=(0, (1, 1.5)))
                ax.annotate(
                    m.kva(row["rating_kva"]),
                    (kw, 1.0),
                    xytext=(0, 2),
                    textcoords="offset points",
                    ha="center",
                    va="bottom",
                )
        ax.set_xlabel(m.t(f"figure.{NAME}.axis_level"))
        ax.set_ylabel(m.t(f"figure.{NAME}.axis_share"))
    return DrawnFigure(
        name=NAME,
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note"),
        alt=_alt(m, transformer, levels, curve, adopted),
        figure=fig,
    )


def _array(curve: Mapping[str, Any], name: str) -> Any:
    return np.array([np.nan if v is None else v for v in curve[name]], dtype=np.float64)


def _seen(levels: Any, values: Any, lowest: float) -> tuple[float, float]:
    """Where a curve leaves the plate."""
    inside = np.flatnonzero(values > lowest)
    last = inside[-1] if inside.size else 0
    return float(levels[last]), float(max(values[last], lowest))


def _label_ends(ax: Any, ends: list[tuple[tuple[float, float], str]], lowest: float) -> None:
    """Names at the ends of the curves; those that leave below stand side by side above the axis."""
    for (x, y), text in ends:
        ax.annotate(
            text, (x, y), xytext=(3, 3), textcoords="offset points", ha="left", va="bottom", fontsize=7.5, rotation=0
        )


def _alt(m: Material, transformer: Mapping[str, Any], levels: Any, curve: Mapping[str, Any], adopted: Any) -> str:
    pf = transformer.get("power_factor") or 1.0
    parts = []
    for row in exceedance_rows(transformer):
        kw = row["rating_kva"] * pf
        if not levels[0] <= kw <= levels[-1]:
            continue
        shares = {
            name: m.n.percent(float(np.interp(kw, levels, _array(curve, name))), 2)
            for name in ("adopted", "normal", "independent")
            if curve.get(name)
        }
        parts.append(
            m.t(
                f"figure.{NAME}.alt_part",
                rating=m.kva(row["rating_kva"]),
                **{"normal": m.n.none, "independent": m.n.none, **shares},
            )
        )
    return m.t(f"figure.{NAME}.alt", parts=" ".join(parts))
