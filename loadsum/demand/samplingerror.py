"""Interval for the long-run probability, by resampling whole weeks.

Weeks are drawn with replacement; each draw moves and stretches the adopted model as it moves and stretches the
observed sums. The probability at a level is read off the model so moved, without the term for the uncertainty of
the mean, which the resampling replaces.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

COVERS = 0.90  # share of repetitions in which the interval is meant to hold the long-run probability


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Resamples:
    """How resampled weeks move and stretch the distribution of one demand interval.

    Parameters
    ----------
    shift_kw : (R,) float64
        Resampled mean less the mean of the record. [kW]
    stretch : (R,) float64
        Resampled standard deviation over that of the record. [-]
    weeks : int
        Weeks that were resampled. [-]
    """

    shift_kw: NDArray[np.float64]
    stretch: NDArray[np.float64]
    weeks: int

    def __post_init__(self) -> None:
        self.shift_kw.flags.writeable = False
        self.stretch.flags.writeable = False

    def levels_kw(self, asked_kw: NDArray[np.float64], mean_kw: float, long_run_share: float) -> NDArray[np.float64]:
        """Levels at which the adopted model has the resampled probabilities of those asked, (L, R) float64. [kW]

        Parameters
        ----------
        asked_kw : (L,) float64
            Levels asked. [kW]
        mean_kw : float
            Mean of the model. [kW]
        long_run_share : float
            Standard deviation of the model without the uncertainty of the mean, over that with it. [-]
        """
        away = (asked_kw[:, None] - mean_kw - self.shift_kw) / (self.stretch * long_run_share)
        return np.asarray(mean_kw + away, dtype=np.float64)


def resample_weeks(
    sums_kw: NDArray[np.float64], day: NDArray[np.int64], count: int, rng: np.random.Generator
) -> tuple[Resamples | None, ...]:
    """Resamples of every interval of one class of days, all from the same draws of weeks.

    Parameters
    ----------
    sums_kw : (D, I) float64
        Observed time-aligned sums; NaN where a customer is missing. [kW]
    day : (D,) int64
        Local calendar day. [d]
    count : int
        Number of resamples; 0 makes none. [-]
    rng : numpy.random.Generator
        Source of randomness.

    Returns
    -------
    tuple of I Resamples or None
        None where fewer than 4 weeks have readings.
    """
    intervals = sums_kw.shape[1]
    names, place = np.unique((day + 3) // 7, return_inverse=True)
    weeks = names.size
    if count == 0 or weeks < 4:
        nothing: tuple[Resamples | None, ...] = (None,) * intervals
        return nothing
    # how often each week is drawn; m-out-of-n with n - 1 draws has the right variance for the mean of n weeks
    drawn = rng.multinomial(weeks - 1, np.full(weeks, 1.0 / weeks), size=count).astype(np.float64)
    known = np.isfinite(sums_kw)
    filled = np.where(known, sums_kw, 0.0)
    parts = [_by_week(part, place, weeks) for part in (known.astype(np.float64), filled, filled**2)]
    days, first, second = (drawn @ part for part in parts)
    whole = [part.sum(axis=0) for part in parts]
    made: list[Resamples | None] = []
    for i in range(intervals):
        n, mean = whole[0][i], whole[1][i] / max(whole[0][i], 1.0)
        spread = np.sqrt(max(whole[2][i] / max(n, 1.0) - mean**2, 0.0))
        enough = days[:, i] >= 3
        if not enough.any() or spread == 0.0:
            made.append(None)
            continue
        means = first[enough, i] / days[enough, i]
        spreads = np.sqrt(np.maximum(second[enough, i] / days[enough, i] - means**2, 0.0))
        made.append(Resamples(shift_kw=means - mean, stretch=np.maximum(spreads / spread, 0.05), weeks=weeks))
    return tuple(made)


def _by_week(values: NDArray[np.float64], place: NDArray[np.int64], weeks: int) -> NDArray[np.float64]:
    total = np.zeros((weeks, values.shape[1]))
    np.add.at(total, place, values)
    return total
