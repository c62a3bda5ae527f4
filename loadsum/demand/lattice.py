"""Probability mass on an equally spaced grid, with floor and ceiling roundings that bracket the truth."""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

ALIGNED = 1e-6  # a reading this close to a lattice point, in steps, lies on it (float noise of the file's decimals)


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
    """

    step_kw: float
    offset: int
    mass: NDArray[np.float64]

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

    def above(self, level_kw: float) -> float:
        """Probability of demand strictly above a level, summed from the top. [-]"""
        first = int(np.floor(level_kw / self.step_kw + ALIGNED)) + 1 - self.offset
        if first >= self.mass.size:
            return 0.0
        return float(self.mass[max(first, 0) :][::-1].sum())

    def below(self, level_kw: float) -> float:
        """Probability of demand strictly below a level, summed from the bottom. [-]"""
        last = int(np.ceil(level_kw / self.step_kw - ALIGNED)) - self.offset
        return float(self.mass[: max(last, 0)].sum())


def lattice_mass(
    kw: NDArray[np.float64], step_kw: float, rounding: Literal["down", "up"], weights: NDArray[np.float64] | None = None
) -> LatticeMass:
    """Empirical distribution of readings, each rounded to the lattice in one direction.

    Parameters
    ----------
    kw : (n,) float64
        Readings, finite. [kW]
    step_kw : float
        Step of the lattice. [kW]
    rounding : {"down", "up"}
        Sums of demands rounded down lie at or below the truth, sums rounded up at or above it.
    weights : (n,) float64 or None
        Weight of each reading; equal when None. [-]
    """
    if kw.size == 0 or not np.all(np.isfinite(kw)):
        raise ValueError(f"need finite readings, got {kw.size} of which {int(np.isfinite(kw).sum())} finite")
    steps = kw / step_kw
    near = np.rint(steps)
    rounded = np.floor(steps) if rounding == "down" else np.ceil(steps)
    index = np.where(np.abs(steps - near) <= ALIGNED, near, rounded).astype(np.int64)
    low = int(index.min())
    share = np.full(kw.size, 1.0 / kw.size) if weights is None else weights / weights.sum()
    mass = np.bincount(index - low, weights=share).astype(np.float64)
    return LatticeMass(step_kw=step_kw, offset=low, mass=mass)
