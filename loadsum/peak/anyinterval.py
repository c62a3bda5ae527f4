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


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DrawnDays:
    """Draws that serve every level and every temperature of a class of days.

    Parameters
    ----------
    copula : DayCopula
        Dependence between the intervals.
    block : int
        Class of days. [-]
    score : (draws, I) float64
        Normal scores. [-]
    start : float
        Uniform number that decides which interval is made to pass on each day. [-]
    share : (draws,) float64
        Uniform number that decides how far it passes. [-]
    mixing : (draws,) float64 or None
        Chi-squared number of a t copula; None for the Gaussian. [-]
    """

    copula: DayCopula
    block: int
    score: NDArray[np.float64]
    start: float
    share: NDArray[np.float64]
    mixing: NDArray[np.float64] | None


def drawn_days(copula: DayCopula, block: int, rng: np.random.Generator, *, draws: int = DRAWS) -> DrawnDays:
    """Draws for a class of days."""
    start = float(rng.random())
    root = np.linalg.cholesky(copula.correlation[block])
    score = rng.standard_normal((draws, root.shape[0])) @ root.T
    share = rng.random(draws)
    freedom = copula.degrees_of_freedom
    mixing = rng.chisquare(freedom + 1.0, draws) if np.isfinite(freedom) else None
    return DrawnDays(copula=copula, block=block, score=score, start=start, share=share, mixing=mixing)


def any_interval(probability: NDArray[np.float64], drawn: DrawnDays, *, runs: bool = True) -> AnyInterval:
    """Probability that any interval of a day passes its level.

    Parameters
    ----------
    probability : (I,) float64
        Probability of each interval of passing; NaN where there are no readings, and then left out. [-]
    drawn : DrawnDays
        Draws for the class of days.
    runs : bool
        Whether runs are counted.

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
            runs_per_day=(0.0,) * len(RUN_LENGTHS) if runs else (),
        )
    above = _days_above(p, known, drawn)
    draws = above.shape[0]
    share = 1.0 / above.sum(axis=1)
    value = total * float(share.mean())
    value = min(max(value, largest), min(total, 1.0))
    expected: tuple[float, ...] = ()
    if runs:
        whole = np.zeros((draws, probability.size), dtype=np.bool_)
        whole[:, known] = above
        expected = tuple(total * float((number * share).mean()) for number in runs_of_at_least(whole))
    return AnyInterval(
        value=value,
        standard_error=total * float(share.std(ddof=1)) / np.sqrt(draws),
        at_least=largest,
        at_most=min(total, 1.0),
        if_independent=float(-np.expm1(np.log1p(-np.minimum(p, 1.0 - 1e-16)).sum())),
        expected_intervals=total,
        runs_per_day=expected,
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


def _days_above(p: NDArray[np.float64], known: NDArray[np.bool_], drawn: DrawnDays) -> NDArray[np.bool_]:
    """Which intervals pass on each drawn day, of which one at least was made to, (draws, known intervals) bool."""
    copula = drawn.copula
    correlation = copula.correlation[drawn.block]
    score = drawn.score
    if not known.all():
        correlation, score = correlation[np.ix_(known, known)], score[:, known]
    draws = score.shape[0]
    row = np.arange(draws)
    edges = np.cumsum(p) / p.sum()
    first = np.minimum(np.searchsorted(edges, (row + drawn.start) / draws), p.size - 1)
    forced = copula.drawn_score(drawn.share * p[first])
    scale = np.ones(draws)
    if drawn.mixing is not None:
        scale = np.sqrt((copula.degrees_of_freedom + forced**2) / drawn.mixing)
    # given its forced interval, a day is a scaled day of its own draws, moved along the interval's correlations
    moved = correlation[first]
    moved *= (forced - scale * score[row, first])[:, None]
    moved += score * scale[:, None]
    above = moved > copula.score(np.minimum(p, 1.0))
    above[row, first] = True
    return np.asarray(above, dtype=np.bool_)
