"""Characteristic functions of tilted sums, at the frequencies where they are not negligible."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy.fft import next_fast_len, rfft

from loadsum.demand.tilting import EPS, EndwiseTerms, TermBlock, TiltedTerms, log_normal_transform

COARSE_COPIES = 12  # from so many copies on a coarse scan of the spectrum pays
COARSENESS = 12.5  # points of the coarse scan per step of a typical term's standard deviation
STRIDE = 32  # rows of the table of phases that are computed by trigonometry
TERM_NOISE = 4.0 * EPS  # error of one term's characteristic function; an FFT adds EPS for each halving of its length
MOST_POINTS = 128  # of interpolation
SMALL = 1e-9  # a characteristic function below this counts as this in the error estimate


@dataclass(frozen=True, slots=True, eq=False)
class Spectrum:
    """Characteristic functions of G tilted sums at some of the W-th roots of unity.

    Parameters
    ----------
    length : int
        Length of the window W; frequencies are ``2 pi j / W``. [steps]
    nodes : (m,) int64
        The j, between 0 and W / 2, that are kept.
    values : (G, m) complex128
        ``E exp(-2 pi i j Y / W)``. [-]
    noise : (G, m) float64
        Estimate of the absolute error of each value. [-]
    neglected : float
        No value that was left out is larger. [-]
    """

    length: int
    nodes: NDArray[np.int64]
    values: NDArray[np.complex128]
    noise: NDArray[np.float64]
    neglected: float


def spectrum(terms: EndwiseTerms, at: TiltedTerms, length: int, negligible: float) -> Spectrum:
    """Characteristic functions of the tilted sums, without frequencies where all are provably negligible.

    Parameters
    ----------
    terms, at : EndwiseTerms, TiltedTerms
        The terms, and the terms tilted.
    length : int
        Length of the window. [steps]
    negligible : float
        Values up to this may be left out. [-]
    """
    nodes = np.arange(length // 2 + 1)
    if terms.normal_sd is not None or int(terms.copies.max()) >= COARSE_COPIES:
        nodes = nodes[_possibly_large(terms, at, length, negligible)]
    values = _normal_values(terms, at, nodes, length)
    sizes, slopes = np.abs(values), np.zeros(values.shape)
    for block in at.blocks:
        rows, done = block.mass.shape[1], 0
        table: _Table | None = None
        size = 1 if nodes.size > length // 8 else 10
        while done < rows:
            if table is None:
                table = _table(block.mass.shape[2], nodes, length)
            single = _at_nodes(block.mass[:, done : done + size], nodes, length, table)
            counts = block.counts[:, done : done + size, None]
            modulus = np.sqrt(single.real**2 + single.imag**2)
            if np.any(counts > 1):
                values = values * np.multiply.reduce(_power(single, counts), axis=1)
            else:
                values = values * np.multiply.reduce(single, axis=1)
            noise = TERM_NOISE + EPS * (float(np.log2(length)) if table is None else table.turn)
            modulus = np.maximum(modulus, SMALL)
            slopes = slopes + (counts * noise / modulus).sum(axis=1)
            sizes = sizes * np.multiply.reduce(modulus**counts if np.any(counts > 1) else modulus, axis=1)
            done, size = done + size, 64 if table is not None else 2 * size
            keep = (np.abs(values) + sizes * slopes).max(axis=0) > negligible
            if keep.sum() < 0.75 * nodes.size:
                nodes, values, table = nodes[keep], values[:, keep], None
                sizes, slopes = sizes[:, keep], slopes[:, keep]
    return Spectrum(length, nodes, values, sizes * slopes, negligible)


def _normal_values(
    terms: EndwiseTerms, at: TiltedTerms, nodes: NDArray[np.int64], length: int
) -> NDArray[np.complex128]:
    """Characteristic function of the rounded normal variable under the tilt, (G, m); one where there is none."""
    if terms.normal_mean is None or terms.normal_sd is None:
        return np.ones((at.theta.size, nodes.size), dtype=np.complex128)
    s = at.theta[:, None] + (2j * np.pi / length) * nodes
    flat = np.abs(s) < 1e-6
    sure = np.where(flat, 1.0, s)
    rounding = np.where(flat, 1.0, 2.0 * np.sinh(0.5 * sure) / sure)
    exponent = -s * terms.normal_mean[:, None] + 0.5 * (s * terms.normal_sd[:, None]) ** 2
    whole = log_normal_transform(terms, at.theta)[:, None]
    return np.asarray(np.exp(exponent - whole) * rounding)


def _power(base: NDArray[np.complex128], counts: NDArray[np.int64]) -> NDArray[np.complex128]:
    result = np.ones_like(base)
    while np.any(counts):
        result = np.where(counts & 1, result * base, result)
        base, counts = base * base, counts >> 1
    return result


def _phase(product: NDArray[np.int64], length: int) -> NDArray[np.complex128]:
    """``exp(-2 pi i product / length)``, the angle reduced exactly first."""
    angle = (-2.0 * np.pi / length) * (product % length)
    phase: NDArray[np.complex128] = np.cos(angle) + 1j * np.sin(angle)
    return phase


@dataclass(frozen=True, slots=True, eq=False)
class _Table:
    """How to evaluate transforms at some nodes by matrix products.

    Parameters
    ----------
    gather : (n, q) float64 or None
        Carries mass to the q points of interpolation; None where the phases are those of every step.
    phases : (q, 2 m) float64
        Real, then imaginary part of the phase at each point for each node.
    turn : float
        Largest phase, whose rounding enters the error. [rad]
    """

    gather: NDArray[np.float64] | None
    phases: NDArray[np.float64]
    turn: float = 0.0


def _table(n: int, nodes: NDArray[np.int64], length: int) -> _Table | None:
    """The cheapest table for rows of n steps, or None where transforms of the whole window are cheaper.

    Where the phase turns little over the length of a row, a polynomial in the distance of low degree gives it to
    rounding error, and the row may be replaced by as many weights at Chebyshev points.
    """
    if nodes.size == 0:
        return _Table(None, np.zeros((n, 0)))
    turn = np.pi * float(nodes[-1]) / length * (n + 63)
    points = int(np.ceil(turn)) + 8
    while points < min(n // 3, MOST_POINTS):
        if points * np.log(2.0 * points / (np.e * max(turn, 1e-3))) > 40.0:
            gather, places = _chebyshev(-(-n // 64) * 64, -(-points // 4) * 4)
            gather = gather[:n]
            angle = (-2.0 * np.pi / length) * np.outer(places, nodes)
            return _Table(gather, np.concatenate((np.cos(angle), np.sin(angle)), axis=1), 2.0 * turn)
        points += 2
    if 0.5 * n * nodes.size < 0.8 * length * np.log2(length):
        return _Table(None, _phases(n, nodes, length))
    return None


@lru_cache(maxsize=16)
def _chebyshev(n: int, points: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Values at 0 .. n - 1 of the polynomials that are one at one of the points, (n, points), and the points."""
    angle = (np.arange(points) + 0.5) * (np.pi / points)
    places = (np.cos(angle) + 1.0) * (0.5 * (n - 1))
    away = np.arange(n)[:, None] - places
    hit = away == 0.0
    shares = np.where(np.arange(points) % 2, -1.0, 1.0) * np.sin(angle) / np.where(hit, 1.0, away)
    gather = np.where(hit.any(axis=1)[:, None], hit, shares / shares.sum(axis=1)[:, None])  # barycentric formula
    gather.flags.writeable = places.flags.writeable = False
    return gather, places


