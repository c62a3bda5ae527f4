"""The term that completes a group's demand: the variance and the skewness that its customers do not hold themselves.

Customers that move together make a sum both wider and more skewed than independent ones: what is missing of the
variance is the variance of one more term, and what is missing of the third cumulant is the third cumulant of that
term. Its law is a gamma law shifted to zero mean (Pearson's type III), the simplest with these three moments.
"""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammainc, gammaincc, gammainccinv, gammaincinv

from loadsum.demand.convolution import BracketedSum, DemandSum
from loadsum.demand.dependence import smoothing_weights
from loadsum.demand.lattice import CUT, LatticeMass, continuous_mass, normal_mass

MOST_SKEWED = 2.5  # beyond, a short record has seen one day
HARDLY_SKEWED = 0.05  # below, the gamma law is the normal law for every purpose here
FEWEST_DAYS = 4


def skewness_along_day(sums_kw: NDArray[np.float64], reach: float) -> NDArray[np.float64]:
    """Skewness of the observed sum, corrected for few days and smoothed along the day, (I,) float64. [-]

    Parameters
    ----------
    sums_kw : (D, I) float64
        Observed time-aligned sums; NaN where a customer is missing. [kW]
    reach : float
        Standard deviation of the smoothing along the day; 0 for none. [intervals]

    Notes
    -----
    The correction is the usual one of the third standardised moment, sqrt(n (n - 1)) / (n - 2).
    """
    found = np.zeros(sums_kw.shape[1])
    for i, column in enumerate(sums_kw.T):
        values = column[np.isfinite(column)]
        spread = values.std() if values.size else 0.0
        if values.size >= FEWEST_DAYS and spread > 0.0:
            n = values.size
            third = float((((values - values.mean()) / spread) ** 3).mean())
            found[i] = third * (n * (n - 1)) ** 0.5 / (n - 2)
    return np.asarray(smoothing_weights(sums_kw.shape[1], reach) @ found, dtype=np.float64)


def missing_skewness(observed: float, variance_kw2: float, missing_kw2: float, third_kw3: float) -> float:
    """Skewness of the term that brings the customers' sum to the group's skewness, held to `MOST_SKEWED`. [-]

    Parameters
    ----------
    observed : float
        Skewness of the group. [-]
    variance_kw2, missing_kw2 : float
        Variance of the group, and the part of it that is the term's. [kW²]
    third_kw3 : float
        Sum of the customers' third cumulants. [kW³]

    Notes
    -----
    The smaller the term, the less its skewness is known from the group's; it is taken part of the way from the
    group's own skewness to what is missing, in proportion to the term's share of the variance.
    """
    if missing_kw2 <= 0.0:
        return 0.0
    needed = (observed * variance_kw2**1.5 - third_kw3) / missing_kw2**1.5
    share = min(missing_kw2 / variance_kw2, 1.0)
    return float(np.clip(observed + share * (needed - observed), -MOST_SKEWED, MOST_SKEWED))


def skewed_mass(spread_kw: float, skewness: float, step_kw: float) -> tuple[LatticeMass, LatticeMass]:
    """Zero-mean term of a standard deviation and a skewness, rounded down and rounded up to the lattice.

    Parameters
    ----------
    spread_kw : float
        Standard deviation, above 0. [kW]
    skewness : float
        Skewness; negative leans to low demand. [-]
    step_kw : float
        Step of the lattice. [kW]
    """
    if abs(skewness) < HARDLY_SKEWED:
        return normal_mass(0.0, spread_kw, step_kw, "down"), normal_mass(0.0, spread_kw, step_kw, "up")
    k = 4.0 / skewness**2  # shape of the gamma law; x = (y - k) / sqrt(k) has mean 0, variance 1, skewness 2 / sqrt(k)
    unit = spread_kw / k**0.5 * np.sign(skewness)
    ends = sorted((float(gammaincinv(k, CUT) - k) * unit, float(gammainccinv(k, CUT) - k) * unit))

    def left(kw: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.asarray(gammainc(k, np.maximum(k + kw / unit, 0.0)), dtype=np.float64)

    def right(kw: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.asarray(gammaincc(k, np.maximum(k + kw / unit, 0.0)), dtype=np.float64)

    below, above = (left, right) if skewness > 0.0 else (right, left)
    return (
        continuous_mass(below, above, ends[0], ends[1], step_kw, "down", middle_kw=0.0),
        continuous_mass(below, above, ends[0], ends[1], step_kw, "up", middle_kw=0.0),
    )


def with_common_term(
    total: BracketedSum, counts: Sequence[int], variance_kw2: float, missing_kw2: float, skewness: float
) -> BracketedSum:
    """Customers' sum with the term that completes it; as it is where nothing is missing.

    Parameters
    ----------
    total : BracketedSum
        Sum of the customers.
    counts : sequence of int
        How many customers each term of the sum stands for. [-]
    variance_kw2, missing_kw2 : float
        Variance that the group must have, and the part that the customers do not hold. [kW²]
    skewness : float
        Skewness that the group must have. [-]
    """
    if missing_kw2 <= 0.0:
        return total
    third = sum(n * term.central_moment(3) for n, term in zip(counts, total.down.terms, strict=True))
    lean = missing_skewness(skewness, variance_kw2, missing_kw2, third)
    down, up = skewed_mass(missing_kw2**0.5, lean, total.up.step_kw)
    return BracketedSum(
        down=DemandSum(terms=(*total.down.terms, down), counts=(*total.down.counts, 1)),
        up=DemandSum(terms=(*total.up.terms, up), counts=(*total.up.counts, 1)),
    )


def variance_uncertainty_kw2(customers_kw2: Sequence[float], variance_kw2: float, days: int) -> float:
    """What not knowing the variance adds to a predictive law. [kW²]

    Student's law with days - 1 degrees of freedom is wider than the normal by 2 / (days - 3) of its variance. The
    common part of the variance is known from so many days; the customers' own part from as many days of each of them,
    which is as much better as the customers are like independent samples.

    Parameters
    ----------
    customers_kw2 : sequence of float
        Variance of each metered customer. [kW²]
    variance_kw2 : float
        Variance of the group. [kW²]
    days : int
        Days of readings. [d]
    """
    share = 2.0 / (days - 3) if days > 4 else 2.0
    own = np.asarray(customers_kw2, dtype=np.float64)
    if not own.sum() > 0.0 or variance_kw2 <= 0.0:
        return variance_kw2 * share
    common = max(1.0 - float(own.sum()) / variance_kw2, 0.0)
    like_one = float(own @ own) / float(own.sum()) ** 2
    return variance_kw2 * share * (common + (1.0 - common) * like_one)
