"""The common component: the part of demand that moves all customers together.

Covariance between customers is the variance of their observed sum less the sum of their variances. It is noisy hour by
hour, so it is turned into a mean correlation, smoothed along the day, and turned back.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.stats import t as student

FEWEST_WEEKS = 4  # weeks of readings below which the mean correlation gets no interval
COVERS = 0.9  # share of cases in which the interval of the mean correlation is meant to hold the long-run value


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CommonComponent:
    """Dependence between the customers of a group on one class of days.

    Parameters
    ----------
    observed_variance_kw2 : (I,) float64
        Variance of the observed time-aligned sum. [kW²]
    independent_variance_kw2 : (I,) float64
        Sum of the customers' variances. [kW²]
    pairs_kw2 : (I,) float64
        Products of the standard deviations of two customers, summed over all ordered pairs. [kW²]
    correlation : (I,) float64
        Mean correlation between customers, smoothed along the day; negative values as found. [-]
    days : (I,) int64
        Days on which every customer has a reading. [d]
    """

    observed_variance_kw2: NDArray[np.float64]
    independent_variance_kw2: NDArray[np.float64]
    pairs_kw2: NDArray[np.float64]
    correlation: NDArray[np.float64]
    days: NDArray[np.int64]

    def __post_init__(self) -> None:
        for array in (self.observed_variance_kw2, self.independent_variance_kw2, self.pairs_kw2, self.correlation):
            array.flags.writeable = False
        self.days.flags.writeable = False


def common_component(kw: NDArray[np.float64], reach: float) -> CommonComponent:
    """Covariance of time-aligned readings, as a mean correlation smoothed along the day.

    Parameters
    ----------
    kw : (C, D, I) float64
        Readings; days on which a customer is missing are left out of the variance of the sum. [kW]
    reach : float
        Standard deviation of the smoothing along the day; 0 for none. [intervals]
    """
    intervals = kw.shape[2]
    total, single, pairs = (np.zeros(intervals) for _ in range(3))
    days = np.zeros(intervals, dtype=np.int64)
    for i in range(intervals):
        whole = kw[:, np.isfinite(kw[:, :, i]).all(axis=0), i]
        days[i] = whole.shape[1]
        if days[i] >= 2:
            own = whole.var(axis=1, ddof=1)
            total[i], single[i] = whole.sum(axis=0).var(ddof=1), own.sum()
            pairs[i] = np.sqrt(own).sum() ** 2 - own.sum()
    weight = smoothing_weights(intervals, reach)
    smooth_pairs = weight @ pairs
    smooth_covariance = weight @ (total - single)
    correlation = np.divide(smooth_covariance, smooth_pairs, out=np.zeros(intervals), where=smooth_pairs > 0.0)
    return CommonComponent(
        observed_variance_kw2=total,
        independent_variance_kw2=single,
        pairs_kw2=pairs,
        correlation=correlation,
        days=days,
    )


def correlation_interval(kw: NDArray[np.float64], day: NDArray[np.int64], reach: float) -> tuple[float, float]:
    """Interval of the mean correlation over the day, by leaving out one week at a time; NaN for too few weeks. [-]

    Parameters
    ----------
    kw : (C, D, I) float64
        Readings, as for :func:`common_component`. [kW]
    day : (D,) int64
        Local calendar day. [d]
    reach : float
        Standard deviation of the smoothing along the day. [intervals]
    """
    week = (day + 3) // 7
    weeks = np.unique(week)
    if weeks.size < FEWEST_WEEKS or kw.shape[0] < 2:
        return float("nan"), float("nan")
    found = np.array([_mean_correlation(kw[:, week != one], reach) for one in weeks])
    here, n = _mean_correlation(kw, reach), weeks.size
    spread = float(np.sqrt((n - 1) / n * np.sum((found - found.mean()) ** 2)))
    half = float(student.ppf(0.5 + 0.5 * COVERS, n - 1)) * spread
    return here - half, here + half


def _mean_correlation(kw: NDArray[np.float64], reach: float) -> float:
    return float(common_component(kw, reach).correlation.mean())


def smoothing_weights(intervals: int, reach: float) -> NDArray[np.float64]:
    """Weights of a normal kernel around the clock, each row summing to one, (I, I) float64. [-]"""
    if reach <= 0.0:
        return np.eye(intervals)
    apart = np.abs(np.subtract.outer(np.arange(intervals), np.arange(intervals)))
    apart = np.minimum(apart, intervals - apart)
    weight = np.exp(-0.5 * (apart / reach) ** 2)
    return np.asarray(weight / weight.sum(axis=1, keepdims=True), dtype=np.float64)


def mean_variance(sums_kw: NDArray[np.float64], day: NDArray[np.int64]) -> NDArray[np.float64]:
    """Variance of the mean of the sum, with weeks as blocks and at least that of independent days, (I,) float64. [kW²]

    Parameters
    ----------
    sums_kw : (D, I) float64
        Sums; NaN where a customer is missing. [kW]
    day : (D,) int64
        Local calendar day. [d]
    """
    intervals = sums_kw.shape[1]
    week = (day + 3) // 7  # 1970-01-01 was a Thursday: weeks begin on Monday
    found = np.zeros(intervals)
    for i in range(intervals):
        known = np.isfinite(sums_kw[:, i])
        if known.sum() < 2:
            continue
        values = sums_kw[known, i]
        away = values - values.mean()
        _, place = np.unique(week[known], return_inverse=True)
        blocks = np.bincount(place, weights=away)
        by_week = float(blocks @ blocks) / values.size**2 * blocks.size / max(blocks.size - 1, 1)
        found[i] = max(by_week, float(away @ away) / values.size / max(values.size - 1, 1))
    return np.asarray(smoothing_weights(intervals, 1.5) @ found, dtype=np.float64)
