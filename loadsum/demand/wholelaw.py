"""The whole law of a sum on its lattice, pieced together from several tilts, and its quantiles."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from scipy.fft import irfft, next_fast_len
from scipy.special import log_ndtr

from loadsum.demand.directsum import affordable, law_up_to
from loadsum.demand.spectrum import spectrum
from loadsum.demand.tails import ALIAS, at_or_below
from loadsum.demand.tilting import EPS, EndwiseTerms, coarsened, endwise, log_transform, moments, tilted, window

DIRECT = 2e7  # products up to which the whole law is convolved directly
TARGETS = (1e-5, 1e-10, 1e-16)  # tail probabilities at which further tilts are placed
SEARCH = 33  # levels asked at once in the search for a quantile


def whole_law(masses: Sequence[NDArray[np.float64]], counts: Sequence[int]) -> tuple[int, NDArray[np.float64]]:
    """Index of the first point and the masses of the sum from there on.

    Parameters
    ----------
    masses : sequence of (n,) float64
        Mass of each term from its first lattice point on. [-]
    counts : sequence of int
        Copies of each. [-]

    Returns
    -------
    int, (m,) float64
        Point, counted from the sum of the terms' first points, and masses. [steps, -]
    """
    lower = endwise(masses, counts)
    span, nearest = int(lower.span[0]), int(lower.nearest[0])
    if affordable(lower, 0, span, DIRECT):
        return nearest, _spread_out(law_up_to(lower, 0, span), lower.unit)
    upper = endwise([mass[::-1] for mass in masses], counts)
    law, error = np.zeros(span + 1), np.full(span + 1, np.inf)
    _patch(law, error, lower, 0.0)
    for target in TARGETS:
        _patch(law, error, lower, tilt_for(lower, target))
        _patch(law[::-1], error[::-1], upper, tilt_for(upper, target))
    law[law < 0.0] = 0.0  # an entry below zero is smaller than its error, which is known to be about 1e-17 of the whole
    kept = np.flatnonzero(law)
    first, last = int(kept[0]), int(kept[-1])
    return nearest + first * lower.unit, _spread_out(law[first : last + 1], lower.unit)


def _patch(law: NDArray[np.float64], error: NDArray[np.float64], terms: EndwiseTerms, theta: float) -> None:
    """Enter what one tilt knows better than those before it."""
    at = tilted(terms, np.array([theta]))
    first, last = (int(end[0]) for end in window(terms, at, np.array([ALIAS])))
    length = int(next_fast_len(max(last - first + 1, 8), real=True))
    at_nodes = spectrum(terms, at, length, ALIAS / length)
    full = np.zeros(length // 2 + 1, dtype=np.complex128)
    full[at_nodes.nodes] = at_nodes.values[0]
    values = np.roll(irfft(full, n=length), -first)[: last - first + 1]
    noise = (float(np.sum(at_nodes.noise + EPS * np.abs(at_nodes.values))) * 2.0 + 3.0 * ALIAS) / length
    steps = np.arange(first, last + 1)
    scale = np.exp(np.minimum(at.log_transform[0] + theta * (steps - at.centre[0]), 600.0))
    better = np.flatnonzero(noise * scale < error[first : last + 1])
    law[first + better] = values[better] * scale[better]
    error[first + better] = noise * scale[better]


def _spread_out(law: NDArray[np.float64], unit: int) -> NDArray[np.float64]:
    if unit == 1:
        return law
    wide = np.zeros((law.size - 1) * unit + 1)
    wide[::unit] = law
    return wide


def tilt_for(terms: EndwiseTerms, probability: float) -> float:
    """Tilt whose mean is about the level that the sum stays at or below with the probability given. [1/step]

    Solves the leading term of the saddlepoint formula, ``log P = K - theta K' - log(theta sd)``, by bisection.
    """
    high = 1.0 / max(float(np.sqrt(moments(terms, np.zeros(1))[1][0])), 1e-3)
    for _ in range(60):
        if _log_tail(terms, high) < np.log(probability) or high > 200.0:
            break
        high *= 2.0
    low = 0.0
    for _ in range(14):
        theta = 0.5 * (low + high)
        low, high = (theta, high) if _log_tail(terms, theta) > np.log(probability) else (low, theta)
    return float(coarsened(np.array([high]))[0])


def _log_tail(terms: EndwiseTerms, theta: float) -> float:
    tilt = np.array([theta])
    mean, variance = moments(terms, tilt)
    u = theta * float(np.sqrt(variance[0]))
    return float(log_transform(terms, tilt)[0]) + theta * float(mean[0]) + 0.5 * u * u + float(log_ndtr(-u))


def level_reached(terms: EndwiseTerms, probability: float) -> int:
    """Largest level, less than the far end, that the sum stays at or below with at most the probability; -1 if none.

    Counted in lattice steps from the near end of the terms' arrays.
    """
    nearest, span = int(terms.nearest[0]), int(terms.span[0])
    last = nearest + span * terms.unit - 1  # at the far end itself the probability is one
    low, high = -1, last + 1  # P(Y <= low) <= probability < P(Y <= high), the far end standing for one
    if probability < 0.5 and span > SEARCH:
        theta = tilt_for(terms, probability)
        mean, variance = (float(part[0]) for part in moments(terms, np.array([theta])))
        centre, reach = nearest + terms.unit * mean, terms.unit * np.sqrt(variance)
        for width in (0.25, 1.0, 4.0):
            edges = np.clip(np.array([centre - width * reach, centre + width * reach]).astype(np.int64), -1, last)
            below = at_or_below(terms, edges[None, :]).probability[0] <= probability
            low = int(edges[0]) if below[0] else low
            high = high if below[1] else int(edges[1])
            if below[0] and not below[1]:
                break
    while high - low > 1:
        levels = np.unique(np.linspace(low, high, SEARCH + 2).astype(np.int64)[1:-1])
        levels = levels[(levels > low) & (levels < high)]
        fits = at_or_below(terms, levels[None, :]).probability[0] <= probability
        reached = int(fits.sum())  # probabilities do not decrease with the level
        low, high = (
            int(levels[reached - 1]) if reached else low,
            int(levels[reached]) if reached < levels.size else high,
        )
    return low
