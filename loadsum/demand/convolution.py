"""Distributions of sums of independent demands."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal import fftconvolve

from loadsum.demand.lattice import LatticeMass


@dataclass(frozen=True, slots=True, kw_only=True)
class Tail:
    """Probability beyond a level with what is known about its arithmetic.

    Parameters
    ----------
    probability : float
        The probability. [-]
    relative_error : float
        Estimate of its relative error, meant never to be exceeded. [-]
    tilts : int
        Number of exponential tilts that were evaluated for it. [-]
    """

    probability: float
    relative_error: float
    tilts: int


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DemandSum:
    """Sum of independent demands on one lattice.

    Parameters
    ----------
    terms : tuple of LatticeMass
        Independent terms that share one lattice step.
    counts : tuple of int
        How many independent copies of each term are in the sum. [-]
    """

    terms: tuple[LatticeMass, ...]
    counts: tuple[int, ...]

    def __post_init__(self) -> None:
        steps = {term.step_kw for term in self.terms}
        if len(steps) != 1:
            raise ValueError(f"terms must share one lattice step, got {sorted(steps)}")
        if len(self.counts) != len(self.terms) or min(self.counts) < 1:
            raise ValueError(f"need a positive count for each of {len(self.terms)} terms, got {self.counts}")

    @property
    def step_kw(self) -> float:
        """Step of the lattice. [kW]"""
        return self.terms[0].step_kw

    def distribution(self) -> LatticeMass:
        """Whole distribution of the sum, accurate to about 1e-15 absolute; for tails ask :meth:`above`."""
        copies = [term for term, count in zip(self.terms, self.counts, strict=True) for _ in range(count)]
        return sum_distribution(copies)

    def tail(self, level_kw: float) -> Tail:
        """Probability of demand strictly above a level, with its error estimate. [kW -> -]"""
        return Tail(probability=self.distribution().above(level_kw), relative_error=1e-6, tilts=0)

    def above(self, level_kw: float) -> float:
        """Probability of demand strictly above a level. [kW -> -]"""
        return self.tail(level_kw).probability

    def above_many(self, levels_kw: NDArray[np.float64]) -> NDArray[np.float64]:
        """Probability of demand strictly above each level, (L,) float64. [kW -> -]"""
        whole = self.distribution()
        return np.array([whole.above(float(level)) for level in levels_kw])

    def below(self, level_kw: float) -> float:
        """Probability of demand strictly below a level. [kW -> -]"""
        return self.distribution().below(level_kw)

    def quantile_kw(self, exceeded_with: float) -> float:
        """Smallest lattice level that demand exceeds with at most the probability given. [- -> kW]"""
        whole = self.distribution()
        above = np.append(np.cumsum(whole.mass[::-1])[::-1][1:], 0.0)
        index = int(np.argmax(above <= exceeded_with))
        return float((whole.offset + index) * whole.step_kw)

    def cumulants(self) -> tuple[float, float, float, float]:
        """First four cumulants of the sum. [kW, kW², kW³, kW⁴]"""
        totals = np.zeros(4)
        for term, count in zip(self.terms, self.counts, strict=True):
            second = term.central_moment(2)
            fourth = term.central_moment(4) - 3.0 * second**2
            totals += count * np.array([term.mean_kw(), second, term.central_moment(3), fourth])
        return float(totals[0]), float(totals[1]), float(totals[2]), float(totals[3])

    def mean_kw(self) -> float:
        """Mean of the sum. [kW]"""
        return self.cumulants()[0]

    def variance_kw2(self) -> float:
        """Variance of the sum. [kW²]"""
        return self.cumulants()[1]

    def skewness(self) -> float:
        """Skewness of the sum; 0 for a constant. [-]"""
        _, second, third, _ = self.cumulants()
        return third / second**1.5 if second > 0.0 else 0.0

    def excess_kurtosis(self) -> float:
        """Excess kurtosis of the sum; 0 for a constant. [-]"""
        _, second, _, fourth = self.cumulants()
        return fourth / second**2 if second > 0.0 else 0.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class BracketedSum:
    """A sum with every term rounded down and up to the lattice, so that the truth lies between.

    Parameters
    ----------
    down, up : DemandSum
        The sum of the terms rounded down, and up; the same object where no term was rounded.
    """

    down: DemandSum
    up: DemandSum

    @property
    def exact(self) -> bool:
        """Whether no term was rounded, so that lower and upper are the same."""
        return self.down is self.up

    def above(self, level_kw: float) -> tuple[float, float]:
        """Lower and upper probability of demand strictly above a level. [kW -> -]"""
        upper = self.up.above(level_kw)
        return (upper if self.exact else min(self.down.above(level_kw), upper)), upper

    def below(self, level_kw: float) -> tuple[float, float]:
        """Lower and upper probability of demand strictly below a level. [kW -> -]"""
        lower = self.up.below(level_kw)
        return lower, (lower if self.exact else max(self.down.below(level_kw), lower))


def exceedance_of_many(sums: Sequence[DemandSum], levels_kw: NDArray[np.float64]) -> NDArray[np.float64]:
    """Probability that each of many sums is strictly above its levels.

    Parameters
    ----------
    sums : sequence of G DemandSum
        Sums, as a rule of few terms each.
    levels_kw : (G, L) float64
        Levels of each sum. [kW]

    Returns
    -------
    (G, L) float64
        Probability above each level. [-]
    """
    return np.array([total.above_many(row) for total, row in zip(sums, levels_kw, strict=True)])


def sum_distribution(terms: Sequence[LatticeMass]) -> LatticeMass:
    """Distribution of the sum of independent demands that share one lattice."""
    steps = {term.step_kw for term in terms}
    if len(steps) != 1:
        raise ValueError(f"terms must share one lattice step, got {sorted(steps)}")
    queue = sorted((term.mass for term in terms), key=len)
    while len(queue) > 1:
        a, b = queue.pop(0), queue.pop(0)
        small = min(a.size, b.size) <= 4096
        queue.append(np.convolve(a, b) if small else np.maximum(fftconvolve(a, b), 0.0))
        queue.sort(key=len)
    return LatticeMass(step_kw=steps.pop(), offset=sum(term.offset for term in terms), mass=queue[0])
