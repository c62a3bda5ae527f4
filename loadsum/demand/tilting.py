"""Exponentially tilted laws of sums of independent lattice variables: cumulants, saddlepoint, window.

Everything here is in whole steps and seen from one end of the support: the outcome of a term is its distance ``r >= 0``
from that end, so that both the upper and the lower tail of a demand are the event ``Y <= rho`` of a sum ``Y`` of terms
that are not negative, and the tilt ``exp(-theta * r)`` with ``theta >= 0`` never overflows. Arrays carry a leading axis
of G sums that are computed together.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

EPS = float(np.finfo(np.float64).eps)
THETA_BITS = 26  # a tilt of so many bits times a distance of up to 2**27 steps is exact in float64
SADDLE_ROUNDS = 60
REACHES = 1.1 * 2.0 ** np.arange(4)  # second tilts tried for the window, per standard deviation of the sum


@dataclass(frozen=True, slots=True, eq=False)
class TermBlock:
    """Terms of similar length.

    Parameters
    ----------
    mass : (G, C, n) float64
        Mass at each distance from the end, padded with zeros. [-]
    counts : (G, C) int64
        Independent copies of each term. [-]
    """

    mass: NDArray[np.float64]
    counts: NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class EndwiseTerms:
    """Terms of G sums, seen from one end of the support.

    Parameters
    ----------
    blocks : tuple of TermBlock
        Terms, by length.
    nearest : (G,) int64
        Distance of the nearest outcome of the sum from the end. [lattice steps]
    unit : int
        Steps of the lattice in one step here: the greatest common divisor of all distances from the nearest. [-]
    span : (G,) int64
        Largest value of the sum. [steps]
    copies : (G,) int64
        Number of terms, copies counted. [-]
    normal_mean, normal_sd : (G,) float64 or None
        A normal variable, rounded to whole steps with the mean given after rounding, that is added to each
        sum; its standard deviation must be several steps. [steps]
    """

    blocks: tuple[TermBlock, ...]
    nearest: NDArray[np.int64]
    unit: int
    span: NDArray[np.int64]
    copies: NDArray[np.int64]
    normal_mean: NDArray[np.float64] | None = None
    normal_sd: NDArray[np.float64] | None = None

    def take(self, chosen: NDArray[np.int64]) -> "EndwiseTerms":
        """Some of the sums."""
        if chosen.size == self.span.size:
            return self
        return replace(
            self,
            blocks=tuple(TermBlock(block.mass[chosen], block.counts[chosen]) for block in self.blocks),
            nearest=self.nearest[chosen],
            span=self.span[chosen],
            copies=self.copies[chosen],
            normal_mean=None if self.normal_mean is None else self.normal_mean[chosen],
            normal_sd=None if self.normal_sd is None else self.normal_sd[chosen],
        )


def endwise(masses: Sequence[NDArray[np.float64]], counts: Sequence[int]) -> EndwiseTerms:
    """Terms of one sum, packed by length.

    Parameters
    ----------
    masses : sequence of (n,) float64
        Mass at each distance from the end, not all zero; it need not sum to one. [-]
    counts : sequence of int
        Independent copies of each. [-]
    """
    unit, nearest, reduced = 0, 0, []
    for mass, count in zip(masses, counts, strict=True):
        first, last = int(np.argmax(mass > 0.0)), mass.size - 1 - int(np.argmax(mass[::-1] > 0.0))
        nearest += first * count
        reduced.append(mass[first : last + 1])
        if unit != 1 and last > first:
            unit = int(np.gcd(unit, np.gcd.reduce(np.flatnonzero(reduced[-1]))))
    unit = max(unit, 1)
    reduced = [mass[::unit] for mass in reduced] if unit > 1 else reduced
    order = sorted(range(len(reduced)), key=lambda c: reduced[c].size)
    blocks, i = [], 0
    while i < len(order):
        limit = 3 * reduced[order[i]].size + 200
        last = i
        while last < len(order) and reduced[order[last]].size <= limit:
            last += 1
        rows = sorted(order[i:last], key=lambda c: float(reduced[c].max()))  # the smoothest first: they tell most
        block = np.zeros((1, len(rows), reduced[order[last - 1]].size))
        for row, c in enumerate(rows):
            block[0, row, : reduced[c].size] = reduced[c]
        blocks.append(TermBlock(block, np.array([[counts[c] for c in rows]], dtype=np.int64)))
        i = last
    span = sum((mass.size - 1) * int(count) for mass, count in zip(reduced, counts, strict=True))
    return EndwiseTerms(tuple(blocks), np.array([nearest]), unit, np.array([span]), np.array([int(sum(counts))]))


def _weights(block: TermBlock, theta: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    r = np.arange(block.mass.shape[2], dtype=np.float64)
    return r, np.exp(-theta[:, None] * r)


def _normal_moments(
    terms: EndwiseTerms, theta: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]] | None:
    """Tilted mean and variance of the rounded normal variable: that of a normal and a uniform one."""
    if terms.normal_mean is None or terms.normal_sd is None:
        return None
    half = 0.5 * np.maximum(theta, 1e-3)
    flat = theta < 1e-3
    mean = terms.normal_mean - terms.normal_sd**2 * theta
    mean -= np.where(flat, theta / 12.0, 0.5 / np.tanh(half) - 0.5 / half)
    variance = terms.normal_sd**2 + np.where(flat, 1.0 / 12.0, 0.25 / half**2 - 0.25 / np.sinh(half) ** 2)
    return mean, variance


def moments(terms: EndwiseTerms, theta: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Mean and variance of each tilted sum, (G,) float64 each. [steps, steps²]"""
    mean, variance = np.zeros(theta.size), np.zeros(theta.size)
    for block in terms.blocks:
        r, weight = _weights(block, theta)
        sums = block.mass @ np.stack((weight, weight * r, weight * (r * r)), axis=2)
        ratio = sums[:, :, 1] / sums[:, :, 0]
        mean += (block.counts * ratio).sum(axis=1)
        variance += (block.counts * np.maximum(sums[:, :, 2] / sums[:, :, 0] - ratio**2, 0.0)).sum(axis=1)
    smooth = _normal_moments(terms, theta)
    return (mean, variance) if smooth is None else (mean + smooth[0], variance + smooth[1])


