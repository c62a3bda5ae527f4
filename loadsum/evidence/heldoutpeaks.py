"""Daily peaks and runs of high demand on days that the model has not seen."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.evidence.scored import Fold, week_of
from loadsum.peak.copula import choose_copula, weather_free_sums
from loadsum.peak.margins import margins
from loadsum.peak.passing import Passing
from loadsum.peak.runlengths import score_runs
from loadsum.peak.weather import DAYS, YearsOfDays

DAILY_SHARES = (0.10, 0.05, 0.01)
RUN_SHARE = 0.10
ROUNDS = 20  # years that the held-out days are strung into, so that each counts alike to 1 in 20 or better
FEWEST_DAYS = 20  # held-out days of a fold with every interval, fewer of which say nothing of daily peaks


@dataclass(frozen=True, slots=True, kw_only=True)
class DailyPeakScore:
    """How often the highest demand of held-out days passed a level.

    Parameters
    ----------
    expected_share, observed_share : float
        Share of held-out days meant to pass, and that did. [-]
    observed_days, days : int
        Days that did, and held-out days with a reading in every interval. [d]
    """

    expected_share: float
    observed_share: float
    observed_days: int
    days: int


@dataclass(frozen=True, slots=True, kw_only=True)
class RunCount:
    """Runs of demand above the level meant for one day in ten.

    Parameters
    ----------
    at_least_intervals : int
        Shortest run counted. [-]
    expected, observed, standard_error : float
        Runs on the held-out days by the model, as they came, and the error of the latter. [-]
    """

    at_least_intervals: int
    expected: float
    observed: float
    standard_error: float


def peak_scores(
    folds: Sequence[Fold], rng: np.random.Generator
) -> tuple[tuple[DailyPeakScore, ...], tuple[RunCount, ...]]:
    """Daily peaks and runs of all folds; nothing where whole days are too few.

    Levels are those that the model expects to be passed by the stated share of the very days held out, with their
    classes and temperatures.

    Parameters
    ----------
    folds : sequence of Fold
        Models with the days they have not seen.
    rng : numpy.random.Generator
        Source of randomness.
    """
    passed, days = np.zeros(len(DAILY_SHARES), dtype=np.int64), 0
    runs = []
    for fold in folds:
        whole = [_whole_days(fold, b) for b in range(len(fold.blocks))]
        of_fold = sum(int(rows.sum()) for rows in whole)
        if of_fold < FEWEST_DAYS or not fold.demand.covered().all():
            continue
        copula, _ = choose_copula(weather_free_sums(fold.demand), [week_of(b.day) for b in fold.demand.blocks])
        block = np.concatenate([np.full(int(rows.sum()), b) for b, rows in enumerate(whole)])
        warmth = _temperatures(fold, whole)
        again = (np.arange(ROUNDS * DAYS) % block.size).reshape(ROUNDS, DAYS)  # the held-out days, over and over
        years = YearsOfDays(
            year=np.arange(ROUNDS),
            block=block[again],
            daily_c=None if warmth is None else np.concatenate(warmth)[again],
            by_interval_c=None,
        )
        tables = margins(fold.demand, copula, years=years)
        over = Passing(margins=tables, copula=copula, years=years, seed=int(rng.integers(2**62)), direction="delivered")
        curve = over.curve(largest_day=max(DAILY_SHARES), smallest_year=0.2)
        sums = [fold.sums_kw[b][rows] for b, rows in enumerate(whole)]
        peak = np.concatenate(
            [(kw * np.hypot(1.0, tables.kvar_per_kw[b])).max(axis=1) for b, kw in enumerate(sums) if kw.size]
        )
        levels = np.array([curve.level_kva("day", share) for share in DAILY_SHARES])
        passed += (peak[:, None] > levels).sum(axis=0)
        days += of_fold
        level = np.full(len(fold.blocks), levels[DAILY_SHARES.index(RUN_SHARE)])
        runs.append(score_runs(tables, copula, sums, level, rng, temperature_c=warmth))
    if days == 0:
        return (), ()
    daily = tuple(
        DailyPeakScore(expected_share=share, observed_share=int(n) / days, observed_days=int(n), days=days)
        for share, n in zip(DAILY_SHARES, passed, strict=True)
    )
    counted = tuple(
        RunCount(
            at_least_intervals=length,
            expected=sum(score.expected[k] for score in runs),
            observed=sum(score.observed[k] for score in runs),
            standard_error=float(np.sqrt(sum(score.standard_error[k] ** 2 for score in runs))),
        )
        for k, length in enumerate(runs[0].at_least_intervals)
    )
    return daily, counted


def _whole_days(fold: Fold, b: int) -> NDArray[np.bool_]:
    """Held-out days of a class with a reading in every interval, and a temperature where the model needs one."""
    rows = np.isfinite(fold.sums_kw[b]).all(axis=1)
    temperature = fold.blocks[b].temperature_c
    return np.asarray(rows if temperature is None else rows & np.isfinite(temperature))


def _temperatures(fold: Fold, whole: Sequence[NDArray[np.bool_]]) -> list[NDArray[np.float64]] | None:
    if any(block.temperature_c is None for block in fold.blocks):
        return None
    return [
        np.asarray(block.temperature_c)[rows].astype(np.float64) for block, rows in zip(fold.blocks, whole, strict=True)
    ]
