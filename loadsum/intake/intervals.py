"""The interval of each customer's readings, told from its stamps."""

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.clock import NAT
from loadsum.intake.timed import readings_of_each

INTERVALS_MIN = (1, 2, 3, 5, 6, 10, 12, 15, 20, 30, 60)
SHARE_OF_STAMPS = 0.6  # a customer with fewer of the file's stamps is looked at on its own


def intervals_min(
    customer: NDArray[np.integer],
    stamp: NDArray[np.integer],
    start: NDArray[np.int64],
    instants: NDArray[np.int64],
) -> NDArray[np.int64] | None:
    """Interval of each reading: the commonest step between a customer's stamps; None where it cannot be told.

    Parameters
    ----------
    customer, stamp : (n,) int
        Codes of the customer and of the stamp.
    start : (n,) int64
        Instant of each reading. [s]
    instants : (U,) int64
        Instants of the distinct stamps. [s]

    Returns
    -------
    (n,) int64
        Length of the interval; one value seen n times where all customers have the same. [min]
    """
    common = _commonest_step(instants)
    count = readings_of_each(customer)
    if instants.size < 2:
        return None
    few = np.flatnonzero((count > 0) & (count < SHARE_OF_STAMPS * instants.size))
    if few.size == 0:
        return None if common == 0 else np.broadcast_to(np.int64(common), start.shape)
    own = np.full(count.size, common, dtype=np.int64)
    sparse = np.zeros(count.size, bool)
    sparse[few] = True
    rows = np.flatnonzero(sparse[customer])
    order = rows[np.lexsort((start[rows], customer[rows]))]
    edges = np.flatnonzero(np.diff(customer[order])) + 1
    for mine in np.split(order, edges):
        step = _commonest_step(start[mine])
        if step:
            own[customer[mine[0]]] = step
    used = np.unique(own[count > 0])
    if (used == 0).any():
        return None
    return np.broadcast_to(used[0], start.shape) if used.size == 1 else own[customer]


def _commonest_step(instants: NDArray[np.int64]) -> int:
    """The commonest step where it is an ordinary interval, else 0. [min]"""
    distinct = np.unique(instants[instants != NAT])
    if distinct.size < 2:
        return 0
    steps, count = np.unique(np.diff(distinct), return_counts=True)
    step = int(steps[np.argmax(count)])
    return step // 60 if step % 60 == 0 and step // 60 in INTERVALS_MIN else 0