def log_normal_transform(terms: EndwiseTerms, theta: NDArray[np.float64]) -> NDArray[np.float64]:
    """Logarithm of E exp(-theta Z) for the rounded normal variable of each sum, (G,) float64; 0 where there is none."""
    if terms.normal_mean is None or terms.normal_sd is None:
        return np.zeros(theta.shape)
    half = 0.5 * np.abs(theta)
    flat = half < 1e-3
    sure = np.where(flat, 1.0, half)
    rounding = np.where(flat, half**2 / 6.0, sure + np.log(-np.expm1(-2.0 * sure) / (2.0 * sure)))
    return np.asarray(-theta * terms.normal_mean + 0.5 * (theta * terms.normal_sd) ** 2 + rounding)


def log_transform(terms: EndwiseTerms, theta: NDArray[np.float64]) -> NDArray[np.float64]:
    """Logarithm of E exp(-theta Y) of each sum, (G,) float64. [-]"""
    total = log_normal_transform(terms, theta)
    for block in terms.blocks:
        weight = _weights(block, theta)[1]
        total = total + (block.counts * np.log((block.mass @ weight[:, :, None])[:, :, 0])).sum(axis=1)
    return np.asarray(total)


def coarsened(theta: NDArray[np.float64]) -> NDArray[np.float64]:
    """Tilts rounded to `THETA_BITS` bits, so that their product with any distance is exact."""
    fraction, exponent = np.frexp(theta)
    return np.asarray(np.ldexp(np.rint(np.ldexp(fraction, THETA_BITS)), exponent - THETA_BITS))


def saddlepoint(terms: EndwiseTerms, target: NDArray[np.float64]) -> NDArray[np.float64]:
    """Tilt under which the mean of each sum is near its target, or 0 where it lies below the target already.

    By Newton's method between bounds; a tilt need only be near the saddlepoint to serve, and is rounded to few bits.
    """
    mean, variance = moments(terms, np.zeros(target.size))
    theta = np.maximum(mean - target, 0.0) / np.maximum(variance, 1e-12)
    sought = theta > 0.0
    low, high = np.zeros(target.size), np.full(target.size, np.inf)
    for _ in range(SADDLE_ROUNDS):
        if not np.any(sought):
            break
        mean, variance = moments(terms, theta)
        sought = sought & (np.abs(mean - target) > 0.25 * np.sqrt(variance) + 1e-3 * np.abs(target))
        low, high = np.where(mean > target, theta, low), np.where(mean > target, high, theta)
        newton = theta + np.where(variance > 0.0, (mean - target) / np.maximum(variance, 1e-12), np.inf)
        halved = np.where(np.isfinite(high), 0.5 * (low + high), 4.0 * theta)
        theta = np.where(sought, np.where((newton > low) & (newton < high), newton, halved), theta)
    return coarsened(theta)


