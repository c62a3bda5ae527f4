"""Hold-out calibration on populations whose truth is known, and on real homes: the figures of docs/validation.md.

Alternate whole weeks are fitted and tested, then swapped. Groups and seeds are fixed here, before anything is scored.
Intervals are by resampling the weeks of all groups together.
"""

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.group import group_demand
from loadsum.demand.hourly import GroupDemand
from loadsum.demand.settings import ModelSettings
from loadsum.evidence.holdout import HoldOut, hold_out
from loadsum.evidence.scored import MODELS, SHARES
from loadsum.intake.hourclass import EPOCH, DayBlock
from tests.datasets import FIRST_STAMP, real_homes, real_homes_temperature

SETTINGS = ModelSettings(lattice_kw=0.05)
SEED = 20310504
ALL = slice(0, 24)
SEASONS = ((12, 1, 2), (3, 4, 5), (6, 7, 8), (9, 10, 11))
HOURS = slice(0, 24, 3)  # every third hour: eight demand intervals a day


@dataclass(frozen=True)
class Row:
    """One model on one kind of group."""

    name: str
    model: str
    groups: int
    shares: tuple[float, ...]
    low: tuple[float, ...]
    high: tuple[float, ...]
    pinball_kw: float


def fit(blocks: Sequence[DayBlock]) -> GroupDemand:
    """The adopted model on a coarse lattice."""
    return group_demand(blocks, interval_min=60, power_factor=1.0, settings=SETTINGS)


def blocks_by_season(
    kw: NDArray[np.float64], first_day: int, months: Sequence[Sequence[int]], hours: slice = HOURS
) -> tuple[DayBlock, ...]:
    """Whole days of hourly readings (C, D, 24) as blocks of season and day type."""
    days = np.arange(first_day, first_day + kw.shape[1])
    month = np.array([(EPOCH + dt.timedelta(days=int(day))).month for day in days])
    weekend = (days + 3) % 7 >= 5
    made = []
    for n, names in enumerate(months):
        for kind in (False, True):
            rows = np.isin(month, names) & (weekend == kind)
            made.append(
                DayBlock(
                    season=f"season {n + 1}",
                    day_type="weekend" if kind else "workday",
                    days_per_year=float(rows.sum()),
                    day=days[rows],
                    kw=np.ascontiguousarray(kw[:, rows][:, :, hours]),
                )
            )
    return tuple(made)


def synthetic(
    customers: int,
    days: int,
    rng: np.random.Generator,
    *,
    correlation: float = 0.05,
    heavy: int = 0,
    timers: int = 0,
    drift: float = 0.0,
) -> NDArray[np.float64]:
    """Skewed customers with a common component of known correlation, (C, D, 24). [kW]

    Each customer: gamma demand about its own mean and daily shape, with rare appliance spikes; what all share is one
    gamma factor a day and hour whose variance gives the mean correlation asked for.
    """
    hour = np.arange(24)
    shape = 0.5 + np.exp(-0.5 * ((hour - 19) / 2.5) ** 2) + 0.6 * np.exp(-0.5 * ((hour - 8) / 2.0) ** 2)
    mean = rng.lognormal(-0.3, 0.5, customers)
    mean[:heavy] *= 8.0
    own = rng.gamma(1.2, 1 / 1.2, (customers, days, 24))
    spikes = (rng.random((customers, days, 24)) < 0.03) * rng.uniform(1.0, 4.0, (customers, days, 24))
    kw = mean[:, None, None] * shape * own + spikes
    if correlation > 0.0:
        # a zero-mean skewed factor a day and hour, added in proportion to each customer's standard deviation
        moved = (rng.gamma(4.0, 0.25, (days, 24)) - 1.0) * 2.0
        spread = kw.std(axis=1)
        kw = kw + np.sqrt(correlation / (1.0 - correlation)) * spread[:, None, :] * moved
    if timers:
        on = rng.random((timers, days)) < 0.35
        kw[:timers, :, 22:24] += 7.0 * on[:, :, None]
    if drift:
        kw[0] *= 1.0 + drift * np.arange(days)[:, None] / days
    return np.maximum(kw, 0.0)


