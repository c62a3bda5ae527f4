"""Tail probabilities of sums of independent lattice variables with relative accuracy.

The probability ``P(Y <= rho)`` is the integral of the tilted characteristic function times a geometric sum,
taken by the trapezoidal rule on the roots of unity of a window (which is exact but for the mass outside the window).
Every ingredient carries an error estimate; where one tilt does not do, others are tried, and in the end terms
that are not negative are convolved directly, which cannot lose relative accuracy.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.fft import irfft, next_fast_len

from loadsum.demand.directsum import affordable, at_or_below_directly, divided_at_gap
from loadsum.demand.spectrum import Spectrum, spectrum
from loadsum.demand.tilting import EPS, EndwiseTerms, TiltedTerms, endwise, saddlepoint, tilted, window

ACCEPTED = 5e-11  # relative error estimate up to which a probability is taken, or what many copies make inevitable
ALIAS = 1e-15  # tilted mass allowed outside the window, before scaling by the share of the tail in the tilted mass
WRAPPED = 25.5  # of a probability no more than exp(-WRAPPED) is added by what a short window wraps round
CHEAP = 4e6  # products up to which direct convolution is done at once
AFFORDABLE = 4e8  # products up to which direct convolution is done when tilts have failed
SPLITS = 6  # terms divided at most on the way to one probability
SHIFTS = (0.0, 1.5, -1.5, 4.0)  # tilts aim so many standard deviations beside the level, one after the other


@dataclass(frozen=True, slots=True, eq=False)
class Tails:
    """Probabilities with their error estimates.

    Parameters
    ----------
    probability : (G, L) float64
        ``P(Y <= rho)`` for each level of each sum. [-]
    relative_error : (G, L) float64
        Estimate of the relative error of each. [-]
    tilts : (G, L) int64
        Tilts evaluated until each was accepted; 0 where terms were convolved directly at once. [-]
    """

    probability: NDArray[np.float64]
    relative_error: NDArray[np.float64]
    tilts: NDArray[np.int64]


def at_or_below(terms: EndwiseTerms, rho: NDArray[np.int64], depth: int = 0) -> Tails:
    """Probability that each sum is at most each of its levels.

    Parameters
    ----------
    terms : EndwiseTerms
        The terms of G sums.
    rho : (G, L) int64
        Levels. [lattice steps]
    depth : int
        How often terms have been divided on the way here. [-]
    """
    rho = (rho - terms.nearest[:, None]) // terms.unit
    probability, error, tilts = np.zeros(rho.shape), np.zeros(rho.shape), np.zeros(rho.shape, dtype=np.int64)
    pending = np.ones(rho.shape, dtype=np.bool_)
    if terms.normal_mean is None:
        whole = rho >= terms.span[:, None]
        if whole.any():
            probability[whole] = np.broadcast_to(_total(terms)[:, None], rho.shape)[whole]
        error[whole] = 4.0 * EPS * (int(terms.copies.max()) + 1)
        pending = (rho >= 0) & ~whole
    short = int(terms.copies[0]) <= 16 or int(terms.span[0]) <= 512
    if rho.shape[0] == 1 and short and pending.any() and affordable(terms, 0, int(rho[pending].max()), CHEAP):
        probability[pending], error[pending] = at_or_below_directly(terms, 0, rho[pending])
        return Tails(probability, error, tilts)
    error[pending] = np.inf
    accepted = max(ACCEPTED, 16.0 * EPS * float(terms.copies.max()))
    attempt, pivot, spread = np.zeros(rho.shape[0], dtype=np.int64), _middle(rho, pending), np.zeros(rho.shape[0])
    while pending.any():
        busy = np.flatnonzero(pending.any(axis=1))
        target = rho[busy, pivot[busy]] + np.array(SHIFTS)[attempt[busy]] * spread[busy]
        value, estimate, spread[busy] = one_tilt(terms.take(busy), target, rho[busy])
        better = pending[busy] & (estimate < error[busy])
        probability[busy] = np.where(better, value, probability[busy])
        error[busy] = np.where(better, estimate, error[busy])
        tilts[busy] += pending[busy]
        attempt[busy] += 1
        done = error[busy, pivot[busy]] <= accepted
        for g in busy[~done & (attempt[busy] == len(SHIFTS))]:
            _by_other_means(terms, int(g), rho, pending, (probability, error), pivot, depth)
            pending[g, pivot[g]] = False
            attempt[g] = 0
        attempt[busy[done]] = 0
        pending &= error > accepted
        fresh = np.flatnonzero(attempt == 0)
        pivot[fresh] = _middle(rho[fresh], pending[fresh])
    return Tails(probability, error, tilts)


def one_tilt(
    terms: EndwiseTerms, target: NDArray[np.float64], rho: NDArray[np.int64]
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Probabilities from one tilt of each sum, their relative error estimates, and the spread of the tilted sums.

    Parameters
    ----------
    terms : EndwiseTerms
        The terms of G sums.
    target : (G,) float64
        Where the mean of the tilted sum is put. [steps]
    rho : (G, L) int64
        Levels. [steps]

    Returns
    -------
    (G, L) float64, (G, L) float64, (G,) float64
        Probability at or below each level, relative error (infinite where the tilt says nothing), spread. [-, -, steps]
    """
    at = tilted(terms, saddlepoint(terms, target if terms.normal_mean is not None else np.maximum(target, 0.5)))
    spread = np.sqrt(at.variance)
    share = 1.0 / (1.0 + 2.5 * at.theta * spread)
    tolerance = ALIAS * share
    first, last = window(terms, at, tolerance)
    length = int(next_fast_len(max(_length(at, share, first, last, rho), 8), real=True))
    reach = 4.0 * np.log(length) + 6.0
    law = spectrum(terms, at, length, ALIAS * float(share.min()) / reach)

    inside = (rho >= first[:, None]) & (rho < first[:, None] + length)
    level = np.where(inside, rho, first[:, None])
    theta = at.theta[:, None]
    below, noise = (_by_window if law.nodes.size * rho.shape[1] > length else _by_nodes)(law, theta, first, level)
    exponent = at.log_transform[:, None] + theta * (level - at.centre[:, None])
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        value = np.exp(exponent) * below
        estimate = (noise + law.neglected * reach + 2.0 * tolerance[:, None]) / np.abs(below)
        estimate += np.where(length > last - first, 0.0, np.exp(-at.theta * length))[:, None] / value
        estimate += EPS * (terms.copies[:, None] + 4.0 + np.abs(exponent))
    good = inside & (below > 0.0) & np.isfinite(estimate)
    beyond = (rho >= last[:, None]) & (theta == 0.0)  # all but the tolerance lies below
    value, estimate = np.where(good, value, 0.0), np.where(good, estimate, np.inf)
    if beyond.any():
        value = np.where(beyond, _total(terms)[:, None], value)
        estimate = np.where(beyond, 4.0 * EPS * (terms.copies[:, None] + 1), estimate)
    return value, estimate, spread


