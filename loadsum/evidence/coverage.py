"""Tests of whether a level was passed as often as it was meant to be."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import xlogy
from scipy.stats import chi2, t


def kupiec(count: float, passed: float, share: float) -> float:
    """Likelihood ratio of an unconditional share of passes; chi-squared with one degree of freedom. [-]

    References
    ----------
    .. [1] Kupiec, Journal of Derivatives 3(2) (1995) 73-84.
    """
    found = passed / count
    meant = xlogy(count - passed, 1.0 - share) + xlogy(passed, share)
    best = xlogy(count - passed, 1.0 - found) + xlogy(passed, found)
    return max(float(-2.0 * (meant - best)), 0.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Christoffersen:
    """Likelihood ratios of the share of passes, of their independence, and of both."""

    share: float
    independence: float
    both: float


def christoffersen(t00: int, t01: int, t10: int, t11: int, share: float) -> Christoffersen:
    """Tests from the numbers of pairs of days: none-none, none-pass, pass-none, pass-pass.

    References
    ----------
    .. [1] Christoffersen, International Economic Review 39 (1998) 841-862.
    """
    after_none, after_pass = t01 / max(t00 + t01, 1), t11 / max(t10 + t11, 1)
    overall = (t01 + t11) / (t00 + t01 + t10 + t11)
    free = xlogy(t00, 1.0 - after_none) + xlogy(t01, after_none) + xlogy(t10, 1.0 - after_pass) + xlogy(t11, after_pass)
    tied = xlogy(t00 + t10, 1.0 - overall) + xlogy(t01 + t11, overall)
    unconditional = kupiec(t00 + t01 + t10 + t11, t01 + t11, share)
    independence = max(float(-2.0 * (tied - free)), 0.0)
    return Christoffersen(share=unconditional, independence=independence, both=unconditional + independence)


def p_value(ratio: float, freedom: int) -> float:
    """Probability of a likelihood ratio at least this large by chance. [-]"""
    return float(chi2.sf(ratio, freedom))


def chance_range(worth: float, share: float, weeks: int) -> tuple[float, float]:
    """Shares of passes that chance allows in 95 of 100 repetitions if the level is right. [-]

    The spread of the weekly counts is itself known from so many weeks only, so Student's law is used. Where passes are
    rare, three of the intervals that the weeks are worth may pass as well.

    Parameters
    ----------
    worth : float
        Independent intervals that the weeks are worth, from :func:`effective_count`. [-]
    share : float
        Share meant to pass. [-]
    weeks : int
        Weeks behind it. [-]
    """
    half = float(t.ppf(0.975, max(weeks - 1, 1))) * float(np.sqrt(share * (1.0 - share) / worth))
    return max(share - half, 0.0), share + max(half, 3.0 / worth)


def effective_count(passes: NDArray[np.float64], intervals: NDArray[np.float64], share: float) -> float:
    """How many independent intervals the passes of weeks are worth. [-]

    Demand clusters: an interval on a hot day passes with the others of that week. The variance of the weekly counts
    about what was meant, against that of independent intervals, says by how much; it is not taken to be smaller.

    Parameters
    ----------
    passes, intervals : (W,) float64
        Passes and intervals of each week. [-]
    share : float
        Share meant to pass. [-]
    """
    total = float(intervals.sum())
    rate = max(float(passes.sum()) / total, share)
    if passes.size < 2:
        return total
    away = passes - rate * intervals
    inflation = float(away @ away) / max(total * rate * (1.0 - rate), 1e-12) * passes.size / (passes.size - 1)
    return total / max(inflation, 1.0)
