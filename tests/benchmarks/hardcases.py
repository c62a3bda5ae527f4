"""Hold-out calibration where records are faulty or homes change, and on 25 dirty real loads, for docs/validation.md.

Intervals are by resampling weeks, the same weeks for all groups together: groups of one set share their weather.
"""

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.group import group_demand
from loadsum.demand.hourly import GroupDemand
from loadsum.demand.settings import ModelSettings
from loadsum.evidence.scored import MODELS, SHARES, Scored, alternate_weeks, folds
from loadsum.evidence.scored import scored as against_models
from loadsum.intake.hourclass import DayBlock
from tests.benchmarks.calibration import SEED, SETTINGS, Row, blocks_by_season, home_days, synthetic
from tests.datasets import package_file

ALL_YEAR = (tuple(range(1, 13)),)
QUARTERS = ((12, 1, 2), (3, 4, 5), (6, 7, 8), (9, 10, 11))
THREE_HOURS = slice(7, 24, 6)  # 07, 13 and 19 h
FIRST_DAY = 17897  # Tuesday, 1 January 2019
GAP = 4  # zeros in a row that are taken for a gap in the 15-min loads


def month_missing(kw: NDArray[np.float64], rng: np.random.Generator) -> NDArray[np.float64]:
    """Every fifth customer without readings for four weeks of its own."""
    out = kw.copy()
    for c in range(0, kw.shape[0], 5):
        start = int(rng.integers(kw.shape[1] - 28))
        out[c, start : start + 28] = np.nan
    return out


def away(kw: NDArray[np.float64], rng: np.random.Generator) -> NDArray[np.float64]:
    """Every customer away for two weeks of its own, a tenth of its demand left."""
    out = kw.copy()
    for c in range(kw.shape[0]):
        start = int(rng.integers(kw.shape[1] - 14))
        out[c, start : start + 14] *= 0.1
    return out


def growth(kw: NDArray[np.float64], _: np.random.Generator) -> NDArray[np.float64]:
    """All customers grow by a fifth over the record."""
    return kw * (1.0 + 0.2 * np.arange(kw.shape[1])[None, :, None] / kw.shape[1])


def coarse(kw: NDArray[np.float64], _: np.random.Generator) -> NDArray[np.float64]:
    """Registers that count whole kWh: a reading is the difference of two rounded counts."""
    count = np.floor(np.cumsum(kw.reshape(kw.shape[0], -1), axis=1))
    return np.diff(count, axis=1, prepend=0.0).reshape(kw.shape)


CASES: dict[str, Callable[[NDArray[np.float64], np.random.Generator], NDArray[np.float64]]] = {
    "four weeks missing at every fifth meter": month_missing,
    "everyone away for two weeks": away,
    "growth by a fifth": growth,
    "registers of whole kWh": coarse,
}


def held_out(blocks: Sequence[DayBlock], settings: ModelSettings = SETTINGS) -> Scored | None:
    """Alternate whole weeks fitted and tested, then swapped, every interval kept with its week."""

    def fit(fitting: Sequence[DayBlock]) -> GroupDemand:
        return group_demand(fitting, interval_min=60, power_factor=1.0, settings=settings)

    return against_models(tuple(folds(blocks, None, fit, alternate_weeks())), blocks, np.random.default_rng(SEED))


def by_weeks(name: str, tests: Sequence[Scored], rng: np.random.Generator) -> list[Row]:
    """Rows of one kind of group: all intervals of all groups together, and the interval by resampling weeks."""
    week = np.unique(np.concatenate([test.week for test in tests]), return_inverse=True)[1]
    count = np.bincount(week).astype(np.float64)
    picks = rng.integers(count.size, size=(2000, count.size))
    rows = []
    for model in MODELS:
        passes = np.concatenate([test.passes[model] for test in tests])
        of_week = np.stack([np.bincount(week, weights=passes[:, k], minlength=count.size) for k in range(len(SHARES))])
        drawn = of_week[:, picks].sum(axis=2) / count[picks].sum(axis=1)
        ends = np.quantile(drawn, [0.025, 0.975], axis=1)
        rows.append(
            Row(
                name=name,
                model=model,
                groups=len(tests),
                shares=tuple(passes.mean(axis=0)),
                low=tuple(ends[0]),
                high=tuple(ends[1]),
                pinball_kw=float(np.concatenate([test.losses[model] for test in tests]).mean()),
            )
        )
    return rows


