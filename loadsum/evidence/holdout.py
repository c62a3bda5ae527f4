"""Hold-out test on the user's own readings: fitted on some weeks, tested on the others, then swapped."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

from loadsum.demand.hourly import GroupDemand, HourDemand
from loadsum.demand.lattice import LatticeMass
from loadsum.evidence.coverage import christoffersen, effective_count, kupiec, p_value
from loadsum.evidence.scores import crps_lattice, crps_normal, crps_sample, pinball
from loadsum.intake.hourclass import DayBlock

FEWEST_WEEKS = 8
SHARES = (0.5, 0.1, 0.01, 0.001)
MODELS = ("adopted", "normal_independent", "normal", "independent", "observed_sum")
PINBALL_SHARE = 0.99
NOT_TESTED = "None of this tests the weather of another year, nor customers that were not metered."


@dataclass(frozen=True, slots=True, kw_only=True)
class LevelScore:
    """How often held-out demand passed one level of one model.

    Parameters
    ----------
    model : str
        Model the level is of.
    expected_share, observed_share : float
        Share of held-out intervals meant to pass, and that did. [-]
    expected_count, observed_count : float
        The same as numbers of intervals. [-]
    chance_low, chance_high : float
        Shares that chance allows in 95 of 100 repetitions if the model is right, with weeks as blocks. [-]
    kupiec_p, clustering_p : float
        Probability by chance of so different a share of intervals that pass, if intervals were independent (too small
        where demand clusters by day), and of so much clustering of days with a pass, if days were independent. [-]
    """

    model: str
    expected_share: float
    observed_share: float
    expected_count: float
    observed_count: float
    chance_low: float
    chance_high: float
    kupiec_p: float
    clustering_p: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ModelScore:
    """Scores of one model on held-out readings; smaller is better.

    Parameters
    ----------
    model : str
        Model.
    pinball_kw : float
        Mean loss at the level meant to lie above 99 % of demand. [kW]
    crps_kw : float
        Mean continuous ranked probability score. [kW]
    """

    model: str
    pinball_kw: float
    crps_kw: float


@dataclass(frozen=True, slots=True, kw_only=True)
class HoldOut:
    """The hold-out test of one group.

    Parameters
    ----------
    how : str
        What was done.
    sentence : str
        What was found, for a reader who is no statistician.
    passed : bool
        Whether the adopted model passed at every level that the readings can judge.
    weeks, intervals : int
        Held-out weeks, and held-out demand intervals scored. [-]
    levels : tuple of LevelScore
        Every model at every level.
    models : tuple of ModelScore
        Every model.
    pit_counts : tuple of int
        Held-out intervals by tenth of the adopted model's distribution they fell into; equal if it is right. [-]
    not_tested : str
        What this does not test.
    """

    how: str
    sentence: str
    passed: bool
    weeks: int
    intervals: int
    levels: tuple[LevelScore, ...]
    models: tuple[ModelScore, ...]
    pit_counts: tuple[int, ...]
    not_tested: str


@dataclass(slots=True)
class _Tally:
    """What accumulates over folds, classes and intervals."""

    passes: dict[str, list[NDArray[np.bool_]]]
    losses: dict[str, list[NDArray[np.float64]]]
    crps: dict[str, list[NDArray[np.float64]]]
    day: list[NDArray[np.int64]]
    pit: NDArray[np.int64]


def week_of(day: NDArray[np.int64]) -> NDArray[np.int64]:
    """Week of a day, Monday first. [-]"""
    return (day + 3) // 7


def part_of(block: DayBlock, rows: NDArray[np.bool_]) -> DayBlock:
    """Some days of a block."""
    return replace(
        block,
        day=block.day[rows].copy(),
        kw=block.kw[:, rows].copy(),
        kvar=None if block.kvar is None else block.kvar[:, rows].copy(),
        temperature_c=None if block.temperature_c is None else block.temperature_c[rows].copy(),
    )


def thinned(block: DayBlock, every: int) -> DayBlock:
    """A block with one in so many intervals of the day."""
    if every == 1:
        return block
    return replace(
        block,
        kw=block.kw[:, :, ::every].copy(),
        kvar=None if block.kvar is None else block.kvar[:, :, ::every].copy(),
    )


def hold_out(
    blocks: Sequence[DayBlock],
    *,
    fit: Callable[[Sequence[DayBlock]], GroupDemand],
    served: NDArray[np.bool_] | None = None,
    most_hours: int = 200,
    note: str = "",
) -> HoldOut | None:
    """Alternate whole weeks fitted and tested, then the other way round.

    Parameters
    ----------
    blocks : sequence of DayBlock
        Readings of all metered customers.
    fit : callable
        Makes the adopted model from readings.
    served : (C,) bool or None
        Customers whose sum is tested; all when None.
    most_hours : int
        Demand intervals of all classes of days that are tested; where there are more, every second, third or so of
        the day. [-]
    note : str
        What else to say of how it was done.

    Returns
    -------
    HoldOut or None
        None where fewer than eight weeks have a reading of every customer served.
    """
    every = max(-(-len(blocks) * blocks[0].kw.shape[2] // most_hours), 1)
    blocks = [thinned(block, every) for block in blocks]
    sums = [block.kw.sum(axis=0) if served is None else block.kw[served].sum(axis=0) for block in blocks]
    with_sums = [week_of(b.day)[np.isfinite(s).any(axis=1)] for b, s in zip(blocks, sums, strict=True)]
    weeks = np.unique(np.concatenate(with_sums))
    if weeks.size < FEWEST_WEEKS:
        return None
    tally = _Tally(
        passes={m: [] for m in MODELS},
        losses={m: [] for m in MODELS},
        crps={m: [] for m in MODELS},
        day=[],
        pit=np.zeros(10, dtype=np.int64),
    )
    for fold in (0, 1):
        fitting = [part_of(block, week_of(block.day) % 2 == fold) for block in blocks]
        if any(block.day.size == 0 for block in fitting):
            fitting = [block for block in fitting if block.day.size]
        demand = fit(fitting)
        made = {(b.season, b.day_type): n for n, b in enumerate(demand.blocks)}
        for block, total in zip(blocks, sums, strict=True):
            n = made.get((block.season, block.day_type))
            if n is None:
                continue
            rows = week_of(block.day) % 2 != fold
            warmth = None if block.temperature_c is None else block.temperature_c[rows]
            for i, hour in enumerate(demand.hours[n]):
                known = np.isfinite(total[rows, i])
                if hour is not None and known.any():
                    fitted = demand.sums_kw[n][:, i]
                    _score(
                        tally,
                        hour,
                        total[rows, i][known],
                        block.day[rows][known],
                        None if warmth is None else warmth[known],
                        fitted[np.isfinite(fitted)],
                    )
    if not tally.day:
        return None
    return _summary(tally, int(weeks.size), every, note)


def _score(
    tally: _Tally,
    hour: HourDemand,
    observed: NDArray[np.float64],
    day: NDArray[np.int64],
    warmth: NDArray[np.float64] | None,
    fitted: NDArray[np.float64],
) -> None:
    """Adds the held-out demand of one interval to the tally."""
    shares = np.array(SHARES)
    tally.day.append(day)
    mean = hour.independent.mean_kw()
    spreads = {
        "normal_independent": np.sqrt(hour.independent.central_moment(2)),
        "normal": np.sqrt(hour.covariance_variance_kw2),
    }
    level = {name: mean - ndtri(shares) * spread for name, spread in spreads.items()}
    above = np.append(np.cumsum(hour.independent.mass[::-1])[::-1][1:], 0.0)
    place = np.minimum(np.searchsorted(-above, -shares), above.size - 1)
    level["independent"] = hour.independent.points_kw[place]
    level["observed_sum"] = np.quantile(fitted, 1.0 - shares) if fitted.size else np.full(shares.size, np.nan)
    moved = _moved(hour, warmth)
    still = hour.quantiles_kw(shares) if moved is None else None
    for name in MODELS:
        if name == "adopted":
            levels = np.tile(still, (observed.size, 1)) if still is not None else moved.quantiles_kw(shares)  # type: ignore[union-attr]
        else:
            levels = np.tile(level[name], (observed.size, 1))
        tally.passes[name].append(observed[:, None] > levels)
        tally.losses[name].append(pinball(levels[:, SHARES.index(0.01)], observed, PINBALL_SHARE))
    one = hour.whole_up
    tally.crps["adopted"].append(
        crps_lattice(one, observed) if moved is None else moved.stretch * crps_lattice(moved.law, moved.back(observed))
    )
    for name, spread in spreads.items():
        tally.crps[name].append(crps_normal(np.array(mean), np.array(max(spread, 1e-9)), observed))
    tally.crps["independent"].append(crps_lattice(hour.independent, observed))
    tally.crps["observed_sum"].append(crps_sample(fitted, observed) if fitted.size else np.full(observed.size, np.nan))
    exceeded = one.above_many(observed) if moved is None else moved.law.above_many(moved.back(observed))
    tally.pit += np.bincount(np.minimum((10.0 * (1.0 - exceeded)).astype(int), 9), minlength=10)


@dataclass(frozen=True, slots=True)
class _Moved:
    """An interval's law given the temperature of each held-out day: one law, shifted and stretched."""

    hour: HourDemand
    shift_kw: NDArray[np.float64]
    stretch: NDArray[np.float64]

    @property
    def law(self) -> LatticeMass:
        """The law of a day of no shift."""
        return self.hour.whole_up

    def quantiles_kw(self, shares: NDArray[np.float64]) -> NDArray[np.float64]:
        mean = self.hour.mean_kw()
        away = self.hour.quantiles_kw(shares) - mean
        return np.asarray(mean + self.shift_kw[:, None] + self.stretch[:, None] * away, dtype=np.float64)

    def back(self, observed: NDArray[np.float64]) -> NDArray[np.float64]:
        """Where demand would stand in the law of a day of no shift. [kW]"""
        mean = self.hour.mean_kw()
        return np.asarray(mean + (observed - mean - self.shift_kw) / self.stretch, dtype=np.float64)