@dataclass(frozen=True, slots=True, eq=False)
class TiltedTerms:
    """Terms tilted and normalised.

    Parameters
    ----------
    theta : (G,) float64
        The tilts. [1/step]
    blocks : tuple of TermBlock
        Tilted mass, rows summing to one. [-]
    centre : (G,) int64
        Whole number of steps near the tilted mean. [steps]
    log_transform : (G,) float64
        Logarithm of ``E exp(-theta (Y - centre))``. [-]
    mean, variance : (G,) float64
        Of the tilted sum. [steps, steps²]
    deviations : tuple of (G, C) float64
        Tilted mean absolute distance of each term from a fixed point, or more. [steps]
    """

    theta: NDArray[np.float64]
    blocks: tuple[TermBlock, ...]
    centre: NDArray[np.int64]
    log_transform: NDArray[np.float64]
    mean: NDArray[np.float64]
    variance: NDArray[np.float64]
    deviations: tuple[NDArray[np.float64], ...]


def tilted(terms: EndwiseTerms, theta: NDArray[np.float64]) -> TiltedTerms:
    """The terms under a tilt of each sum. [1/step]"""
    blocks, deviations = [], []
    centre = np.zeros(theta.size, dtype=np.int64)
    logs, mean, variance = np.zeros(theta.size), np.zeros(theta.size), np.zeros(theta.size)
    smooth = _normal_moments(terms, theta)
    if smooth is not None:
        centre += np.rint(smooth[0]).astype(np.int64)
        logs += log_normal_transform(terms, theta) + theta * centre
        mean, variance = mean + smooth[0], variance + smooth[1]
    for block in terms.blocks:
        r, weight = _weights(block, theta)
        mass = block.mass * weight[:, None, :]
        sums = mass @ np.stack((np.ones(r.size), r, r * r), axis=1)
        total, means = sums[:, :, 0], sums[:, :, 1] / sums[:, :, 0]
        spreads = np.maximum(sums[:, :, 2] / total - means**2, 0.0)
        mass /= total[:, :, None]
        whole = np.rint(means).astype(np.int64)
        lift = theta[:, None] * whole
        near = np.where(lift < 700.0, np.log(total * np.exp(np.minimum(lift, 700.0))), np.log(total) + lift)
        logs += (block.counts * near).sum(axis=1)
        centre += (block.counts * whole).sum(axis=1)
        mean += (block.counts * means).sum(axis=1)
        variance += (block.counts * spreads).sum(axis=1)
        deviations.append(np.sqrt(spreads))
        blocks.append(TermBlock(mass, block.counts))
    return TiltedTerms(theta, tuple(blocks), centre, logs, mean, variance, tuple(deviations))


def window(
    terms: EndwiseTerms, at: TiltedTerms, tolerance: NDArray[np.float64]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """First and last value outside which each tilted sum lies with no more than the tolerance on each side.

    By Chernoff's bound with the best of several second tilts, or the end of the support where that is nearer.
    """
    spread = np.sqrt(np.maximum(at.variance, 1e-12))
    base = at.log_transform - at.theta * at.centre
    wanted = -np.log(tolerance)
    first, last = np.full(at.theta.size, -np.inf), np.full(at.theta.size, np.inf)
    tilts = [_weights(block, at.theta)[1] for block in terms.blocks]
    factors = [_weights(block, REACHES[0] / spread)[1] for block in terms.blocks]
    step = REACHES[0] / spread
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
        for _ in REACHES:
            down, up = log_normal_transform(terms, at.theta + step), log_normal_transform(terms, at.theta - step)
            for block, tilt, factor in zip(terms.blocks, tilts, factors, strict=True):
                logs = np.log(block.mass @ np.stack((tilt * factor, tilt / factor), axis=2))
                down = down + (block.counts * logs[:, :, 0]).sum(axis=1)
                up = up + (block.counts * logs[:, :, 1]).sum(axis=1)
            first = np.fmax(first, -(wanted + down - base) / step)
            last = np.fmin(last, (wanted + up - base) / step)
            step, factors = 2.0 * step, [factor * factor for factor in factors]
    if terms.normal_mean is None:
        first, last = np.maximum(first, 0.0), np.minimum(last, terms.span)
    first, last = np.floor(first).astype(np.int64), np.ceil(last).astype(np.int64)
    return first, np.maximum(last, first)
