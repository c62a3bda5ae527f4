"""Probability that demand passes a level in any interval of the day."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.peak.copula import DayCopula

DRAWS = 4096
RUN_LENGTHS = (1, 2, 3, 4)


@dataclass(frozen=True, slots=True, kw_only=True)
class AnyInterval:
    """Probability that a day passes a level, beside what holds whatever the dependence.

    Parameters
    ----------
    value : float
        By the copula. [-]
    standard_error : float
        Of the simulation behind ``value``. [-]
    at_least, at_most : float
        Largest single probability, and the sum of all or 1: bounds that hold whatever the dependence. [-]
    if_independent : float
        If the intervals were independent; for comparison only. [-]
    expected_intervals : float
        Expected intervals above the level per day; no assumption about dependence. [-]
    runs_per_day : tuple of float
        Expected runs of at least 1, 2, 3 and 4 intervals above the level, per day. [-]
    """

    value: float
    standard_error: float
    at_least: float
    at_most: float
    if_independent: float
    expected_intervals: float
    runs_per_day: tuple[float, ...]


def any_interval(
    probability: NDArray[np.float64],
    copula: DayCopula,
    block: int,
    rng: np.random.Generator,
    *,
    draws: int = DRAWS,
) -> AnyInterval:
    """Probability that any interval of a day passes its level.

    Parameters
    ----------
    probability : (I,) float64
        Probability of each interval of passing; NaN where there are no readings, and then left out. [-]
    copula : DayCopula
        Dependence between the intervals.
    block : int
        Class of days. [-]
    rng : numpy.random.Generator
        Source of randomness.
    draws : int
        Simulated days. [-]

    Notes
    -----
    Importance sampling of a union: an interval is picked in proportion to its probability, a day is drawn on which
    that interval passes, and the sum of the probabilities is divided by the number of intervals that pass on it.
    Unbiased; every single draw lies below the upper bound; the relative error does not grow as the probability
    shrinks. An estimate that its own noise carries below the lower bound is set on the bound.

    References
    ----------
    .. [1] A. B. Owen, Y. Maximov, M. Chertkov, "Importance sampling the union of rare events with an application to
       power systems analysis", Electronic Journal of Statistics 13 (2019) 231-254 (from memory).
    """
    known = np.isfinite(probability)
    p = probability[known]
    total, largest = float(p.sum()), float(p.max(initial=0.0))
    if total <= 0.0:
        return AnyInterval(
            value=0.0,
            standard_error=0.0,
            at_least=0.0,
            at_most=0.0,
            if_independent=0.0,
            expected_intervals=0.0,
            runs_per_day=(0.0,) * len(RUN_LENGTHS),
        )
    above = _days_above(p, copula.correlation[block][np.ix_(known, known)], copula, rng, draws)
    count = above.sum(axis=1)
    share = 1.0 / count
    value = total * float(share.mean())
    value = min(max(value, largest), min(total, 1.0))
    whole = np.zeros((draws, probability.size), dtype=np.bool_)
    whole[:, known] = above
    return AnyInterval(
        value=value,
        standard_error=total * float(share.std(ddof=1)) / np.sqrt(draws),
        at_least=largest,
        at_most=min(total, 1.0),
        if_independent=float(-np.expm1(np.log1p(-np.minimum(p, 1.0 - 1e-16)).sum())),
        expected_intervals=total,
        runs_per_day=tuple(total * float((runs * share).mean()) for runs in runs_of_at_least(whole)),
    )


def runs_of_at_least(above: NDArray[np.bool_]) -> tuple[NDArray[np.int64], ...]:
    """Number of unbroken runs of at least 1, 2, 3 and 4 intervals on each day, four (D,) int64. [-]

    Runs end at midnight, because days are drawn and compared one by one.
    """
    edge = np.zeros((above.shape[0], 1), dtype=np.bool_)
    found = []
    for length in RUN_LENGTHS:
        window = above[:, : above.shape[1] - length + 1].copy()
        for shift in range(1, length):
            window &= above[:, shift : above.shape[1] - length + 1 + shift]
        starts = window & ~np.concatenate((edge, above[:, : above.shape[1] - length]), axis=1)
        found.append(starts.sum(axis=1))
    return tuple(found)


def _days_above(
    p: NDArray[np.float64],
    correlation: NDArray[np.float64],
    copula: DayCopula,
    rng: np.random.Generator,
    draws: int,
) -> NDArray[np.bool_]:
    """Which intervals pass on each drawn day, of which one at least was made to, (draws, I) bool."""
    edges = np.cumsum(p) / p.sum()
    first = np.minimum(np.searchsorted(edges, (np.arange(draws) + rng.random()) / draws), p.size - 1)
    root = np.linalg.cholesky(correlation)
    score = rng.standard_normal((draws, p.size)) @ root.T
    row = np.arange(draws)
    forced = copula.score(rng.random(draws) * p[first])
    score -= correlation[first] * score[row, first][:, None]
    freedom = copula.degrees_of_freedom
    if np.isfinite(freedom):
        score *= np.sqrt((freedom + forced**2) / rng.chisquare(freedom + 1.0, draws))[:, None]
    score += correlation[first] * forced[:, None]
    above = score > copula.score(np.clip(p, 0.0, 1.0))
    above[row, first] = True
    return np.asarray(above, dtype=np.bool_)