def _moved(hour: HourDemand, warmth: NDArray[np.float64] | None) -> _Moved | None:
    if hour.response is None or warmth is None or not np.isfinite(warmth).all():
        return None
    spread = float(np.sqrt(hour.response.shift_variance_kw2(warmth).mean()))
    return _Moved(hour.without_temperature(spread), hour.response.shift_kw(warmth), hour.response.stretch(warmth))


def _summary(tally: _Tally, weeks: int, every: int, note: str) -> HoldOut:
    day = np.concatenate(tally.day)
    week = np.unique(week_of(day), return_inverse=True)[1]
    intervals = np.bincount(week).astype(np.float64)
    levels = []
    for name in MODELS:
        passes = np.concatenate(tally.passes[name])
        for k, share in enumerate(SHARES):
            by_week = np.bincount(week, weights=passes[:, k]).astype(np.float64)
            worth = effective_count(by_week, intervals, share)
            half = 1.96 * np.sqrt(share * (1.0 - share) / worth)
            top = share + max(half, 3.0 / worth)
            days = np.unique(day, return_inverse=True)[1]
            ever = np.bincount(days, weights=passes[:, k]) > 0
            levels.append(
                LevelScore(
                    model=name,
                    expected_share=share,
                    observed_share=float(passes[:, k].mean()),
                    expected_count=share * passes.shape[0],
                    observed_count=float(passes[:, k].sum()),
                    chance_low=max(share - half, 0.0),
                    chance_high=float(top),
                    kupiec_p=p_value(kupiec(passes.shape[0], int(passes[:, k].sum()), share), 1),
                    clustering_p=_clustering(ever),
                )
            )
    models = tuple(
        ModelScore(
            model=name,
            pinball_kw=float(np.concatenate(tally.losses[name]).mean()),
            crps_kw=float(np.concatenate(tally.crps[name]).mean()),
        )
        for name in MODELS
    )
    mine = [row for row in levels if row.model == "adopted"]
    return HoldOut(
        how=(
            "Whole weeks in turn were fitted and held out, then swapped: "
            f"{weeks} weeks, {day.size} demand intervals scored"
            f"{'' if every == 1 else f', one in {every} of the day'}."
            f"{f' {note}' if note else ''}"
        ),
        sentence=plain_sentence(mine),
        passed=all(row.observed_share <= row.chance_high for row in mine[1:]),
        weeks=weeks,
        intervals=int(day.size),
        levels=tuple(levels),
        models=models,
        pit_counts=tuple(tally.pit.tolist()),
        not_tested=NOT_TESTED,
    )


