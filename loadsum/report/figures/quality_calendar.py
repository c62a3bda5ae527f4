"""Calendar of the readings: which customer's readings were usable on which day."""

import datetime as dt
from typing import Any

import numpy as np

from loadsum.report.figures.plate import GREY, DrawnFigure, axes_mm, plate
from loadsum.report.material import Material

NAME = "quality-calendar"
MOST_CUSTOMERS = 30
# Tone and hatch of each sign of the calendar, in the order of the key.
LOOKS = {"f": ("#d2d2d2", ""), "e": ("#ffffff", "//////"), "p": ("#7d7d7d", ""), "-": ("#ffffff", "")}
EPOCH = dt.date(1970, 1, 1)


def figure(m: Material) -> DrawnFigure | None:
    """The calendar; where there are more customers than fit, those with the most days at fault."""
    calendar = m.part("quality")
    if not calendar or not calendar.get("customers"):
        return None
    signs = {name: "".join(sign * int(count) for count, sign in runs) for name, runs in calendar["customers"].items()}
    faults = {name: len(row) - row.count("f") for name, row in signs.items()}
    shown = sorted(signs, key=lambda name: (-faults[name], name))[:MOST_CUSTOMERS]
    shown = [name for name in signs if name in set(shown)]
    days = int(calendar["days"])
    first = EPOCH + dt.timedelta(days=int(calendar["first_day"]))
    pitch = 4.0 if len(shown) <= 16 else 3.2
    with plate(16.0 + pitch * len(shown)) as fig:
        ax = axes_mm(fig, 26.0, 7.0, 2.0, 8.0)
        for y, name in enumerate(shown):
            _row(ax, y, signs[name])
        ax.set_xlim(0, days)
        ax.set_ylim(len(shown), 0)
        ax.set_yticks(np.arange(len(shown)) + 0.5, [name[:16] for name in shown], fontsize=8 if pitch > 3.5 else 7.5)
        ax.tick_params(axis="y", length=0)
        _months(m, ax, first, days)
        for side in ("left", "right", "top", "bottom"):
            ax.spines[side].set_visible(True)
            ax.spines[side].set_color(GREY)
        _key(m, fig)
    whole = sum(row.count("f") for row in signs.values())
    part = sum(row.count("p") + row.count("e") for row in signs.values())
    none = sum(row.count("-") for row in signs.values())
    worst = max(faults, key=lambda name: faults[name])
    return DrawnFigure(
        name=NAME,
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note", shown=len(shown), all=len(signs))
        if len(shown) < len(signs)
        else m.t(f"figure.{NAME}.all"),
        alt=m.t(
            f"figure.{NAME}.alt",
            customers=len(signs),
            days=days,
            whole=m.n.fixed(whole),
            part=m.n.fixed(part),
            none=m.n.fixed(none),
            worst=worst,
            faults=m.n.fixed(faults[worst]),
        ),
        figure=fig,
    )


def _row(ax: Any, y: int, signs: str) -> None:
    codes = np.frombuffer(signs.encode("ascii"), dtype=np.uint8)
    edges = np.flatnonzero(np.diff(codes)) + 1
    runs: dict[str, list[tuple[int, int]]] = {}
    for first, last in zip([0, *edges.tolist()], [*edges.tolist(), codes.size], strict=True):
        runs.setdefault(signs[first], []).append((first, last - first))
    for sign, spans in runs.items():
        tone, hatch = LOOKS.get(sign, LOOKS["-"])
        ax.broken_barh(
            spans,
            (y + 0.08, 0.84),
            facecolor=tone,
            edgecolor="#333333" if hatch else "none",
            hatch=hatch or None,
            linewidth=0,
        )


def _months(m: Material, ax: Any, first: dt.date, days: int) -> None:
    starts = [day for day in range(days) if (first + dt.timedelta(days=day)).day == 1]
    every = max(1, round(len(starts) / 13))
    chosen = [day for index, day in enumerate(starts) if index % every == 0]
    if not chosen:
        chosen = [0]
    dates = [first + dt.timedelta(days=day) for day in chosen]
    labels = [
        f"{m.n.months[date.month - 1][:3]}" + (f" {date.year}" if index == 0 or date.month == 1 else "")
        for index, date in enumerate(dates)
    ]
    ax.set_xticks(chosen, labels, ha="left")


def _key(m: Material, fig: Any) -> None:
    ax = axes_mm(fig, 26.0, 25.4 * float(fig.get_size_inches()[1]) - 6.0, 2.0, 0.0)
    ax.set_xlim(0, 138)
    ax.set_ylim(6, 0)
    ax.axis("off")
    x = 0.0
    for sign, label in zip(LOOKS, m.t.entry(f"figure.{NAME}.signs"), strict=True):
        tone, hatch = LOOKS[sign]
        ax.broken_barh([(x, 4)], (1.0, 3.0), facecolor=tone, edgecolor="#333333", hatch=hatch or None, linewidth=0.4)
        ax.text(x + 5.2, 2.5, label, va="center", ha="left")
        x += 34.0
