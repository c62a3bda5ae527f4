"""Saddlepoint approximations of tail probabilities, for comparison with the exact ones.

References
----------
.. [1] R. Lugannani, S. Rice, Adv. Appl. Prob. 12 (1980) 475-490.
.. [2] H. E. Daniels, Int. Stat. Rev. 55 (1987) 37-48: corrections for lattice variables.
"""

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq
from scipy.stats import norm

from loadsum.demand.convolution import DemandSum
from loadsum.demand.lattice import ALIGNED
from loadsum.demand.tilting import EndwiseTerms, endwise, log_transform, moments

NEAR_MEAN = 1e-4  # below this the formulas lose their digits and the limit at the mean is used


def lugannani_rice(saddle: float, cumulant: float, level: float, second: float, third: float) -> float:
    """Probability above a level of a continuous variable. [-]

    Parameters
    ----------
    saddle : float
        Root s of ``K'(s) = level``. [1/unit of the level]
    cumulant, second, third : float
        ``K(s)``, ``K''(s)`` and ``K'''(s)``.
    level : float
        The level.
    """
    w = float(np.sign(saddle) * np.sqrt(max(2.0 * (saddle * level - cumulant), 0.0)))
    return _tail(w, saddle * float(np.sqrt(second)), third / second**1.5)


def _tail(w: float, u: float, skewness: float) -> float:
    if abs(w) < NEAR_MEAN:
        return float(0.5 - skewness / (6.0 * np.sqrt(2.0 * np.pi)))
    return float(norm.sf(w) + norm.pdf(w) * (1.0 / u - 1.0 / w))


def lattice_saddlepoint(total: DemandSum, level_kw: float, order: int = 2) -> float:
    """Probability strictly above a level by the saddlepoint formula for lattice variables. [-]

    Parameters
    ----------
    total : DemandSum
        The sum.
    level_kw : float
        The level. [kW]
    order : {1, 2}
        First correction (saddlepoint at the first lattice point above the level) or second (half a step below).

    Returns
    -------
    float
        The approximation; NaN where there is no saddlepoint because the level is at or beyond an end of the support.
    """
    if order not in (1, 2):
        raise ValueError(f"order must be 1 or 2, got {order}")
    first_above = int(np.floor(level_kw / total.step_kw + ALIGNED)) + 1
    counted = list(zip(total.terms, total.counts, strict=True))
    upper = endwise([term.mass[::-1] for term in total.terms], total.counts)
    top = sum(count * (term.offset + term.mass.size - 1) for term, count in counted)
    rho = (top - first_above - int(upper.nearest[0])) // upper.unit
    half = 0.5 if order == 2 else 0.0
    mean = float(moments(upper, np.zeros(1))[0][0])
    if rho + half <= mean:
        return _lower_tail(upper, float(rho), order)
    lower = endwise([term.mass for term in total.terms], total.counts)
    return 1.0 - _lower_tail(lower, float(int(lower.span[0]) - rho - 1), order)


def _lower_tail(terms: EndwiseTerms, rho: float, order: int) -> float:
    """``P(Y <= rho)`` of a sum of variables that are not negative, for rho below its mean."""
    at = rho + (0.5 if order == 2 else 0.0)
    if at <= 0.0 or at >= float(terms.span[0]):
        return float("nan")
    saddle = _root(terms, at)
    tilt = np.array([saddle])
    variance = float(moments(terms, tilt)[1][0])
    w = float(np.sqrt(max(-2.0 * (saddle * at + float(log_transform(terms, tilt)[0])), 0.0)))
    size = 2.0 * np.sinh(0.5 * saddle) if order == 2 else -np.expm1(-saddle)
    return _tail(w, float(size * np.sqrt(variance)), -_skewness(terms))


def _root(terms: EndwiseTerms, at: float) -> float:
    def excess(theta: float) -> float:
        return float(moments(terms, np.array([theta]))[0][0]) - at

    if excess(0.0) <= 0.0:
        return 0.0
    high = 1.0 / float(np.sqrt(moments(terms, np.zeros(1))[1][0]))
    while excess(high) > 0.0:
        high *= 2.0
    return float(brentq(excess, 0.0, high, xtol=1e-15, rtol=1e-13))


def _skewness(terms: EndwiseTerms) -> float:
    second = third = 0.0
    for block in terms.blocks:
        r: NDArray[np.float64] = np.arange(block.mass.shape[2], dtype=np.float64)
        for row, count in zip(block.mass[0], block.counts[0], strict=True):
            away = r - float(row @ r) / float(row.sum())
            second, third = second + int(count) * float(row @ away**2), third + int(count) * float(row @ away**3)
    return float(third / second**1.5)