def _clustering(ever: NDArray[np.bool_]) -> float:
    """Probability by chance of so much clustering of days with a pass, days taken in order."""
    before, after = ever[:-1], ever[1:]
    if not ever.any() or ever.all():
        return 1.0
    t00, t01 = int((~before & ~after).sum()), int((~before & after).sum())
    t10, t11 = int((before & ~after).sum()), int((before & after).sum())
    return p_value(christoffersen(t00, t01, t10, t11, float(ever.mean())).independence, 1)


def plain_sentence(rows: Sequence[LevelScore]) -> str:
    """What the test found, in one sentence; where the model failed, what to make of it."""
    high = next(row for row in rows if row.expected_share == 0.01)
    share = f"{100.0 * high.observed_share:.2g} %"
    chance = f"{100.0 * high.chance_low:.2g} to {100.0 * high.chance_high:.2g} %"
    if high.observed_share > high.chance_high:
        return (
            f"Held-out demand exceeded the 99 % level {share} of the time, expected 1 %: treat exceedance below 1 % as "
            "understated."
        )
    if high.observed_share < high.chance_low:
        return (
            f"Held-out demand exceeded the 99 % level {share} of the time, expected 1 %: the model is on the cautious "
            "side here."
        )
    return (
        f"On weeks it had not seen, demand exceeded the model's 99 % level {share} of the time; 1 % was meant, and "
        f"chance alone allows {chance}."
    )
