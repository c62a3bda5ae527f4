"""Choice of the lattice step: the meters' own resolution where it can be afforded, else fine enough for the levels."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.convolution import BracketedSum

UNITS_PER_KW = 12_000_000  # readings are taken as multiples of 1 mW, or of a twelfth: averages of up to four, or six
MOST_POINTS = 1_000_000  # points of all terms together up to which a lattice is affordable
GROUP_POINTS = 2**14  # points of a group's sum up to which hundreds of demand intervals are affordable
ROUNDS = 8
SMALLEST = 1e-15  # probabilities below this are not asked of the bracket


def resolution_kw(kw: NDArray[np.float64]) -> float | None:
    """Largest step of which all readings are multiples, or None where there is none or all are zero. [kW]

    Parameters
    ----------
    kw : (n,) float64
        Readings; NaN is left out. [kW]
    """
    units = kw[np.isfinite(kw)] * UNITS_PER_KW
    if units.size == 0 or np.abs(units).max() > 2.0**52:
        return None
    whole = np.rint(units)
    if np.any(np.abs(units - whole) > 0.01):
        return None
    step = int(np.gcd.reduce(whole.astype(np.int64)))
    return step / UNITS_PER_KW if step else None


@dataclass(frozen=True, slots=True, kw_only=True)
class LatticeStep:
    """Step of the lattice and why.

    Parameters
    ----------
    step_kw : float
        Step. [kW]
    exact : bool
        Whether every reading lies on the lattice, so that nothing is rounded.
    reason : str
        Why, in words.
    """

    step_kw: float
    exact: bool
    reason: str


def lattice_step(columns_kw: Sequence[NDArray[np.float64]], coarsest_kw: float) -> LatticeStep:
    """Step of the lattice for the readings of some customers.

    Parameters
    ----------
    columns_kw : sequence of (n,) float64
        Readings of each customer; NaN is left out. [kW]
    coarsest_kw : float
        Largest step, taken where the readings have no common resolution or it cannot be afforded; a coarser
        resolution is divided into whole parts, because other terms of the sum are rounded to the step. [kW]
    """
    together = np.concatenate([np.ravel(column) for column in columns_kw])
    if not np.any(together[np.isfinite(together)]):
        return LatticeStep(step_kw=coarsest_kw, exact=True, reason="every reading is zero; nothing is rounded")
    resolution = resolution_kw(together)
    if resolution is None:
        reason = "the readings have no common resolution; they are rounded both ways"
        return LatticeStep(step_kw=coarsest_kw, exact=False, reason=reason)
    step = float(resolution / np.ceil(resolution / coarsest_kw * (1.0 - 1e-12)))
    of_resolution = f"the readings' resolution of {1000.0 * resolution:g} W"
    points = sum(float(np.ptp(column[np.isfinite(column)])) / step + 1.0 for column in columns_kw)
    if points > MOST_POINTS:
        reason = f"{of_resolution} would take {points:.3g} points; they are rounded both ways"
        return LatticeStep(step_kw=coarsest_kw, exact=False, reason=reason)
    return LatticeStep(step_kw=step, exact=True, reason=f"the step divides {of_resolution}; nothing is rounded")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RefinedSum:
    """A bracketed sum on a lattice fine enough for the levels asked, or the finest affordable.

    Parameters
    ----------
    bracket : BracketedSum
        The sum.
    lower, upper : (L,) float64
        Probability strictly above each level. [-]
    widest : float
        Widest bracket, ``(upper - lower) / upper``, over the levels. [-]
    tight : bool
        Whether that is within the width asked for; if not, the report says so.
    """

    bracket: BracketedSum
    lower: NDArray[np.float64]
    upper: NDArray[np.float64]
    widest: float
    tight: bool


def refined(
    build: Callable[[float], BracketedSum], levels_kw: NDArray[np.float64], step_kw: float, within: float = 0.01
) -> RefinedSum:
    """The sum on ever finer lattices until its bracket at the levels is narrow enough.

    Parameters
    ----------
    build : callable
        Makes the bracketed sum for a lattice step. [kW -> sum]
    levels_kw : (L,) float64
        Levels asked. [kW]
    step_kw : float
        First step. [kW]
    within : float
        Width asked for, relative to the upper probability. [-]
    """
    for _ in range(ROUNDS):
        bracket = build(step_kw)
        lower, upper = bracket.above_many(levels_kw)
        asked = upper > SMALLEST
        widest = float(np.max((upper - lower)[asked] / upper[asked])) if asked.any() else 0.0
        points = sum(term.mass.size for term in bracket.up.terms)
        finer = step_kw * min(0.5, 0.8 * within / widest) if widest > within else step_kw
        if widest <= within or points * (step_kw / finer) > MOST_POINTS:
            break
        step_kw = finer
    lower.flags.writeable = upper.flags.writeable = False
    return RefinedSum(bracket=bracket, lower=lower, upper=upper, widest=widest, tight=widest <= within)


def affordable_step(readings: Sequence[NDArray[np.float64]], spread_kw: float, resolution_kw: float) -> float:
    """Step of the lattice on which a group's demands are summed. [kW]

    A whole fraction of the meters' resolution, so that their readings need no rounding, or where they share none a
    step so fine that rounding every customer outward hardly moves the sum; either as far as the number of points
    stays affordable.
    """
    reach = sum(float(np.ptp(row)) for row in readings)
    coarsest = max(reach / GROUP_POINTS, 1e-5)
    if resolution_kw > 0.0:
        fine = max(0.0015 * spread_kw, coarsest)
        return resolution_kw / max(int(np.ceil(resolution_kw / fine)), 1) if fine < resolution_kw else resolution_kw
    return max(0.003 * spread_kw / len(readings), coarsest)
