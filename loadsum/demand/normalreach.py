"""From how many customers on the normal law would do, found by trying."""

from dataclasses import dataclass

import numpy as np
from scipy.stats import norm

from loadsum.demand.convolution import DemandSum
from loadsum.demand.lattice import LatticeMass

MOST_WITH_COMMON = 300
GROWTH = 1.4  # from one number of customers tried to the next


@dataclass(frozen=True, slots=True, kw_only=True)
class NormalReach:
    """Number of like customers from which the normal law is near enough at one exceedance probability.

    Parameters
    ----------
    exceeded_with : float
        Probability above the level at which the two are compared. [-]
    within : float
        Largest relative error of the normal probability. [-]
    customers : int or None
        The number; None where there is none up to the largest tried.
    answer : str
        The answer in words.
    tried : tuple of (int, float)
        Numbers of customers tried, and how many times the normal probability is the exact one.
    """

    exceeded_with: float
    within: float
    customers: int | None
    answer: str
    tried: tuple[tuple[int, float], ...]


def customers_until_normal(
    customer: LatticeMass,
    exceeded_with: float,
    *,
    within: float = 0.10,
    common: LatticeMass | None = None,
    covariance_known: bool = True,
    largest: int = 10_000,
) -> NormalReach:
    """Number of like customers from which on the normal probability is near enough.

    Parameters
    ----------
    customer : LatticeMass
        Demand of one customer, without the common component.
    exceeded_with : float
        Probability above the level, such as 0.01. [-]
    within : float
        Allowed relative error of the normal probability. [-]
    common : LatticeMass or None
        Movement that all customers share, per customer, on the same lattice; None where they are independent.
    covariance_known : bool
        Whether the normal law is given the variance with covariance, or that of independent customers.
    largest : int
        Largest number tried; with a common component no more than `MOST_WITH_COMMON`. [-]

    Notes
    -----
    However many customers there are, the common component does not average out: the sum per customer tends to it, and
    where its own shape is not normal (or its variance is left out) the normal law is never near enough.
    """
    if not 0.0 < exceeded_with < 0.5:
        raise ValueError(f"exceeded_with must lie between 0 and 0.5, got {exceeded_with}")
    if common is not None and common.central_moment(2) > 0.0:
        limit = _ratio(DemandSum(terms=(common,), counts=(1,)), exceeded_with, None) if covariance_known else 0.0
        if not abs(limit - 1.0) <= within:
            return NormalReach(
                exceeded_with=exceeded_with,
                within=within,
                customers=None,
                answer="never, because of shared weather",
                tried=(),
            )
        largest = min(largest, MOST_WITH_COMMON)  # beyond, the sum per customer is all but the common component
    tried: dict[int, float] = {}

    def near(n: int) -> bool:
        if n not in tried:
            tried[n] = _ratio(*_group(customer, common, n, covariance_known, exceeded_with))
        return abs(tried[n] - 1.0) <= within

    grid = sorted({min(round(GROWTH**k), largest) for k in range(60)})
    failing = [n for n in grid if not near(n)]
    if failing and failing[-1] == grid[-1]:
        found, answer = None, f"not up to {largest} customers"
    else:
        low = failing[-1] if failing else 0
        high = grid[grid.index(low) + 1] if failing else grid[0]
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (low, middle) if near(middle) else (middle, high)
        found, answer = high, f"from {high} customers"
    return NormalReach(
        exceeded_with=exceeded_with, within=within, customers=found, answer=answer, tried=tuple(sorted(tried.items()))
    )


def _group(
    customer: LatticeMass, common: LatticeMass | None, n: int, covariance_known: bool, exceeded_with: float
) -> tuple[DemandSum, float, float | None]:
    independent = DemandSum(terms=(customer,), counts=(n,))
    if common is None:
        return independent, exceeded_with, None
    total = DemandSum(terms=(customer, common.scaled(float(n), "exact")), counts=(n, 1))
    return total, exceeded_with, None if covariance_known else independent.variance_kw2()


def _ratio(total: DemandSum, exceeded_with: float, variance_kw2: float | None) -> float:
    """Normal over exact probability at the level exceeded with the probability given, half a step allowed for."""
    level = total.quantile_kw(exceeded_with)
    exact = total.above(level)
    variance = total.variance_kw2() if variance_kw2 is None else variance_kw2
    if exact == 0.0 or variance == 0.0:
        return float("nan")
    z = (level + 0.5 * total.step_kw - total.mean_kw()) / np.sqrt(variance)
    return float(norm.sf(z)) / exact
