"""Customers without readings of their own: so many of a class, or one scaled to its billed energy."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.hourclass import DayBlock


@dataclass(frozen=True, slots=True, kw_only=True)
class Planned:
    """Like customers of a class.

    Parameters
    ----------
    customer_class : str
        Class whose metered members stand for them.
    count : int
        How many. [-]
    annual_kwh : float
        Energy of each per year, to which the members are scaled; 0 takes each member as it is. [kWh]
    """

    customer_class: str
    count: int
    annual_kwh: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PlannedTerm:
    """A planned entry as the demand model uses it.

    Parameters
    ----------
    count : int
        How many customers. [-]
    members : (M,) int64
        Metered customers that stand for them: rows of the readings. [-]
    scale : (M,) float64
        Factor on each member's readings. [-]
    """

    count: int
    members: NDArray[np.int64]
    scale: NDArray[np.float64]


def annual_energy(blocks: Sequence[DayBlock], interval_min: int) -> NDArray[np.float64]:
    """Energy of each metered customer per average year, over the classes of days with readings, (C,) float64. [kWh]"""
    total = np.zeros(blocks[0].kw.shape[0])
    for block in blocks:
        known = np.isfinite(block.kw)
        count = known.sum(axis=1)
        mean = np.divide(np.where(known, block.kw, 0.0).sum(axis=1), count, out=np.zeros(count.shape), where=count > 0)
        total += block.days_per_year * mean.sum(axis=1) * interval_min / 60.0
    return total


def planned_terms(
    planned: Sequence[Planned], classes: Sequence[str], annual_kwh: NDArray[np.float64]
) -> tuple[PlannedTerm, ...]:
    """Planned entries with the metered customers that stand for them.

    Parameters
    ----------
    planned : sequence of Planned
        Entries.
    classes : sequence of str
        Class of each metered customer.
    annual_kwh : (C,) float64
        Energy of each metered customer per year. [kWh]

    Raises
    ------
    ValueError
        No metered customer is of the class, or none has energy to scale.
    """
    terms = []
    for entry in planned:
        members = np.array([c for c, name in enumerate(classes) if name == entry.customer_class], dtype=np.int64)
        if entry.annual_kwh > 0.0:
            members = members[annual_kwh[members] > 0.0]
        if members.size == 0:
            raise ValueError(f"no metered customer can stand for class {entry.customer_class!r}")
        scale = np.ones(members.size) if entry.annual_kwh == 0.0 else entry.annual_kwh / annual_kwh[members]
        terms.append(PlannedTerm(count=entry.count, members=members, scale=scale))
    return tuple(terms)


def pooled(term: PlannedTerm, kw: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Readings of one planned customer: those of its members scaled, every member with equal weight.

    Parameters
    ----------
    term : PlannedTerm
        Members and their scale.
    kw : (C, D) float64
        Readings of all metered customers in one demand interval; NaN where missing. [kW]

    Returns
    -------
    values, weights : (n,) float64
        Scaled readings and weights that sum to one; empty where no member has a reading. [kW, -]
    """
    rows = [kw[m][np.isfinite(kw[m])] * scale for m, scale in zip(term.members, term.scale, strict=True)]
    rows = [row for row in rows if row.size]
    if not rows:
        return np.empty(0), np.empty(0)
    return np.concatenate(rows), np.concatenate([np.full(row.size, 1.0 / (row.size * len(rows))) for row in rows])


def within(term: PlannedTerm, kw: NDArray[np.float64]) -> float:
    """Mean over the members of their own standard deviations, scaled: what days do to one planned customer. [kW]"""
    spreads = [
        float(kw[m][np.isfinite(kw[m])].std(ddof=1)) * scale
        for m, scale in zip(term.members, term.scale, strict=True)
        if np.isfinite(kw[m]).sum() >= 2
    ]
    return float(np.mean(spreads)) if spreads else 0.0


def total_variance(
    metered_kw2: Sequence[float],
    planned: Sequence[tuple[PlannedTerm, float]],
    planned_kw2: Sequence[float],
    correlation: float,
) -> float:
    """Variance of a group: every customer's own, and the covariance of what days do to them. [kW²]

    Parameters
    ----------
    metered_kw2 : sequence of float
        Variance of each metered customer. [kW²]
    planned : sequence of (PlannedTerm, float)
        Planned entries with the standard deviation that days make, without what tells members apart. [kW]
    planned_kw2 : sequence of float
        Variance of one planned customer of each entry, members told apart. [kW²]
    correlation : float
        Mean correlation between customers. [-]
    """
    spreads = [variance**0.5 for variance in metered_kw2]
    spreads += [spread for term, spread in planned for _ in range(term.count)]
    own = sum(metered_kw2) + sum(term.count * v for (term, _), v in zip(planned, planned_kw2, strict=True))
    pairs = sum(spreads) ** 2 - sum(spread**2 for spread in spreads)
    return float(own + correlation * pairs)
