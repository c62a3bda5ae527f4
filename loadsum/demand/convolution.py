"""Distributions of sums of independent demands: exact, in the tail as in the middle."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.fft import irfft, next_fast_len, rfft

from loadsum.demand.lattice import ALIGNED, LatticeMass
from loadsum.demand.tails import Tails, at_or_below
from loadsum.demand.tilting import EndwiseTerms, endwise
from loadsum.demand.wholelaw import level_reached, whole_law


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
        Number of exponential tilts that were evaluated for it; 0 where terms were convolved directly. [-]
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

    Notes
    -----
    Probabilities are those of the terms as given, with a relative error that is estimated beside each (`tail`) and
    meant to stay below 1e-10 from 1 down to 1e-15.
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

    @property
    def least_kw(self) -> float:
        """Smallest demand that has any probability. [kW]"""
        return self.step_kw * sum(
            count * (term.offset + int(np.flatnonzero(term.mass)[0]))
            for term, count in zip(self.terms, self.counts, strict=True)
        )

    @property
    def largest_kw(self) -> float:
        """Largest demand that has any probability. [kW]"""
        return self.step_kw * (self._top() - int(self._upper().nearest[0]))

    def tail(self, level_kw: float) -> Tail:
        """Probability of demand strictly above a level, with its error estimate. [kW -> -]"""
        tails = self._above(np.array([level_kw]))
        return Tail(
            probability=float(tails.probability[0, 0]),
            relative_error=float(tails.relative_error[0, 0]),
            tilts=int(tails.tilts[0, 0]),
        )

    def above(self, level_kw: float) -> float:
        """Probability of demand strictly above a level. [kW -> -]"""
        return float(self._above(np.array([level_kw])).probability[0, 0])

    def above_many(self, levels_kw: NDArray[np.float64]) -> NDArray[np.float64]:
        """Probability of demand strictly above each level, (L,) float64; much cheaper than one by one. [kW -> -]"""
        return np.asarray(self._above(np.asarray(levels_kw, dtype=np.float64)).probability[0])

    def below(self, level_kw: float) -> float:
        """Probability of demand strictly below a level. [kW -> -]"""
        return float(self.below_many(np.array([level_kw]))[0])

    def below_many(self, levels_kw: NDArray[np.float64]) -> NDArray[np.float64]:
        """Probability of demand strictly below each level, (L,) float64. [kW -> -]"""
        last = np.ceil(levels_kw / self.step_kw - ALIGNED).astype(np.int64) - 1
        bottom = sum(count * term.offset for term, count in zip(self.terms, self.counts, strict=True))
        cut = sum(count * term.beyond_below for term, count in zip(self.terms, self.counts, strict=True))
        lower = endwise([term.mass for term in self.terms], self.counts)
        return np.asarray(np.minimum(at_or_below(lower, (last - bottom)[None, :]).probability[0] + cut, 1.0))

    def quantile_kw(self, exceeded_with: float) -> float:
        """Smallest lattice level that demand exceeds with at most the probability given. [- -> kW]"""
        return self.step_kw * (self._top() - 1 - level_reached(self._upper(), exceeded_with))

    def distribution(self) -> LatticeMass:
        """Whole distribution of the sum, without the far ends that together hold less than 1e-15.

        Each mass is accurate to about 1e-16 of the largest, and in the tails to much less; for tail probabilities
        ask :meth:`above`. No mass is negative.
        """
        bottom = sum(count * term.offset for term, count in zip(self.terms, self.counts, strict=True))
        first, mass = whole_law([term.mass for term in self.terms], self.counts)
        return LatticeMass(step_kw=self.step_kw, offset=bottom + first, mass=mass)

    def cumulants(self) -> tuple[float, float, float, float]:
        """First four cumulants of the sum. [kW, kW², kW³, kW⁴]"""
        totals = np.zeros(4)
        for term, count in zip(self.terms, self.counts, strict=True):
            points = term.points_kw
            mean = float(points @ term.mass) / float(term.mass.sum())
            away = points - mean
            second, third, fourth = (float((away**order) @ term.mass) for order in (2, 3, 4))
            totals += count * np.array([mean, second, third, fourth - 3.0 * second**2])
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

    def _top(self) -> int:
        return sum(
            count * (term.offset + term.mass.size - 1) for term, count in zip(self.terms, self.counts, strict=True)
        )

    def _upper(self) -> EndwiseTerms:
        return endwise([term.mass[::-1] for term in self.terms], self.counts)

    def _above(self, levels_kw: NDArray[np.float64]) -> Tails:
        first = np.floor(levels_kw / self.step_kw + ALIGNED).astype(np.int64) + 1
        tails = at_or_below(self._upper(), (self._top() - first)[None, :])
        cut = sum(count * term.beyond_above for term, count in zip(self.terms, self.counts, strict=True))
        return Tails(np.minimum(tails.probability + cut, 1.0), tails.relative_error, tails.tilts)


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

    def above_many(self, levels_kw: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Lower and upper probability of demand strictly above each level, (L,) float64 each. [kW -> -]"""
        upper = self.up.above_many(levels_kw)
        return (upper if self.exact else np.minimum(self.down.above_many(levels_kw), upper)), upper

    def above(self, level_kw: float) -> tuple[float, float]:
        """Lower and upper probability of demand strictly above a level. [kW -> -]"""
        lower, upper = self.above_many(np.array([level_kw]))
        return float(lower[0]), float(upper[0])

    def below(self, level_kw: float) -> tuple[float, float]:
        """Lower and upper probability of demand strictly below a level. [kW -> -]"""
        lower = self.up.below(level_kw)
        return lower, (lower if self.exact else max(self.down.below(level_kw), lower))


