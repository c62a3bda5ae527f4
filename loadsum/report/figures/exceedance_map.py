"""Map of exceedance probability by hour of the day and class of days."""

from collections.abc import Iterator, Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from loadsum.report.figures.plate import GREY, DrawnFigure, axes_mm, clock_axis, plate
from loadsum.report.material import Material, Unit

NAME = "exceedance-map"
# Decades of probability, each with its tone and hatch; dark is likely.
STEPS = ((0.1, "#303030", ""), (0.01, "#6f6f6f", ""), (0.001, "#a6a6a6", "//////"), (0.0, "#dedede", ""))
RARE, UNSEEN = len(STEPS), len(STEPS) + 1
LOOKS = (*((tone, hatch) for _, tone, hatch in STEPS), ("#ffffff", ""), ("#ffffff", "xxxxx"))


def figure(m: Material, unit: Unit) -> DrawnFigure | None:
    """The map for the rating that the study is about and, beside it, for the next smaller one."""
    found = unit.part("hour_map")
    if not found or not found.get("ratings_kva"):
        return None
    shown = ratings_shown(unit, found["ratings_kva"])
    probability = _array(found["probability"])
    floor = _array(found["floor"])
    names = [", ".join(pair) for pair in zip(found["season"], found["day_type"], strict=True)]
    with plate(16.0 + 5.4 * len(names)) as fig:
        width = (166.0 - 44.0 - 36.0 - 4.0 * (len(shown) - 1)) / len(shown)
        for place, index in enumerate(shown):
            left = 44.0 + place * (width + 4.0)
            ax = axes_mm(fig, left, 7.0, 166.0 - left - width, 7.0)
            _panel(m, ax, _states(probability[index], floor), names if place == 0 else None)
            ax.set_title(m.kva(found["ratings_kva"][index]), loc="left", pad=3)
        states = {int(s) for index in shown for s in np.unique(_states(probability[index], floor))}
        _key(m, fig, states, floor)
    return DrawnFigure(
        name=unit.figure(NAME),
        title=m.t(f"figure.{NAME}.title"),
        note=m.t(f"figure.{NAME}.note"),
        alt=" ".join(_alt(m, found, index, probability[index], floor, names) for index in shown),
        figure=fig,
    )


def ratings_shown(unit: Unit, ratings: Sequence[float]) -> list[int]:
    """Index of the rating in service, or of the next smaller one, and of the recommended rating."""
    installed = unit.results.get("installed_kva")
    chosen = (unit.part("selection") or {}).get("rating_kva") or installed
    index = ratings.index(chosen) if chosen in ratings else len(ratings) // 2
    if installed in ratings and installed != ratings[index]:
        return sorted([ratings.index(installed), index])
    return [index - 1, index] if index > 0 else [index]


def _array(values: Any) -> NDArray[np.float64]:
    return np.array(values, dtype=np.float64)


def _states(probability: NDArray[np.float64], floor: NDArray[np.float64]) -> NDArray[np.int64]:
    state = np.full(probability.shape, len(STEPS) - 1, dtype=np.int64)
    for index in reversed(range(len(STEPS))):
        state[probability >= STEPS[index][0]] = index
    state[probability < floor] = RARE
    state[~np.isfinite(probability)] = UNSEEN
    return state


def _runs(row: NDArray[np.int64]) -> Iterator[tuple[int, int, int]]:
    """State, first place and length of each run of equal states."""
    edges = np.flatnonzero(np.diff(row)) + 1
    for first, last in zip(np.append(0, edges), np.append(edges, row.size), strict=True):
        yield int(row[first]), int(first), int(last - first)


def _panel(m: Material, ax: Any, states: NDArray[np.int64], names: Sequence[str] | None) -> None:
    length_h = m.interval_min / 60.0
    for y, row in enumerate(states):
        for state, first, count in _runs(row):
            tone, hatch = LOOKS[state]
            ax.broken_barh(
                [(first * length_h, count * length_h)],
                (y + 0.04, 0.92),
                facecolor=tone,
                edgecolor="#4a4a4a" if hatch else "none",
                hatch=hatch or None,
                linewidth=0.0,
            )
    ax.set_ylim(len(states), 0)
    clock_axis(ax, last=False)
    ax.set_yticks(np.arange(len(states)) + 0.5, names if names is not None else [""] * len(states))
    ax.tick_params(axis="y", length=0)
    for side in ("left", "right", "top", "bottom"):
        ax.spines[side].set_visible(True)
        ax.spines[side].set_color(GREY)


def _key(m: Material, fig: Any, states: set[int], floor: NDArray[np.float64]) -> None:
    height = 25.4 * float(fig.get_size_inches()[1])
    ax = axes_mm(fig, 133.0, 0.0, 0.0, 0.0)
    ax.set_xlim(0, 33)
    ax.set_ylim(height, 0)
    ax.axis("off")
    seen = floor[np.isfinite(floor)]
    labels = [
        *m.t.entry(f"figure.{NAME}.steps"),
        m.t(f"figure.{NAME}.rare", floor=m.n.percent(float(seen.max()) if seen.size else None, 1)),
        m.t(f"figure.{NAME}.unseen"),
    ]
    y = 9.0
    for state in sorted(states):
        tone, hatch = LOOKS[state]
        y += 1.5 * labels[state].count("\n")
        ax.broken_barh([(0, 4)], (y, 3.2), facecolor=tone, edgecolor="#4a4a4a", hatch=hatch or None, linewidth=0.4)
        ax.text(5.2, y + 1.6, labels[state], va="center", ha="left", linespacing=1.1)
        y += 5.0 + 1.5 * labels[state].count("\n")


def _alt(
    m: Material,
    found: Mapping[str, Any],
    index: int,
    probability: NDArray[np.float64],
    floor: NDArray[np.float64],
    names: Sequence[str],
) -> str:
    block, interval = np.unravel_index(int(np.nanargmax(probability)), probability.shape)
    states = _states(probability, floor)
    starts = int(interval) * m.interval_min
    return m.t(
        f"figure.{NAME}.alt",
        rating=m.kva(found["ratings_kva"][index]),
        highest=m.n.probability(float(probability[block, interval]), float(floor[block, interval])),
        where=f"{names[int(block)]}, {starts // 60:02d}:{starts % 60:02d}",
        above=int((states <= 1).sum()),
        all=int((states != UNSEEN).sum()),
    )
