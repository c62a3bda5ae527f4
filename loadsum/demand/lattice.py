"""Probability mass on an equally spaced grid, with floor and ceiling roundings that bracket the truth."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

Rounding = Literal["down", "up", "exact"]

CUT = 1e-25  # probability at which the tail of a continuous term is cut, on the outward side
ALIGNED = 1e-6  # a reading this close to a lattice point, in steps, lies on it (float noise of the file's decimals)

FEW = 16  # centres of a kernel-smoothed shape up to which each is placed where it is
MOST_VALUES = 2**17  # values of the normal law that they may cost
CELLS = 4096  # cells into which a continuous term is cut at least: about 1/200 of a standard deviation each
NORMAL_REACH = 10.5  # standard deviations beyond which a normal law has less than CUT


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LatticeMass:
    """Probability mass on the points ``(offset + i) * step_kw``.

    Parameters
    ----------
    step_kw : float
        Step of the lattice. [kW]
    offset : int
        Index of the first point; negative where demand can be negative. [-]
    mass : (n,) float64
        Probability at each point. [-]
    beyond_below, beyond_above : float
        Probability cut off a tail on the outward side and counted as minus or plus infinity: it is in no point, and
        counts below, or above, every level. Zero but for continuous terms, and there at most `CUT`. [-]
    """

    step_kw: float
    offset: int
    mass: NDArray[np.float64]
    beyond_below: float = 0.0
    beyond_above: float = 0.0

    def __post_init__(self) -> None:
        if self.step_kw <= 0.0 or self.mass.ndim != 1 or self.mass.size == 0:
            raise ValueError(f"need a positive step and a row of masses, got {self.step_kw}, {self.mass.shape}")
        self.mass.flags.writeable = False

    @property
    def points_kw(self) -> NDArray[np.float64]:
        """Demand at each point, (n,) float64. [kW]"""
        return np.arange(self.offset, self.offset + self.mass.size, dtype=np.float64) * self.step_kw

    def mean_kw(self) -> float:
        """Mean demand. [kW]"""
        return float(self.points_kw @ self.mass)

    def central_moment(self, order: int) -> float:
        """Central moment of the order given. [kW^order]"""
        return float(((self.points_kw - self.mean_kw()) ** order) @ self.mass)

    def moments(self) -> tuple[float, float, float]:
        """Mean, variance and third central moment. [kW, kW², kW³]"""
        mean = self.mean_kw()
        away = self.points_kw - mean
        square = away * away
        return mean, float(square @ self.mass), float((square * away) @ self.mass)

    def above(self, level_kw: float) -> float:
        """Probability of demand strictly above a level, summed from the top. [-]"""
        first = int(np.floor(level_kw / self.step_kw + ALIGNED)) + 1 - self.offset
        if first >= self.mass.size:
            return self.beyond_above
        return float(self.mass[max(first, 0) :][::-1].sum()) + self.beyond_above

    def above_many(self, levels_kw: NDArray[np.float64]) -> NDArray[np.float64]:
        """Probability of demand strictly above each level, summed from the top, (L,) float64. [kW -> -]"""
        first = np.floor(np.asarray(levels_kw) / self.step_kw + ALIGNED).astype(np.int64) + 1 - self.offset
        first = np.minimum(np.maximum(first, 0), self.mass.size)
        lowest = int(first.min(initial=self.mass.size))
        tail = np.append(np.cumsum(self.mass[lowest:][::-1])[::-1], 0.0) + self.beyond_above
        return np.asarray(tail[first - lowest], dtype=np.float64)

    def below(self, level_kw: float) -> float:
        """Probability of demand strictly below a level, summed from the bottom. [-]"""
        last = int(np.ceil(level_kw / self.step_kw - ALIGNED)) - self.offset
        return float(self.mass[: max(last, 0)].sum()) + self.beyond_below

    def below_many(self, levels_kw: NDArray[np.float64]) -> NDArray[np.float64]:
        """Probability of demand strictly below each level, summed from the bottom, (L,) float64. [kW -> -]"""
        last = np.ceil(np.asarray(levels_kw) / self.step_kw - ALIGNED).astype(np.int64) - self.offset
        last = np.minimum(np.maximum(last, 0), self.mass.size)
        head = np.append(0.0, np.cumsum(self.mass[: int(last.max(initial=0))])) + self.beyond_below
        return np.asarray(head[last], dtype=np.float64)

    def shifted(self, shift_kw: float, rounding: Rounding) -> "LatticeMass":
        """The demand with a constant added, the constant rounded to the lattice. [kW]"""
        (steps,) = lattice_index(np.array([shift_kw]), self.step_kw, rounding)
        return LatticeMass(
            step_kw=self.step_kw,
            offset=self.offset + int(steps),
            mass=self.mass,
            beyond_below=self.beyond_below,
            beyond_above=self.beyond_above,
        )

    def scaled(self, factor: float, rounding: Rounding) -> "LatticeMass":
        """The demand times a factor that is not negative, each point rounded to the lattice. [-]"""
        if factor < 0.0:
            raise ValueError(f"factor must not be negative, got {factor}")
        index = lattice_index(self.points_kw * factor, self.step_kw, rounding)
        return _gathered(index, self.mass, self.step_kw, self.beyond_below, self.beyond_above)


def lattice_index(kw: NDArray[np.float64], step_kw: float, rounding: Rounding) -> NDArray[np.int64]:
    """Index of the lattice point of each demand, rounded in one direction, (n,) int64.

    Raises
    ------
    ValueError
        A demand lies off the lattice and the rounding is "exact".
    """
    steps = kw / step_kw
    near = np.rint(steps)
    off = np.abs(steps - near) > ALIGNED
    if rounding == "exact" and np.any(off):
        raise ValueError(f"{int(off.sum())} demands lie off the lattice of {step_kw} kW, first {kw[off][0]} kW")
    rounded = np.ceil(steps) if rounding == "up" else np.floor(steps)
    return np.where(off, rounded, near).astype(np.int64)


def lattice_mass(
    kw: NDArray[np.float64], step_kw: float, rounding: Rounding, weights: NDArray[np.float64] | None = None
) -> LatticeMass:
    """Empirical distribution of readings, each rounded to the lattice in one direction.

    Parameters
    ----------
    kw : (n,) float64
        Readings, finite. [kW]
    step_kw : float
        Step of the lattice. [kW]
    rounding : {"down", "up", "exact"}
        Sums of demands rounded down lie at or below the truth, sums rounded up at or above it.
    weights : (n,) float64 or None
        Weight of each reading, not negative; equal when None. [-]
    """
    if kw.size == 0 or not np.all(np.isfinite(kw)):
        raise ValueError(f"need finite readings, got {kw.size} of which {int(np.isfinite(kw).sum())} finite")
    index = lattice_index(kw, step_kw, rounding)
    if weights is None:
        low = int(index.min())
        return LatticeMass(step_kw=step_kw, offset=low, mass=np.bincount(index - low).astype(np.float64) / kw.size)
    if weights.shape != kw.shape or weights.min() < 0.0 or not weights.sum() > 0.0:
        raise ValueError(f"need a weight of at least 0 for each of {kw.size} readings, got {weights.shape}")
    return _gathered(index, weights / weights.sum(), step_kw, 0.0, 0.0)


def continuous_mass(
    cdf: Callable[[NDArray[np.float64]], NDArray[np.float64]],
    survival: Callable[[NDArray[np.float64]], NDArray[np.float64]],
    low_kw: float,
    high_kw: float,
    step_kw: float,
    rounding: Literal["down", "up"],
    cells: int = CELLS,
    middle_kw: float | None = None,
) -> LatticeMass:
    """A continuous demand rounded to the lattice in one direction, its tails cut on the outward side.

    Rounded down, the demand of each cell goes to the cell's lower end, what lies above ``high_kw`` to that end
    and what lies below ``low_kw`` to minus infinity; rounded up, the other way round. Either way the rounded demand is
    ordered against the true one at every level, tails included.

    Parameters
    ----------
    cdf, survival : callable
        Probability at or below, and above, each demand; each accurate in its own tail. [kW -> -]
    low_kw, high_kw : float
        Range that is kept; beyond it lies no more than `CUT` as a rule. [kW]
    step_kw : float
        Step of the lattice. [kW]
    rounding : {"down", "up"}
        Direction of rounding.
    cells : int
        Number of cells that the range is cut into, where the lattice has more points than that. [-]
    middle_kw : float or None
        Demand up to which ``cdf`` is used and from which ``survival`` is, so that neither is near one far out; the
        middle of the range when None. [kW]
    """
    stride = cell_steps(low_kw, high_kw, step_kw, cells)
    first, last = int(np.floor(low_kw / (stride * step_kw))), int(np.ceil(high_kw / (stride * step_kw)))
    edges: NDArray[np.float64] = np.arange(first, last + 1, dtype=np.float64) * (stride * step_kw)
    middle = edges.size // 2 if middle_kw is None else int(np.searchsorted(edges, middle_kw))
    below, above = cdf(edges[: middle + 1]), survival(edges[middle:])
    mass = np.zeros((edges.size - 1) * stride + 1)
    shares = np.concatenate([np.diff(below), -np.diff(above)])
    if rounding == "down":
        mass[:-1:stride] = shares
        mass[-1] = above[-1]
        return LatticeMass(step_kw=step_kw, offset=first * stride, mass=mass, beyond_below=float(below[0]))
    mass[stride::stride] = shares
    mass[0] = below[0]
    return LatticeMass(step_kw=step_kw, offset=first * stride, mass=mass, beyond_above=float(above[-1]))


def normal_mass(mean_kw: float, spread_kw: float, step_kw: float, rounding: Literal["down", "up"]) -> LatticeMass:
    """A normal term rounded to the lattice in one direction.

    Parameters
    ----------
    mean_kw, spread_kw : float
        Mean and standard deviation; a standard deviation of 0 makes a constant. [kW]
    step_kw : float
        Step of the lattice. [kW]
    rounding : {"down", "up"}
        Direction of rounding.
    """
    return kernel_mass(np.array([mean_kw]), np.ones(1), spread_kw, step_kw, rounding)


def kernel_mass(
    centres_kw: NDArray[np.float64],
    weights: NDArray[np.float64],
    bandwidth_kw: float,
    step_kw: float,
    rounding: Literal["down", "up"],
) -> LatticeMass:
    """A mixture of normal laws of one width (a kernel-smoothed shape) rounded to the lattice in one direction.

    Parameters
    ----------
    centres_kw, weights : (n,) float64
        Centres and their weights. [kW, -]
    bandwidth_kw : float
        Standard deviation of each part; 0 leaves the centres as they are. [kW]
    step_kw : float
        Step of the lattice. [kW]
    rounding : {"down", "up"}
        Direction of rounding.
    """
    if bandwidth_kw == 0.0:
        return lattice_mass(centres_kw, step_kw, rounding, weights)
    reach = NORMAL_REACH * bandwidth_kw
    low, high = float(centres_kw.min()) - reach, float(centres_kw.max()) + reach
    share = weights / weights.sum()
    if centres_kw.size <= FEW:

        def cdf(kw: NDArray[np.float64]) -> NDArray[np.float64]:
            return np.asarray(ndtr((kw[:, None] - centres_kw) / bandwidth_kw) @ share, dtype=np.float64)

        def survival(kw: NDArray[np.float64]) -> NDArray[np.float64]:
            return np.asarray(ndtr((centres_kw - kw[:, None]) / bandwidth_kw) @ share, dtype=np.float64)

        cells = max(CELLS, MOST_VALUES // centres_kw.size)
        return continuous_mass(cdf, survival, low, high, step_kw, rounding, cells)
    cell = cell_steps(low, high, step_kw, CELLS) * step_kw
    # The centres are rounded outward to the cells of the term, so that one table of the normal law serves them all.
    places, index = np.unique(lattice_index(centres_kw, cell, rounding), return_inverse=True)
    height = np.bincount(index, weights=share)

    def summed(kw: NDArray[np.float64], sign: float) -> NDArray[np.float64]:
        edge = np.rint(kw / cell).astype(np.int64)
        first = int(edge[0] - places[-1])
        table = ndtr(sign * np.arange(first, int(edge[-1] - places[0]) + 1) * (cell / bandwidth_kw))
        total = np.zeros(edge.size)
        for place, part in zip(places.tolist(), height.tolist(), strict=True):
            start = int(edge[0]) - place - first
            total += part * table[start : start + edge.size]
        return total

    return continuous_mass(lambda kw: summed(kw, 1.0), lambda kw: summed(kw, -1.0), low, high, step_kw, rounding)


def cell_steps(low_kw: float, high_kw: float, step_kw: float, cells: int) -> int:
    """Lattice steps in one cell of a continuous term: as many as still make the cells as fine as is of use. [-]"""
    return max(int((high_kw - low_kw) / (cells * step_kw)), 1)


def mixture(parts: Sequence[LatticeMass], weights: Sequence[float]) -> LatticeMass:
    """Mixture of demands on one lattice: each part with its weight.

    Parameters
    ----------
    parts : sequence of LatticeMass
        Parts, on one lattice step.
    weights : sequence of float
        Weight of each part, not negative; scaled to sum to one. [-]
    """
    if len({part.step_kw for part in parts}) != 1 or min(weights) < 0.0 or not sum(weights) > 0.0:
        raise ValueError(f"need parts on one step and weights of at least 0, got {len(parts)} parts, {list(weights)}")
    low = min(part.offset for part in parts)
    high = max(part.offset + part.mass.size for part in parts)
    mass, total = np.zeros(high - low), float(sum(weights))
    below = above = 0.0
    for part, weight in zip(parts, weights, strict=True):
        start = part.offset - low
        mass[start : start + part.mass.size] += part.mass * (weight / total)
        below += part.beyond_below * weight / total
        above += part.beyond_above * weight / total
    return LatticeMass(step_kw=parts[0].step_kw, offset=low, mass=mass, beyond_below=below, beyond_above=above)


def _gathered(
    index: NDArray[np.int64], share: NDArray[np.float64], step_kw: float, below: float, above: float
) -> LatticeMass:
    low = int(index.min())
    mass = np.bincount(index - low, weights=share).astype(np.float64)
    return LatticeMass(step_kw=step_kw, offset=low, mass=mass, beyond_below=below, beyond_above=above)
