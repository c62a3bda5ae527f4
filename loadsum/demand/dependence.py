"""The common component: the part of demand that moves all customers together."""

import numpy as np
from numpy.typing import NDArray


def common_variance(kw: NDArray[np.float64], neighbours: int) -> NDArray[np.float64]:
    """Covariance between customers summed over all pairs, for each interval of the day.

    The variance of the observed sum less the sum of the customers' variances, smoothed over neighbouring
    intervals and then floored at zero.

    Parameters
    ----------
    kw : (C, D, I) float64
        Time-aligned readings; rows of days with a missing customer are left out. [kW]
    neighbours : int
        Intervals on each side over which the covariance is averaged. [-]

    Returns
    -------
    (I,) float64
        Variance of the common component. [kW²]
    """
    intervals = kw.shape[2]
    covariance = np.zeros(intervals)
    for i in range(intervals):
        whole = kw[:, np.isfinite(kw[:, :, i]).all(axis=0), i]
        if whole.shape[1] >= 2:
            covariance[i] = whole.sum(axis=0).var(ddof=1) - whole.var(axis=1, ddof=1).sum()
    smoothed = np.zeros(intervals)
    for shift in range(-neighbours, neighbours + 1):
        smoothed += np.roll(covariance, shift) / (2 * neighbours + 1)
    return np.maximum(smoothed, 0.0)