def _length(
    at: TiltedTerms,
    share: NDArray[np.float64],
    first: NDArray[np.int64],
    last: NDArray[np.int64],
    rho: NDArray[np.int64],
) -> int:
    """Length of a window that serves all sums. [steps]

    What lies above the window is wrapped to its low end, where the geometric weights have fallen by exp(-theta W): of
    the untilted law no more than that is added to the probability. So the window may end early where theta is large.
    """
    with np.errstate(divide="ignore", over="ignore"):
        log_probability = at.log_transform + at.theta * (rho.min(axis=1) - at.centre) + np.log(share)
        wrapped = np.minimum((WRAPPED - log_probability) / at.theta, 2.0**52)
    inside = np.where(rho <= last[:, None], rho, first[:, None]).max(axis=1) - first + 2
    return int(np.minimum(last - first + 1, np.maximum(wrapped, inside)).max())


def _by_nodes(
    law: Spectrum, theta: NDArray[np.float64], first: NDArray[np.int64], level: NDArray[np.int64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Sum of ``g(y) exp(-theta (level - y))`` from the first value of the window to each level, and its noise.

    g is the tilted law; each frequency contributes a geometric sum.
    """
    unit, nodes = 2j * np.pi / law.length, law.nodes
    cells = level - first[:, None] + 1
    turn, start = _turned(level, nodes, law.length), _turned(first[:, None] - 1, nodes, law.length)[:, 0]
    ratio = -np.expm1(-theta - unit * nodes)
    flat = ratio == 0.0  # frequency zero without tilt: the geometric sum is the number of its terms
    kernel = turn - np.exp(-theta * cells)[:, :, None] * start[:, None, :]
    kernel /= np.where(flat, 1.0, ratio)[:, None, :]
    if flat.any():
        kernel = np.where(flat[:, None, :], cells[:, :, None], kernel)
    twice = np.where((nodes == 0) | (2 * nodes == law.length), 1.0, 2.0) / law.length
    below = (kernel @ (law.values * twice)[:, :, None]).real[:, :, 0]
    modulus = np.sqrt(kernel.real**2 + kernel.imag**2)
    noise = modulus @ (twice * (law.noise + 4.0 * EPS * np.abs(law.values)))[:, :, None]
    return below, noise[:, :, 0]


def _turned(level: NDArray[np.int64], nodes: NDArray[np.int64], length: int) -> NDArray[np.complex128]:
    """``exp(2 pi i j level / W)`` for each level and node, (G, L, m); each the product of two."""
    stride = 1 + int(np.sqrt(nodes[-1])) if nodes.size else 1
    steps = np.arange(stride)
    coarse = np.arange(int(nodes[-1]) // stride + 1) * stride if nodes.size else steps[:0]
    unit = 2j * np.pi / length
    fine = np.exp(unit * ((level[:, :, None] * steps) % length))
    rough = np.exp(unit * ((level[:, :, None] * coarse) % length))
    if nodes.size and int(nodes[-1]) == nodes.size - 1:  # without a gap from zero on
        whole: NDArray[np.complex128] = (rough[:, :, :, None] * fine[:, :, None, :]).reshape(*level.shape, -1)
        return whole[:, :, : nodes.size]
    return np.asarray(rough[:, :, nodes // stride] * fine[:, :, nodes % stride])


def _by_window(
    law: Spectrum, theta: NDArray[np.float64], first: NDArray[np.int64], level: NDArray[np.int64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """The same as `_by_nodes` by way of the tilted law itself, where most frequencies are needed."""
    full = law.values
    if law.nodes.size < law.length // 2 + 1:
        full = np.zeros((level.shape[0], law.length // 2 + 1), dtype=np.complex128)
        full[:, law.nodes] = law.values
    masses = irfft(full, n=law.length, axis=1)
    wrong = law.noise + EPS * (4.0 + np.log2(law.length)) * np.abs(law.values)
    each = wrong.sum(axis=1) * (2.0 / law.length)  # no entry is wrong by more, and together they are
    together = np.sqrt((wrong * wrong).sum(axis=1) * (2.0 / law.length))  # no longer than this
    decay = np.exp(-theta * np.arange(law.length))
    below, noise = np.zeros(level.shape), np.zeros(level.shape)
    for g in range(level.shape[0]):
        tilted_law = np.roll(masses[g], -int(first[g]))
        for column, cells in enumerate(level[g] - first[g] + 1):
            below[g, column] = tilted_law[:cells][::-1] @ decay[g, :cells]
            weights = decay[g, :cells]
            noise[g, column] = min(each[g] * weights.sum(), together[g] * np.sqrt(weights @ weights))
    return below, noise


def _total(terms: EndwiseTerms) -> NDArray[np.float64]:
    logs = np.zeros(terms.span.size)
    for block in terms.blocks:
        logs += (block.counts * np.log(block.mass.sum(axis=2))).sum(axis=1)
    return np.exp(logs)


def _middle(rho: NDArray[np.int64], pending: NDArray[np.bool_]) -> NDArray[np.int64]:
    """Column of the middle one of the pending levels of each row, (G,) int64."""
    order = np.argsort(np.where(pending, rho, np.iinfo(np.int64).max), axis=1, kind="stable")
    return np.take_along_axis(order, pending.sum(axis=1)[:, None] // 2 % rho.shape[1], axis=1)[:, 0]


def _by_other_means(
    terms: EndwiseTerms,
    g: int,
    rho: NDArray[np.int64],
    pending: NDArray[np.bool_],
    found: tuple[NDArray[np.float64], NDArray[np.float64]],
    pivot: NDArray[np.int64],
    depth: int,
) -> None:
    """Enter probabilities of one sum that no single tilt can give: by direct convolution, or divided at a gap."""
    probability, error = found
    levels = np.flatnonzero(pending[g])
    if affordable(terms, g, int(rho[g, levels].max()), AFFORDABLE):
        probability[g, levels], error[g, levels] = at_or_below_directly(terms, g, rho[g, levels])
        return
    parts = divided_at_gap(terms, g) if depth < SPLITS else None
    if parts is None:
        return
    value = absolute = 0.0
    for weight, left, masses, counts in parts:
        below = at_or_below(endwise(masses, counts), np.array([[rho[g, pivot[g]]]]), depth + 1)
        value += weight * float(below.probability[0, 0])
        if below.probability[0, 0] > 0.0:
            absolute += weight * float(below.probability[0, 0] * (below.relative_error[0, 0] + 8.0 * EPS * sum(counts)))
        if left <= 1e-13 * value:
            absolute += left
            break
    if value > 0.0 and absolute / value < error[g, pivot[g]]:
        probability[g, pivot[g]], error[g, pivot[g]] = value, absolute / value