def scored(name: str, tests: Sequence[HoldOut], rng: np.random.Generator) -> list[Row]:
    """Rows of one kind of group: means over groups, and the interval by resampling groups."""
    rows = []
    for model in MODELS:
        found = np.array([[row.observed_share for row in test.levels if row.model == model] for test in tests])
        picks = rng.integers(len(tests), size=(2000, len(tests)))
        ends = np.quantile(found[picks].mean(axis=1), [0.025, 0.975], axis=0)
        loss = float(np.mean([next(m.pinball_kw for m in test.models if m.model == model) for test in tests]))
        rows.append(
            Row(
                name=name,
                model=model,
                groups=len(tests),
                shares=tuple(found.mean(axis=0)),
                low=tuple(ends[0]),
                high=tuple(ends[1]),
                pinball_kw=loss,
            )
        )
    return rows


def home_days() -> tuple[NDArray[np.float64], NDArray[np.float64], int]:
    """The 17 homes by whole days from 1 August, (17, D, 24), their lagged daily means, (D,), and the first day."""
    _, kw = real_homes()
    days = (kw.shape[1] - 1) // 24
    whole = slice(1, 1 + 24 * days)
    mean_c = real_homes_temperature()[whole].reshape(days, 24).mean(axis=1)
    lagged_c = 0.7 * mean_c + 0.3 * np.concatenate([mean_c[:1], mean_c[:-1]])
    return kw[:, whole].reshape(17, days, 24), lagged_c, (FIRST_STAMP.date() - EPOCH).days + 1


def real_rows() -> list[Row]:
    """The 17 homes in four seasons, in groups drawn beforehand."""
    kw, _, first = home_days()
    rng = np.random.default_rng(SEED)
    rows = []
    for size, groups in ((5, 50), (10, 50), (15, 50), (17, 1)):
        tests = []
        for _ in range(groups):
            members = np.sort(rng.choice(17, size, replace=False))
            tests.append(hold_out(blocks_by_season(kw[members], first, SEASONS), fit=fit))
        rows += scored(f"17 real homes, N = {size}", [t for t in tests if t is not None], rng)
    return rows


