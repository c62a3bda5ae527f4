"""Hold-out test on the user's own readings: fitted on some weeks, tested on the others, then swapped."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from loadsum.evidence.coverage import chance_range, christoffersen, effective_count, kupiec, p_value
from loadsum.evidence.scored import MODELS, SHARES, Fit, Scored, alternate_weeks, folds, scored, sums_of, week_of
from loadsum.intake.hourclass import DayBlock

FEWEST_WEEKS = 8
MATERIAL = 1.5  # a share of passes up to so many times that meant is not called a failure, however sure it is
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
        Probability by chance of so different a share of intervals that pass, with as many independent intervals as the
        weeks are worth, and of so much clustering of days with a pass, if days were independent. [-]
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
        Whether the adopted model passed at every level from 10 % on: no more intervals above than chance allows, or no
        more than 1.5 times those meant.
    weeks, intervals : int
        Held-out weeks, and held-out demand intervals scored. [-]
    levels : tuple of LevelScore
        Every model at every level.
    models : tuple of ModelScore
        Every model.
    pit_counts : tuple of int
        Held-out intervals by tenth of the adopted model's distribution they fell into, jumps spread at random; equal
        if it is right. [-]
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
    fit: Fit,
    served: NDArray[np.bool_] | None = None,
    most_hours: int = 200,
    note: str = "",
    rng: np.random.Generator | None = None,
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
    rng : numpy.random.Generator or None
        Source of the randomness that spreads jumps of the distribution; seeded with 0 when None.

    Returns
    -------
    HoldOut or None
        None where fewer than eight weeks have a reading of every customer served.
    """
    every = max(-(-len(blocks) * blocks[0].kw.shape[2] // most_hours), 1)
    blocks = [thinned(block, every) for block in blocks]
    weeks = weeks_with_sums(blocks, served)
    if weeks < FEWEST_WEEKS:
        return None
    found = scored(tuple(folds(blocks, served, fit, alternate_weeks())), blocks, rng or np.random.default_rng(0))
    if found is None:
        return None
    thinly = "" if every == 1 else f", one in {every} of the day"
    how = (
        f"Whole weeks in turn were fitted and held out, then swapped: {weeks} weeks, {found.day.size} demand intervals "
        f"scored{thinly}.{f' {note}' if note else ''}"
    )
    return summary(found, weeks, how)


def weeks_with_sums(blocks: Sequence[DayBlock], served: NDArray[np.bool_] | None) -> int:
    """Weeks in which every customer served has a reading at once. [-]"""
    sums = sums_of(blocks, served)
    found = [week_of(b.day)[np.isfinite(s).any(axis=1)] for b, s in zip(blocks, sums, strict=True)]
    return int(np.unique(np.concatenate(found)).size)


def summary(found: Scored, weeks: int, how: str) -> HoldOut:
    """What held-out intervals say of every model.

    Parameters
    ----------
    found : Scored
        Held-out intervals.
    weeks : int
        Weeks they come from. [-]
    how : str
        What was done.
    """
    levels = tuple(level for name in MODELS for level in level_scores(found, name))
    mine = [row for row in levels if row.model == "adopted"]
    return HoldOut(
        how=how,
        sentence=plain_sentence(mine),
        passed=all(accepted(row) for row in mine[1:]),
        weeks=weeks,
        intervals=int(found.day.size),
        levels=levels,
        models=tuple(
            ModelScore(model=name, pinball_kw=float(found.losses[name].mean()), crps_kw=float(found.crps[name].mean()))
            for name in MODELS
        ),
        pit_counts=tuple(np.bincount(np.minimum((10.0 * found.pit).astype(int), 9), minlength=10).tolist()),
        not_tested=NOT_TESTED,
    )


def accepted(row: LevelScore) -> bool:
    """Whether a level was passed no more often than chance allows, or not by so much that it matters."""
    return row.observed_share <= max(row.chance_high, MATERIAL * row.expected_share)


def level_scores(found: Scored, model: str) -> tuple[LevelScore, ...]:
    """How often held-out demand passed the four levels of one model."""
    week = np.unique(found.week, return_inverse=True)[1]
    day = np.unique(found.day, return_inverse=True)[1]
    intervals = np.bincount(week).astype(np.float64)
    passes = found.passes[model]
    rows = []
    for k, share in enumerate(SHARES):
        by_week = np.bincount(week, weights=passes[:, k]).astype(np.float64)
        worth = effective_count(by_week, intervals, share)
        low, high = chance_range(worth, share, int(intervals.size))
        observed = float(passes[:, k].mean())
        rows.append(
            LevelScore(
                model=model,
                expected_share=share,
                observed_share=observed,
                expected_count=share * passes.shape[0],
                observed_count=float(passes[:, k].sum()),
                chance_low=low,
                chance_high=high,
                kupiec_p=p_value(kupiec(worth, observed * worth, share), 1),
                clustering_p=_clustering(np.bincount(day, weights=passes[:, k]) > 0),
            )
        )
    return tuple(rows)


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
    if not accepted(high):
        return (
            f"Held-out demand exceeded the 99 % level {share} of the time, expected 1 %: treat exceedance below 1 % as "
            "understated."
        )
    if high.observed_share < high.chance_low:
        return (
            f"Held-out demand exceeded the 99 % level {share} of the time, expected 1 %: the model is on the cautious "
            "side here."
        )
    more = " A little more than chance allows, and less than 1.5 times what was meant."
    return (
        f"On weeks it had not seen, demand exceeded the model's 99 % level {share} of the time; 1 % was meant, and "
        f"chance alone allows {chance}.{more if high.observed_share > high.chance_high else ''}"
    )