def _at_nodes(
    mass: NDArray[np.float64], nodes: NDArray[np.int64], length: int, table: _Table | None
) -> NDArray[np.complex128]:
    """Transforms of rows of mass at some nodes, (G, C, m): by a table of phases where there is one, else by FFT."""
    groups, rows, n = mass.shape
    if table is not None:
        flat = mass.reshape(groups * rows, n)
        both = (flat if table.gather is None else flat @ table.gather) @ table.phases
        out = np.empty((groups, rows, nodes.size), dtype=np.complex128)
        out.real = both[:, : nodes.size].reshape(out.shape)
        out.imag = both[:, nodes.size :].reshape(out.shape)
        return out
    if n > length:
        folds = -(-n // length)
        padded = np.zeros((groups, rows, folds * length))
        padded[:, :, :n] = mass
        mass = padded.reshape(groups, rows, folds, length).sum(axis=2)
    first = nodes.size > 0 and int(nodes[-1]) == nodes.size - 1  # without a gap from zero on
    kept: slice | NDArray[np.int64] = slice(0, nodes.size) if first else nodes
    out = np.empty((groups, rows, nodes.size), dtype=np.complex128)
    for g in range(groups):  # one sum at a time stays in the processor's cache
        out[g] = np.asarray(rfft(mass[g], n=length, axis=1))[:, kept]
    return out


def _phases(n: int, nodes: NDArray[np.int64], length: int) -> NDArray[np.float64]:
    """Real, then imaginary part of ``exp(-2 pi i j r / length)`` for r < n, (n, 2 m); each the product of two."""
    fine = _phase(np.arange(min(n, STRIDE))[:, None] * nodes, length)
    coarse = _phase(np.arange(0, n, STRIDE)[:, None] * nodes, length)
    phases = (coarse[:, None, :] * fine).reshape(-1, nodes.size)[:n]
    return np.concatenate((phases.real, phases.imag), axis=1)


def _possibly_large(terms: EndwiseTerms, at: TiltedTerms, length: int, negligible: float) -> NDArray[np.bool_]:
    """Whether any characteristic function may exceed the bound at each node, (W // 2 + 1,) bool.

    A coarse grid of frequencies is scanned. The squared modulus of a term's transform has a second derivative of at
    most twice the term's variance, so that between two points it exceeds the larger one by no more than a quarter of
    the variance times the squared distance in frequency.
    """
    longest = max((block.mass.shape[2] for block in at.blocks), default=1)
    typical = max((float(np.median(deviations)) for deviations in at.deviations), default=1.0)
    coarse = int(next_fast_len(max(int(COARSENESS * typical), longest, 64), real=True))
    if 2 * coarse > length:
        return np.ones(length // 2 + 1, dtype=np.bool_)
    cells = coarse // 2 + 1
    bound = np.ones((at.theta.size, cells))
    if terms.normal_sd is not None:
        edge = np.arange(cells) * (2.0 * np.pi / coarse)
        bound *= np.exp(-((edge * terms.normal_sd[:, None]) ** 2))
    large = np.asarray((bound > negligible**2).any(axis=0))
    scanned = list(zip(at.blocks, at.deviations, strict=True)) if int(terms.copies.max()) >= COARSE_COPIES else []
    for block, deviations in reversed(scanned):
        for i in range(0, deviations.shape[1], 10):
            if large.sum() <= 6 + coarse // 100:
                break
            bound *= _coarse_bound(block, deviations, slice(i, i + 10), coarse)
            large = np.asarray((bound > negligible**2).any(axis=0))
    return np.asarray(large[np.arange(length // 2 + 1) * coarse // length])


def _coarse_bound(block: TermBlock, deviations: NDArray[np.float64], rows: slice, coarse: int) -> NDArray[np.float64]:
    """Bound on the squared modulus of the product of some transforms between each coarse point and the next.

    The last cell ends at half the sampling frequency, about which the modulus is symmetric.
    """
    transform = np.asarray(rfft(block.mass[:, rows], n=coarse, axis=2))
    size = transform.real**2 + transform.imag**2
    np.maximum(size[:, :, :-1], size[:, :, 1:], out=size[:, :, :-1])
    size += ((deviations[:, rows] * (np.pi / coarse)) ** 2 + 1e-12)[:, :, None]
    np.minimum(size, 1.0, out=size)
    counts = block.counts[:, rows, None]
    return np.asarray(np.multiply.reduce(size**counts if np.any(counts > 1) else size, axis=1))
