"""What a customer has not yet been seen to do, borrowed from others like it.

The predictive distribution of a customer with D days of readings under a Dirichlet process prior of strength a is
its own readings with weight D/(a + D) and the prior with weight a/(a + D) (Ferguson 1973); the prior is the class:
the readings of the other customers, each relative to its own mean, scaled to this customer's mean.

References
----------
.. [1] Ferguson, A Bayesian analysis of some nonparametric problems, Annals of Statistics 1 (1973) 209-230; cited
   from memory.
"""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

MOST_VALUES = 2**15  # values of a pool up to which each is kept; a customer's own are left out of it one by one
BINS = 2**13  # groups of neighbouring values, each held at its mean, into which a larger pool is gathered
FINE_NEAR = 0.1  # readings relative to the mean around which the groups are narrowest

SMALLEST_MEAN_KW = 1e-3  # customers with less are not scaled to or from: their ratio to the class says nothing


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ClassPool:
    """Readings of all members of a class in one demand interval, each relative to its member's own mean.

    Parameters
    ----------
    value : (n,) float64
        Values, or the means of groups of neighbouring ones. [-]
    weight : (n,) float64
        Sum of the weights of all members at each; every member that lends has weight 1 in all. [-]
    own : tuple of ((k,) int64, (k,) float64)
        For each member, where in ``value`` its own readings are, and their weights; empty for one that does not lend.
    lenders : int
        Members that lend. [-]
    """

    value: NDArray[np.float64]
    weight: NDArray[np.float64]
    own: tuple[tuple[NDArray[np.int64], NDArray[np.float64]], ...]
    lenders: int


def class_pool(kw: NDArray[np.float64], *, most_values: int = MOST_VALUES) -> ClassPool:
    """Pool of a class; members whose mean is not clearly positive do not lend.

    Parameters
    ----------
    kw : (C, D) float64
        Readings of one demand interval; NaN where missing. [kW]
    most_values : int
        Values up to which each is kept. [-]
    """
    known = np.isfinite(kw)
    days = known.sum(axis=1)
    mean = np.where(known, kw, 0.0).sum(axis=1) / np.maximum(days, 1)
    known &= (mean > SMALLEST_MEAN_KW)[:, None]
    member = np.nonzero(known)[0]
    value = kw[known] / mean[member]
    weight = 1.0 / days[member]
    place = np.arange(value.size)
    if value.size > most_values:
        bent = np.arcsinh(value / FINE_NEAR)
        low, width = float(bent.min()), float(np.ptp(bent)) / BINS
        _, place = (
            np.unique(((bent - low) / width).astype(np.int64), return_inverse=True) if width else (None, 0 * place)
        )
        together = np.bincount(place, weights=weight)
        value = np.bincount(place, weights=weight * value) / together
    ends = np.searchsorted(member, np.arange(kw.shape[0] + 1))
    own = tuple((place[first:end], weight[first:end]) for first, end in pairwise(ends.tolist()))
    summed = np.bincount(place, weights=weight, minlength=value.size) if value.size else weight
    return ClassPool(
        value=value,
        weight=np.asarray(summed, dtype=np.float64),
        own=own,
        lenders=int((np.diff(ends) > 0).sum()),
    )


def borrowed(pool: ClassPool, customer: int, mean_kw: float) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Readings of the other members of the class scaled to one member's mean, each member with equal weight.

    Parameters
    ----------
    pool : ClassPool
        Pool of the class.
    customer : int
        Index of the member that borrows. [-]
    mean_kw : float
        Mean of that member. [kW]

    Returns
    -------
    values, weights : (n,) float64
        Scaled readings and weights that sum to one; empty where nothing can be borrowed. [kW, -]
    """
    place, own = pool.own[customer]
    lenders = pool.lenders - (1 if place.size else 0)
    if lenders == 0 or mean_kw <= SMALLEST_MEAN_KW:
        return np.empty(0), np.empty(0)
    weight = pool.weight - np.bincount(place, weights=own, minlength=pool.weight.size)
    kept = weight > 1e-12
    return pool.value[kept] * mean_kw, weight[kept] / lenders


def weighted_variance(values: NDArray[np.float64], weights: NDArray[np.float64]) -> float:
    """Variance of a discrete law whose weights sum to one."""
    mean = float(values @ weights)
    return float(((values - mean) ** 2) @ weights)
