"""Slow and exact twins: sums of lattice variables in whole numbers of any size."""

import math
from fractions import Fraction
from itertools import accumulate

import numpy as np
from flint import fmpz_poly

from loadsum.demand.convolution import DemandSum
from loadsum.demand.lattice import LatticeMass

BITS = 240  # masses that are floats are taken to this many binary places


def lattice(weights, offset=0, step_kw=0.01):
    """A term from whole-number weights."""
    total = sum(weights)
    return LatticeMass(step_kw=step_kw, offset=offset, mass=np.array([w / total for w in weights], dtype=np.float64))


def sparse(points):
    """Whole-number weights from a mapping of point to weight."""
    weights = [0] * (max(points) + 1)
    for point, weight in points.items():
        weights[point] = weight
    return weights


class ExactSum:
    """Tail probabilities of a sum as fractions."""

    def __init__(self, weights, counts):
        product, self.total = fmpz_poly([1]), 1
        for row, count in zip(weights, counts, strict=True):
            product *= fmpz_poly([int(w) for w in row]) ** count
            self.total *= int(sum(int(w) for w in row)) ** count
        coefficients = [int(c) for c in product.coeffs()]
        self.size = len(coefficients)
        self.from_top = list(accumulate(reversed(coefficients), initial=0))

    def at_least(self, point):
        """``P(S >= point)``, the point counted from the sum of the terms' first points."""
        return Fraction(self.from_top[min(max(self.size - point, 0), self.size)], self.total)

    def _share(self, point):
        return self.from_top[min(self.size - point, self.size)] / self.total

    def points_between(self, smallest, largest, how_many):
        """Points whose tail probability lies between two, spread evenly over their logarithms and over the range."""
        low = next(i for i, t in enumerate(self.from_top) if t > 0)
        logs = np.array([math.log10(t) for t in self.from_top[low:]]) - math.log10(self.total)
        wanted = np.linspace(np.log10(smallest), np.log10(largest), how_many)
        places = {int(np.clip(np.searchsorted(logs, w), 0, logs.size - 1)) + low for w in wanted}
        places |= {int(p) for p in np.linspace(low, self.size, how_many)}
        points = {self.size - p for p in places} | {self.size - p - 1 for p in places}
        return sorted(
            p
            for p in points
            if p >= 0 and smallest <= self.from_top[min(self.size - p, self.size)] / self.total <= largest
        )


def of_floats(total: DemandSum) -> ExactSum:
    """The exact sum of terms whose masses are taken as the binary fractions that they are."""
    scale = 2**BITS
    return ExactSum([[int(Fraction(float(m)) * scale) for m in term.mass] for term in total.terms], total.counts)


def relative_error(value, truth: Fraction) -> float:
    """Relative error of a float against a fraction."""
    return abs(float((Fraction(float(value)) - truth) / truth))