def heated(customers: int, days: int, rng: np.random.Generator) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Homes heated by electricity over a winter: daily temperature, (D,), and demand, (C, D, 8). [°C, kW]

    Heating runs a share of each interval that grows as it gets colder, so that cold days scatter demand more.
    """
    day = np.arange(days)
    weather = np.convolve(rng.normal(0.0, 3.0, days + 2), np.ones(3) / 1.7, "valid")
    temperature = 3.0 + 6.0 * np.sin(2.0 * np.pi * day / days) + weather
    shape = (customers, days, 8)
    other = rng.lognormal(-0.5, 0.4, (customers, 1, 1)) * rng.gamma(1.3, 1.0 / 1.3, shape)
    rating, leak = rng.uniform(3.0, 8.0, (customers, 1, 1)), rng.uniform(0.5, 1.5, (customers, 1, 1))
    share = np.clip(leak * 0.03 * np.maximum(16.0 - temperature, 0.0)[None, :, None], 1e-3, 0.999)
    running = rng.beta(np.broadcast_to(2.0 * share, shape), np.broadcast_to(2.0 - 2.0 * share, shape))
    habit = np.maximum(1.0 + 0.15 * rng.standard_normal((1, days, 8)), 0.0)
    return temperature, other + rating * running * habit


def heated_rows() -> list[Row]:
    """Conditional on the temperature of the held-out day."""
    rng = np.random.default_rng(SEED + 4)
    rows = []
    for size, groups in ((5, 50), (25, 50), (80, 20)):
        tests = []
        for _ in range(groups):
            warmth, kw = heated(size, 112, rng)
            block = DayBlock(
                season="winter",
                day_type="all days",
                days_per_year=112.0,
                day=np.arange(18263, 18263 + 112),
                kw=kw,
                temperature_c=warmth,
            )
            tests.append(hold_out([block], fit=fit))
        rows += scored(f"heated by electricity, N = {size}", [t for t in tests if t is not None], rng)
    kw, lagged_c, first = home_days()
    for size, groups in ((5, 50), (17, 1)):
        tests = []
        for _ in range(groups):
            members = np.sort(rng.choice(17, size, replace=False))
            blocks = blocks_by_season(kw[members], first, SEASONS)
            given = [replace(block, temperature_c=lagged_c[block.day - first].copy()) for block in blocks]
            tests.append(hold_out(given, fit=fit))
        rows += scored(f"17 real homes and temperature, N = {size}", [t for t in tests if t is not None], rng)
    return rows


POPULATIONS = {
    "correlation 0.05": {},
    "independent": {"correlation": 0.0},
    "correlation 0.2": {"correlation": 0.2},
    "two heavy customers": {"heavy": 2},
    "timers": {"timers": 3},
    "a meter that drifts to twice": {"drift": 1.0},
}


def synthetic_rows() -> list[Row]:
    """Known truth: one season of 26 weeks."""
    rows = []
    rng = np.random.default_rng(SEED + 1)
    cases = [("correlation 0.05", n, 50) for n in (5, 10, 25, 60, 150)]
    cases += [(name, 25, 50) for name in POPULATIONS if name != "correlation 0.05"]
    for name, size, groups in cases:
        tests = []
        for _ in range(groups):
            kw = synthetic(size, 182, rng, **POPULATIONS[name])
            tests.append(hold_out(blocks_by_season(kw, 18263, [range(1, 13)]), fit=fit))
        rows += scored(f"synthetic, {name}, N = {size}", [t for t in tests if t is not None], rng)
    return rows


def variance_ratios(replications: int = 16) -> list[tuple[float, int, float]]:
    """Variance of the model, its uncertainty left out, over the true variance, by correlation and customers metered."""
    rng = np.random.default_rng(SEED + 2)
    settings = replace(SETTINGS, mean_uncertainty=False)
    found = []
    for correlation in (0.0, 0.05, 0.2):
        for size in (5, 17, 40):
            ratios = []
            for _ in range(replications):
                state = rng.integers(2**32)
                short = synthetic(size, 91, np.random.default_rng(state), correlation=correlation)
                block = blocks_by_season(short, 18263, [range(1, 13)], ALL)[0]
                demand = group_demand([block], interval_min=60, power_factor=1.0, settings=settings)
                model = sum(h.variance_kw2() for h in demand.hours[0] if h is not None)
                # the same seed draws the same customers' means first
                long = synthetic(size, 1500, np.random.default_rng(state), correlation=correlation)
                ratios.append(model / float(long.sum(axis=0).var(axis=0, ddof=1).sum()))
            found.append((correlation, size, float(np.mean(ratios))))
    return found


def interval_coverage(replications: int = 60) -> list[tuple[float, float, float]]:
    """How often the 90 % interval holds the true probability, and how often truth lies above its upper end."""
    rng = np.random.default_rng(SEED + 3)
    settings = replace(SETTINGS, resamples=200)
    inside: dict[float, list[bool]] = {p: [] for p in (0.1, 0.01, 0.001)}
    above: dict[float, list[bool]] = {p: [] for p in inside}
    for _ in range(replications):
        state = rng.integers(2**32)
        short = synthetic(10, 91, np.random.default_rng(state))
        long = synthetic(10, 30_000, np.random.default_rng(state)).sum(axis=0)
        block = blocks_by_season(short, 18263, [range(1, 13)], ALL)[0]
        demand = group_demand(
            [block], interval_min=60, power_factor=1.0, settings=settings, rng=np.random.default_rng(state)
        )
        for i in (3, 8, 13, 19, 22):
            for p in inside:
                got = demand.hours[0][i].exceedance(float(np.quantile(long[:, i], 1.0 - p)))
                inside[p].append(got.low <= p <= got.high)
                above[p].append(p > got.high)
    return [(p, float(np.mean(inside[p])), float(np.mean(above[p]))) for p in inside]


def table(rows: Sequence[Row]) -> str:
    """Rows as a table in Markdown, shares in per cent with the interval of the last two."""
    head = "| group | model | groups | 50 % | 10 % | 1 % (interval) | 0.1 % (interval) | loss at 99 % [kW] |"
    lines = [head, "|---|---|---|---|---|---|---|---|"]
    for row in rows:
        cells = [f"{100 * row.shares[k]:.3g}" for k in range(2)]
        cells += [
            f"{100 * row.shares[k]:.2f} ({100 * row.low[k]:.2f} to {100 * row.high[k]:.2f})"
            for k in range(2, len(SHARES))
        ]
        name = row.model.replace("_", " ")
        lines.append(f"| {row.name} | {name} | {row.groups} | {' | '.join(cells)} | {row.pinball_kw:.4f} |")
    return "\n".join(lines)
