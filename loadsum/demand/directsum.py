"""Direct convolution of terms that are not negative, and division of terms at gaps of their support.

Sums of products of numbers that are not negative lose no relative accuracy, however small the result; this is the slow
and sure way where no single tilt serves.
"""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.tilting import EPS, EndwiseTerms

MOST_PARTS = 64
Rows = list[tuple[NDArray[np.float64], int]]


def rows_of(terms: EndwiseTerms, g: int) -> Rows:
    """Mass and copies of each term of one sum."""
    return [
        (row, int(count))
        for block in terms.blocks
        for row, count in zip(block.mass[g], block.counts[g], strict=True)
        if count
    ]


def affordable(terms: EndwiseTerms, g: int, rho: int, products: float) -> bool:
    """Whether a direct convolution up to a level takes no more than so many products."""
    if terms.normal_mean is not None:
        return False
    total, so_far = 0.0, 1.0
    for row, count in rows_of(terms, g):
        size = float(min(row.size, rho + 1))
        for _ in range(count.bit_length() - 1):
            total += 2.0 * size * size
            size = min(2.0 * size, rho + 1.0)
        total += size * min(so_far, rho + 1.0)
        so_far += size
        if total > products:
            return False
    return True


def law_up_to(terms: EndwiseTerms, g: int, rho: int) -> NDArray[np.float64]:
    """Probability of each value of the sum up to a level, (rho + 1,) float64, by direct convolution."""
    size, law = rho + 1, np.ones(1)
    for row, count in rows_of(terms, g):
        law = np.convolve(law, _self_convolved(row[:size], count, size))[:size]
    return law if law.size == size else np.append(law, np.zeros(size - law.size))


def at_or_below_directly(
    terms: EndwiseTerms, g: int, rho: NDArray[np.int64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Probability that one sum is at most each level, and relative error estimates, (L,) float64 each."""
    size = int(rho.max()) + 1
    below = np.cumsum(law_up_to(terms, g, size - 1))[rho]
    return below, np.full(rho.size, EPS * (8.0 * int(terms.copies[g]) + 4.0 * np.sqrt(size)))


def _self_convolved(row: NDArray[np.float64], count: int, size: int) -> NDArray[np.float64]:
    result, power = np.ones(1), row
    while True:
        if count & 1:
            result = np.convolve(result, power)[:size]
        count >>= 1
        if not count:
            return result
        power = np.convolve(power, power)[:size]


def divided_at_gap(
    terms: EndwiseTerms, g: int
) -> Iterator[tuple[float, float, list[NDArray[np.float64]], list[int]]] | None:
    """The sum as a mixture over how many copies of one term lie beyond the widest gap of any support.

    Each part is a sum of its own whose tilt does not have to span the gap. Yields, in order of falling weight, the
    weight, the weight of what follows, and the masses and counts of the part; None where no term has a gap.
    """
    rows = rows_of(terms, g) if terms.normal_mean is None else []
    widest, width, edge = -1, 1, 0
    for c, (row, _) in enumerate(rows):
        places = np.flatnonzero(row)
        gaps = np.diff(places)
        if gaps.size and gaps.max() > width:
            widest, width, edge = c, int(gaps.max()), int(places[np.argmax(gaps)])
    if widest < 0:
        return None
    row, count = rows[widest]
    near, far = row.copy(), row.copy()
    near[edge + 1 :] = 0.0
    far[: edge + 1] = 0.0
    others = [pair for c, pair in enumerate(rows) if c != widest]
    weights = _binomial_weights(count, float(near.sum()), float(far.sum()))
    if weights is None:
        return None
    return _parts(weights, others, near / near.sum(), far / far.sum())


def _parts(
    weights: NDArray[np.float64], others: Rows, near: NDArray[np.float64], far: NDArray[np.float64]
) -> Iterator[tuple[float, float, list[NDArray[np.float64]], list[int]]]:
    order = np.argsort(-weights, kind="stable")
    left = np.append(np.cumsum(weights[order][::-1])[::-1][1:], 0.0)
    for place, beyond in enumerate(order):
        pairs = [*others, (near, weights.size - 1 - int(beyond)), (far, int(beyond))]
        kept = [pair for pair in pairs if pair[1]]
        yield float(weights[beyond]), float(left[place]), [m for m, _ in kept], [n for _, n in kept]


def _binomial_weights(count: int, near: float, far: float) -> NDArray[np.float64] | None:
    """``C(count, j) near**(count - j) far**j`` for each j, (count + 1,) float64, from the larger share downward.

    None where more than `MOST_PARTS` of them matter: then no gap is left in the sum, and dividing would not help.
    """
    if near > far:
        weights = _binomial_weights(count, far, near)
        return None if weights is None else weights[::-1]
    steps = np.arange(count, dtype=np.float64)
    with np.errstate(over="ignore"):
        relative = np.append(1.0, np.cumprod((count - steps) / (steps + 1.0) * (near / far)))
    if not np.isfinite(relative).all() or (relative > 1e-13).sum() > MOST_PARTS:
        return None
    return np.asarray(relative[::-1] * far**count)
