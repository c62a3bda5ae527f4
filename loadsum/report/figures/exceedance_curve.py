"""Exceedance against level: the adopted model beside the customary ones."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from loadsum.report.figures.demand_by_hour import ratings_kw
from loadsum.report.figures.plate import DOTTED, GREY, INK, MODELS, DrawnFigure, axes_mm, decades, plate
from loadsum.report.material import Material, Unit
from loadsum.report.sections.verdict import exceedance_rows

NAME = "exceedance-curve"


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """The curve of one transformer."""
    curve = unit.part("curve")
    if not curve or not curve.get("levels_kw"):
        return None
    whole = whole_points(curve)
    levels, adopted = values(curve, "levels_kw")[whole], values(curve, "adopted")[whole]
    if levels.size < 2:
        return None
    floor = pooled_floor(unit)
    lowest = 10.0 ** np.floor(np.log10(floor / 12.0))
    lines = {name: values(curve, name)[whole] for name in MODELS if curve.get(name)}
    right = _right_edge(levels, lines, lowest, [kw for _, kw in ratings_kw(unit)])
    with plate(78.0) as fig:
        ax = axes_mm(fig, 19.0, 12.0, 40.0, 7.0)
        if curve.get("lower") and curve.get("upper"):
            low, high = (np.clip(values(curve, name)[whole], lowest / 100.0, 1.0) for name in ("lower", "upper"))
            ax.fill_between(levels, low, high, color="#bdbdbd", linewidth=0)
        for name, line in lines.items():
            colour, dashes, width = MODELS[name]
            ax.plot(levels, line, color=colour, linestyle=dashes, linewidth=width)
        if curve.get("observed"):
            observed = values(curve, "observed")[whole]
            some = np.flatnonzero(observed > 0)[::3]
            ax.plot(levels[some], observed[some], "o", markersize=1.8, color=INK, fillstyle="none", markeredgewidth=0.5)
        decades(ax, "y", lowest, 1.0, lambda share: m.n.percent(share, 1))
        ax.set_ylim(lowest, 1.0)
        ax.set_xlim(levels[0], right)
        ax.axhspan(lowest, floor, color="#f0f0f0", zorder=-1)
        ax.text(levels[0], floor * 0.8, " " + m.t(f"figure.{NAME}.floor"), va="top", ha="left", fontsize=7.5)
        for rating, kw in ratings_kw(unit):
            if levels[0] < kw <= right:
                ax.axvline(kw, color=GREY, linewidth=0.8, linestyle=DOTTED)
                ax.annotate(
                    m.kva(rating), (kw, 1.0), xytext=(0, 2), textcoords="offset points", ha="center", va="bottom"
                )
        _intervals(ax, unit, lowest)
        _name_lines(m, ax, levels, lines, lowest, right)
        ax.set_xlabel(m.t(f"figure.{NAME}.axis_level"))
        ax.set_ylabel(m.t(f"figure.{NAME}.axis_share", interval=f"{m.interval_min} min"))
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note"),
        alt=_alt(m, unit, levels, lines, adopted),
        figure=fig,
    )


def whole_points(curve: Mapping[str, Any]) -> NDArray[np.bool_]:
    """Points of the curve at which every line has a value."""
    names = [name for name in ("levels_kw", "lower", "upper", *MODELS) if curve.get(name)]
    return np.asarray(np.isfinite([values(curve, name) for name in names]).all(axis=0))


def pooled_floor(unit: Unit) -> float:
    """Smallest share of all demand intervals that the record supports. [-]"""
    return float((unit.part("curve") or {})["floor"])


def values(curve: Mapping[str, Any], name: str) -> NDArray[np.float64]:
    """One line of the curve; NaN where it holds nothing."""
    return np.array([np.nan if v is None else v for v in curve[name]], dtype=np.float64)


def _right_edge(
    levels: NDArray[np.float64], lines: Mapping[str, NDArray[np.float64]], lowest: float, ratings: Sequence[float]
) -> float:
    """Just past where the last curve leaves the plate, and not before the rating beyond it."""
    ends = [float(levels[np.flatnonzero(line > lowest)[-1]]) for line in lines.values() if (line > lowest).any()]
    end = max(ends, default=float(levels[-1]))
    beyond = [kw for kw in ratings if kw > end]
    return min(float(levels[-1]), 1.03 * max([end, *beyond[:1]]))


def _intervals(ax: Any, unit: Unit, lowest: float) -> None:
    """Interval of the long-run share at each rating, as a bar."""
    hours = (unit.part("coverage") or {}).get("covered_hours") or 8766.0
    pf = unit.results.get("power_factor") or 1.0
    for row in exceedance_rows(unit.results):
        low, high, level = row.get("hours_low"), row.get("hours_high"), row.get("level_kva")
        if low is not None and high is not None and level is not None and high / hours > lowest:
            ends = [max(low / hours, lowest), high / hours]
            ax.plot([level * pf] * 2, ends, color=INK, linewidth=2.6, solid_capstyle="butt")


def _name_lines(
    m: Material,
    ax: Any,
    levels: NDArray[np.float64],
    lines: Mapping[str, NDArray[np.float64]],
    lowest: float,
    right: float,
) -> None:
    """Name each line at the right edge, with a leader from a dot on the line itself."""
    order = sorted(lines, key=lambda name: float(np.interp(-np.log(lowest * 3), -_log(lines[name]), levels)))
    for place, name in enumerate(reversed(order)):
        share = lowest * 10.0 ** (0.35 + 0.42 * place)
        x = float(np.interp(-np.log(share), -_log(lines[name]), levels))
        ax.plot([x, right], [share, share], color=GREY, linewidth=0.35)
        ax.plot([x], [share], "o", markersize=2.6, color=MODELS[name][0])
        ax.annotate(
            m.t(f"model.{name}"),
            (right, share),
            xytext=(3, 0),
            textcoords="offset points",
            va="center",
            ha="left",
            annotation_clip=False,
        )


def _log(line: NDArray[np.float64]) -> NDArray[np.float64]:
    """Logarithm of a line that only falls, fit for reading the level off the share."""
    safe = np.where(np.isfinite(line) & (line > 0), line, 1e-300)
    return np.asarray(np.log(np.minimum.accumulate(safe)))


def _alt(
    m: Material,
    unit: Unit,
    levels: NDArray[np.float64],
    lines: Mapping[str, NDArray[np.float64]],
    adopted: NDArray[np.float64],
) -> str:
    parts = []
    for rating, kw in ratings_kw(unit):
        if levels[0] <= kw <= levels[-1]:
            shares = {name: m.n.percent(float(np.interp(kw, levels, line)), 2) for name, line in lines.items()}
            known = {name: shares.get(name, m.n.none) for name in MODELS}
            parts.append(m.t(f"figure.{NAME}.alt_part", rating=m.kva(rating), **known))
    return m.t(f"figure.{NAME}.alt", parts=" ".join(parts))