def hard_rows(groups: int = 50, customers: int = 10) -> list[Row]:
    """Known truth with faulty records or changing homes: one season of 26 weeks."""
    rng = np.random.default_rng(SEED + 5)
    rows = []
    for name, change in CASES.items():
        tests = []
        for _ in range(groups):
            kw = change(synthetic(customers, 182, rng), rng)
            tests.append(held_out(blocks_by_season(kw, 18263, ALL_YEAR, THREE_HOURS)))
        rows += by_weeks(f"synthetic, {name}, N = {customers}", [t for t in tests if t is not None], rng)
    return rows


def dirty_loads() -> NDArray[np.float64]:
    """The 25 loads of ev2gym 2.0.0 as hourly demand by whole days, (25, 364, 24); gaps are NaN. [kW]

    Four or more zeros in a row are taken for a gap. The file names no dates; its first reading is taken for that of
    00:00 on 1 January, so days of the week are not known.
    """
    kw = np.loadtxt(package_file("ev2gym", "data/residential_loads.csv"), delimiter=",").T[:, : 364 * 96].copy()
    for load in kw:
        zero = np.concatenate([[False], load == 0.0, [False]])
        edges = np.flatnonzero(np.diff(zero.astype(np.int8)))
        for start, end in edges.reshape(-1, 2):
            if end - start >= GAP:
                load[start:end] = np.nan
    return kw.reshape(25, 364, 24, 4).mean(axis=3)


def dirty_rows(groups: int = 50) -> list[Row]:
    """Groups of the 25 real loads, drawn beforehand, in four seasons of all days."""
    kw = dirty_loads()
    rng = np.random.default_rng(SEED + 6)
    rows = []
    for size in (5, 10, 15):
        tests = []
        for _ in range(groups):
            members = np.sort(rng.choice(25, size, replace=False))
            tests.append(held_out(blocks_by_season(kw[members], FIRST_DAY, QUARTERS, THREE_HOURS)))
        rows += by_weeks(f"25 real loads, N = {size}", [t for t in tests if t is not None], rng)
    return rows


OTHER = {
    "2 borrowed days": {"borrowed_days": 2.0},
    "5 borrowed days": {"borrowed_days": 5.0},
    "20 borrowed days": {"borrowed_days": 20.0},
    "smoothing over 1 h": {"smoothing_h": 1.0},
    "smoothing over 6 h": {"smoothing_h": 6.0},
}


def settings_table(groups: int = 12, size: int = 10) -> str:
    """Other settings against the program's on the same groups, as a table in Markdown."""
    rng = np.random.default_rng(SEED + 7)
    homes, _, first = home_days()
    loads = dirty_loads()

    def drawn(kw: NDArray[np.float64], day: int) -> tuple[DayBlock, ...]:
        members = np.sort(rng.choice(kw.shape[0], size, replace=False))
        # every third hour: smoothing along the day has something to smooth
        return blocks_by_season(kw[members], day, QUARTERS)

    sets = {
        "17 real homes": [drawn(homes, first) for _ in range(groups)],
        "25 real loads": [drawn(loads, FIRST_DAY) for _ in range(groups)],
        "synthetic": [blocks_by_season(synthetic(size, 182, rng), 18263, ALL_YEAR) for _ in range(groups)],
    }
    lines = [
        "| groups of 10 | setting | loss against the program's (interval) | 1 % | 0.1 % |",
        "|---|---|---|---|---|",
    ]
    for name, group_blocks in sets.items():
        plain: list[Scored] = []
        for label, change in {"the program's": {}, **OTHER}.items():
            changed = replace(SETTINGS, **change)
            # only every third hour is there, which the model takes for neighbours: three hours are one of its steps
            settings = replace(changed, smoothing_h=changed.smoothing_h / 3.0)
            found = [test for blocks in group_blocks if (test := held_out(blocks, settings)) is not None]
            plain = plain or found
            lines.append(_against(name, label, plain, found, rng))
    return "\n".join(lines) + "\n"


def _against(name: str, label: str, plain: Sequence[Scored], other: Sequence[Scored], rng: np.random.Generator) -> str:
    """One row: loss of other settings over that of the program's, the same intervals, weeks resampled."""
    week = np.unique(np.concatenate([test.week for test in plain]), return_inverse=True)[1]
    of_week = [
        np.bincount(week, weights=np.concatenate([test.losses["adopted"] for test in tests]))
        for tests in (other, plain)
    ]
    picks = rng.integers(of_week[0].size, size=(2000, of_week[0].size))
    low, high = np.quantile(of_week[0][picks].sum(axis=1) / of_week[1][picks].sum(axis=1), [0.025, 0.975])
    ratio = of_week[0].sum() / of_week[1].sum()
    share = 100.0 * np.concatenate([test.passes["adopted"] for test in other]).mean(axis=0)
    return f"| {name} | {label} | {ratio:.3f} ({low:.3f} to {high:.3f}) | {share[2]:.2f} | {share[3]:.2f} |"