def plain_distributions(total: BracketedSum) -> tuple[LatticeMass, LatticeMass]:
    """Whole distributions of a sum rounded down and up, much cheaper than :meth:`DemandSum.distribution`.

    Terms that were not rounded are transformed once for both. Cumulative probabilities are accurate to about 1e-15
    absolute: enough for quantiles and for probabilities above 1e-5, and of no use below. Masses that the rounding of
    the transform leaves negative are set to zero, which moves less than that.

    Parameters
    ----------
    total : BracketedSum
        The sum.

    Returns
    -------
    down, up : LatticeMass
        One object twice where no term was rounded.
    """
    sides = (total.down,) if total.exact else (total.down, total.up)
    length = next_fast_len(max(_reach(side) for side in sides) + 1, real=True)
    kept = {id(term) for term in total.down.terms} & {id(term) for term in total.up.terms}
    shared = _product(
        [(t, n) for t, n in zip(total.down.terms, total.down.counts, strict=True) if id(t) in kept], length
    )
    made = []
    for side in sides:
        own = [(t, n) for t, n in zip(side.terms, side.counts, strict=True) if id(t) not in kept]
        mass = np.maximum(irfft(shared * _product(own, length), length)[: _reach(side) + 1], 0.0)
        there = np.flatnonzero(mass > 1e-19)
        first, last = int(there[0]), int(there[-1])
        bottom = sum(count * term.offset for term, count in zip(side.terms, side.counts, strict=True))
        made.append(LatticeMass(step_kw=side.step_kw, offset=bottom + first, mass=mass[first : last + 1].copy()))
    return made[0], made[-1]


def _reach(total: DemandSum) -> int:
    return sum(count * (term.mass.size - 1) for term, count in zip(total.terms, total.counts, strict=True))


def _product(terms: Sequence[tuple[LatticeMass, int]], length: int) -> NDArray[np.complex128]:
    """Product of transforms, 16 terms at a time."""
    product = np.ones(length // 2 + 1, dtype=np.complex128)
    for start in range(0, len(terms), 16):
        part = terms[start : start + 16]
        rows = np.zeros((len(part), length))
        for row, (term, _) in zip(rows, part, strict=True):
            row[: term.mass.size] = term.mass
        for transform, (_, count) in zip(rfft(rows, axis=1), part, strict=True):
            product *= transform if count == 1 else transform**count
    return product


def sum_distribution(terms: Sequence[LatticeMass]) -> LatticeMass:
    """Distribution of the sum of independent demands that share one lattice."""
    return DemandSum(terms=tuple(terms), counts=(1,) * len(terms)).distribution()
