"""Bounds on the probability of a sum of independent demands above a level, that hold whatever the level.

Each bounds ``P(S >= t)`` for t above the mean, for terms that never leave the range they are given with: their support
is the observed range, and a demand never yet observed breaks them all.
"""

import numpy as np
from scipy.optimize import minimize_scalar

from loadsum.demand.convolution import DemandSum
from loadsum.demand.lattice import ALIGNED
from loadsum.demand.tilting import endwise, log_transform, saddlepoint


def _excess_kw(total: DemandSum, level_kw: float) -> float:
    """Distance from the mean to the first lattice point above the level. [kW]"""
    excess = (np.floor(level_kw / total.step_kw + ALIGNED) + 1.0) * total.step_kw - total.mean_kw()
    if excess <= 0.0:
        raise ValueError(f"the bound needs a level above the mean, got {level_kw} kW for {total.mean_kw()} kW")
    return float(excess)


def chernoff_bound(total: DemandSum, level_kw: float) -> float:
    """The least exponential bound, ``min over s of exp(K(s) - s t)``; uses the whole distributions. [kW -> -]"""
    _excess_kw(total, level_kw)
    upper = endwise([term.mass[::-1] for term in total.terms], total.counts)
    top = sum(c * (term.offset + term.mass.size - 1) for term, c in zip(total.terms, total.counts, strict=True))
    first = int(np.floor(level_kw / total.step_kw + ALIGNED)) + 1
    rho = (top - first - int(upper.nearest[0])) / upper.unit
    if rho < 0.0:
        return 0.0
    near = float(saddlepoint(upper, np.array([max(rho, 0.5)]))[0])

    def exponent(theta: float) -> float:
        return float(log_transform(upper, np.array([theta]))[0]) + theta * rho

    best = minimize_scalar(
        exponent, bounds=(0.25 * near, 4.0 * near + 1e-9), method="bounded", options={"xatol": 1e-12}
    )
    return float(np.exp(best.fun))


def hoeffding_bound(total: DemandSum, level_kw: float) -> float:
    """Hoeffding's bound (1963), from the ranges of the terms. [kW -> -]"""
    excess = _excess_kw(total, level_kw)
    squares = sum(
        count * (float(np.ptp(term.points_kw[term.mass > 0.0]))) ** 2
        for term, count in zip(total.terms, total.counts, strict=True)
    )
    return float(np.exp(-2.0 * excess**2 / squares))


def bernstein_bound(total: DemandSum, level_kw: float, largest_rise_kw: float | None = None) -> float:
    """Bernstein's bound, from the variance and the largest rise of any term above its mean. [kW -> -]"""
    excess, rise = _excess_kw(total, level_kw), largest_rise_kw or _largest_rise_kw(total)
    return float(np.exp(-(excess**2) / (2.0 * (total.variance_kw2() + rise * excess / 3.0))))


def bennett_bound(total: DemandSum, level_kw: float, largest_rise_kw: float | None = None) -> float:
    """Bennett's bound (1962), from the variance and the largest rise of any term above its mean. [kW -> -]"""
    excess, variance = _excess_kw(total, level_kw), total.variance_kw2()
    rise = largest_rise_kw or _largest_rise_kw(total)
    x = rise * excess / variance
    return float(np.exp(-variance / rise**2 * ((1.0 + x) * np.log1p(x) - x)))


def _largest_rise_kw(total: DemandSum) -> float:
    return max(float(term.points_kw[term.mass > 0.0].max()) - term.mean_kw() for term in total.terms)
