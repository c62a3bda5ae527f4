"""The full hold-out test: by season, day type, part of the day, month and size of group; months left out; peaks."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand
from loadsum.evidence.heldoutpeaks import DailyPeakScore, RunCount, peak_scores
from loadsum.evidence.holdout import (
    FEWEST_WEEKS,
    HoldOut,
    LevelScore,
    level_scores,
    summary,
    thinned,
    weeks_with_sums,
)
from loadsum.evidence.scored import MODELS, Fold, HeldOut, Scored, alternate_weeks, folds, scored
from loadsum.intake.hourclass import DayBlock

PARTS_OF_DAY = 6
GROUP_SIZES = (2, 5, 10, 20, 40, 80, 160, 320)
GROUPS_OF_A_SIZE = 6
MONTHS_OF_A_YEAR = 12
MOST_HOURS_OF_SUBGROUPS = 64  # demand intervals tested for each random group and each month left out

FitGroup = Callable[[Sequence[DayBlock], NDArray[np.bool_]], GroupDemand]


@dataclass(frozen=True, slots=True, kw_only=True)
class PartScore:
    """Held-out demand against every model in one part of the readings.

    Parameters
    ----------
    by : str
        What the parts are: "season", "day type", "part of the day", "month", "month left out" or "customers".
    name : str
        The part.
    intervals, weeks : int
        Held-out demand intervals, and weeks they come from. [-]
    levels : tuple of LevelScore
        Every model at every level.
    pinball_kw : tuple of float
        Loss at the 99 % level, by model in the order of ``models``. [kW]
    models : tuple of str
        Models.
    """

    by: str
    name: str
    intervals: int
    weeks: int
    levels: tuple[LevelScore, ...]
    pinball_kw: tuple[float, ...]
    models: tuple[str, ...] = MODELS


@dataclass(frozen=True, slots=True, kw_only=True)
class FullHoldOut:
    """The full hold-out test of one group.

    Parameters
    ----------
    whole : HoldOut
        Whole weeks in turn.
    parts : tuple of PartScore
        The same by part.
    daily_peaks : tuple of DailyPeakScore
        Highest demand of held-out days; empty where whole days are too few.
    runs : tuple of RunCount
        Runs above the level meant for one day in ten.
    months_left_out : HoldOut or None
        Each month of the year held out in turn; None where a year is not there.
    notes : tuple of str
        What was left out, and why.
    """

    whole: HoldOut
    parts: tuple[PartScore, ...]
    daily_peaks: tuple[DailyPeakScore, ...]
    runs: tuple[RunCount, ...]
    months_left_out: HoldOut | None
    notes: tuple[str, ...]


def full_hold_out(
    blocks: Sequence[DayBlock],
    served: NDArray[np.bool_],
    fit: FitGroup,
    *,
    rng: np.random.Generator,
    note: str = "",
    progress: Callable[[str, float], None] = lambda what, share: None,
) -> FullHoldOut | None:
    """Every hold-out test that the readings allow; None where fewer than eight weeks have a reading of everyone.

    Parameters
    ----------
    blocks : sequence of DayBlock
        Readings of all metered customers.
    served : (C,) bool
        Customers whose sum is tested.
    fit : callable
        Makes the adopted model of some customers from readings.
    rng : numpy.random.Generator
        Source of randomness: groups drawn, jumps spread, days drawn.
    note : str
        What else to say of how it was done.
    progress : callable
        Told how far the work is.
    """
    weeks = weeks_with_sums(blocks, served)
    if weeks < FEWEST_WEEKS:
        return None
    progress("whole weeks in turn", 0.1)
    in_turn = tuple(folds(blocks, served, lambda some: fit(some, served), alternate_weeks()))
    found = scored(in_turn, blocks, rng)
    if found is None:
        return None
    how = (
        f"Whole weeks in turn were fitted and held out, then swapped: {weeks} weeks, {found.day.size} demand intervals"
    )
    notes = []
    progress("daily peaks and runs", 0.3)
    daily, runs = peak_scores(in_turn, rng)
    if not daily:
        notes.append("daily peaks and runs were not tested: too few days have a reading of everyone in every interval")
    parts = _parts(found, blocks)
    progress("months left out", 0.45)
    months, left_out = _months_left_out(blocks, served, fit, rng)
    if months is None:
        notes.append("months were not left out in turn: the readings do not reach over every month of a year")
    progress("groups of customers drawn at random", 0.6)
    sizes = _by_size(blocks, served, fit, rng)
    if not sizes:
        notes.append("no smaller groups were drawn: too few customers")
    return FullHoldOut(
        whole=summary(found, weeks, f"{how} scored.{f' {note}' if note else ''}"),
        parts=(*parts, *left_out, *sizes),
        daily_peaks=daily,
        runs=runs,
        months_left_out=months,
        notes=tuple(notes),
    )


def _parts(found: Scored, blocks: Sequence[DayBlock]) -> list[PartScore]:
    """By season, day type, part of the day and calendar month."""
    seasons = np.array([block.season for block in blocks])[found.block]
    kinds = np.array([block.day_type for block in blocks])[found.block]
    intervals = blocks[0].kw.shape[2]
    window = found.interval * PARTS_OF_DAY // intervals
    hours = 24 // PARTS_OF_DAY
    months = months_of(found.day)
    rows = [("season", str(name), seasons == name) for name in dict.fromkeys(seasons.tolist())]
    rows += [("day type", str(name), kinds == name) for name in dict.fromkeys(kinds.tolist())]
    rows += [
        ("part of the day", f"{n * hours:02d}:00 to {(n + 1) * hours:02d}:00", window == n) for n in range(PARTS_OF_DAY)
    ]
    rows += [("month", f"{month:02d}", months == month) for month in np.unique(months).tolist()]
    return [part_score(by, name, found.part(chosen)) for by, name, chosen in rows if chosen.any()]


def part_score(by: str, name: str, found: Scored) -> PartScore:
    """Every model in one part."""
    return PartScore(
        by=by,
        name=name,
        intervals=int(found.day.size),
        weeks=int(np.unique(found.week).size),
        levels=tuple(level for model in MODELS for level in level_scores(found, model)),
        pinball_kw=tuple(float(found.losses[model].mean()) for model in MODELS),
    )


def months_of(day: NDArray[np.int64]) -> NDArray[np.int64]:
    """Calendar month of each day, 1 to 12. [-]"""
    return day.astype("datetime64[D]").astype("datetime64[M]").astype(np.int64) % 12 + 1


def _months_left_out(
    blocks: Sequence[DayBlock], served: NDArray[np.bool_], fit: FitGroup, rng: np.random.Generator
) -> tuple[HoldOut | None, list[PartScore]]:
    """Each calendar month held out in turn, where the readings reach over all of them."""
    there = np.unique(np.concatenate([months_of(block.day) for block in blocks]))
    if there.size < MONTHS_OF_A_YEAR:
        return None, []
    some = _thinner(blocks)

    def held_out(month: int) -> HeldOut:
        return lambda day: months_of(day) == month

    made = tuple(folds(some, served, lambda kept: fit(kept, served), [held_out(month) for month in there.tolist()]))
    found = scored(made, some, rng)
    if found is None:
        return None, []
    months = months_of(found.day)
    parts = [part_score("month left out", f"{m:02d}", found.part(months == m)) for m in np.unique(months).tolist()]
    how = "Each month of the year was held out in turn and judged by the others of its season."
    return summary(found, int(np.unique(found.week).size), how), parts


def _by_size(
    blocks: Sequence[DayBlock], served: NDArray[np.bool_], fit: FitGroup, rng: np.random.Generator
) -> list[PartScore]:
    """Groups of the user's customers drawn at random, by their size, all groups of a size together."""
    members = np.flatnonzero(served)
    some = _thinner(blocks)
    rows = []
    for size in (n for n in GROUP_SIZES if n < members.size):
        made: list[Fold] = []
        for _ in range(GROUPS_OF_A_SIZE):
            group = np.zeros(served.size, dtype=bool)
            group[rng.choice(members, size, replace=False)] = True
            if weeks_with_sums(some, group) >= FEWEST_WEEKS:
                made.extend(folds(some, group, _of_group(fit, group), alternate_weeks()))
        found = scored(made, some, rng) if made else None
        if found is not None:
            rows.append(part_score("customers", str(size), found))
    return rows


def _of_group(fit: FitGroup, group: NDArray[np.bool_]) -> Callable[[Sequence[DayBlock]], GroupDemand]:
    return lambda some: fit(some, group)


def _thinner(blocks: Sequence[DayBlock]) -> list[DayBlock]:
    every = max(-(-len(blocks) * blocks[0].kw.shape[2] // MOST_HOURS_OF_SUBGROUPS), 1)
    return [thinned(block, every) for block in blocks]
