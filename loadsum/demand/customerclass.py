"""What a customer has not yet been seen to do, borrowed from others like it.

The predictive distribution of a customer with D days of readings under a Dirichlet process prior of strength a is
its own readings with weight D/(a + D) and the prior with weight a/(a + D) (Ferguson 1973); the prior is the class:
the readings of the other customers, each relative to its own mean, scaled to this customer's mean.

References
----------
.. [1] Ferguson, A Bayesian analysis of some nonparametric problems, Annals of Statistics 1 (1973) 209-230; cited
   from memory.
"""

import numpy as np
from numpy.typing import NDArray

SMALLEST_MEAN_KW = 1e-3  # customers with less are not scaled to or from: their ratio to the class says nothing


def relative_readings(kw: NDArray[np.float64]) -> list[NDArray[np.float64]]:
    """Readings of each customer relative to its own mean; empty where the mean is not clearly positive.

    Parameters
    ----------
    kw : (C, D) float64
        Readings of one demand interval; NaN where missing. [kW]

    Returns
    -------
    list of (n,) float64
        One array a customer. [-]
    """
    relative = []
    for row in kw:
        own = row[np.isfinite(row)]
        mean = own.mean() if own.size else 0.0
        relative.append(own / mean if mean > SMALLEST_MEAN_KW else np.empty(0))
    return relative


def borrowed(
    relative: list[NDArray[np.float64]], customer: int, mean_kw: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Readings of the other customers of the class scaled to one customer's mean, each customer with equal weight.

    Parameters
    ----------
    relative : list of (n,) float64
        Readings of every customer of the class relative to its own mean. [-]
    customer : int
        Index of the customer that borrows; -1 for one that has no readings of its own. [-]
    mean_kw : float
        Mean of that customer. [kW]

    Returns
    -------
    values, weights : (n,) float64
        Scaled readings and weights that sum to one; empty where nothing can be borrowed. [kW, -]
    """
    others = [r for c, r in enumerate(relative) if c != customer and r.size]
    if not others or mean_kw <= SMALLEST_MEAN_KW:
        return np.empty(0), np.empty(0)
    values = np.concatenate(others) * mean_kw
    weights = np.concatenate([np.full(r.size, 1.0 / (r.size * len(others))) for r in others])
    return values, weights


def weighted_variance(values: NDArray[np.float64], weights: NDArray[np.float64]) -> float:
    """Variance of a discrete law whose weights sum to one."""
    mean = float(values @ weights)
    return float(((values - mean) ** 2) @ weights)
