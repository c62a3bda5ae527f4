"""Diversity of a group: its figures, its maximum against the number of customers, and how far handbook laws are off."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.hourclass import DayBlock
from loadsum.intake.readings import read_only
from loadsum.peak.handbook import (
    coincidence_factor,
    contribution_factors,
    load_diversity_kw,
    loss_factor,
    loss_factor_from,
    rusck_coincidence,
    table_factor,
    velander_kw,
)
from loadsum.study.loadtocome import DiversityTable, Rusck, Velander

DRAWS = 300
HOURS_A_YEAR = 8766.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Growth:
    """Maximum demand of groups drawn from the metered customers of a class, by number of customers.

    Parameters
    ----------
    customers : (G,) int64
        Number of customers. [-]
    expected_kw, q90_kw : (G,) float64
        Mean, and level of 90 % of the groups, of the maximum demand over the period. [kW]
    sum_of_maxima_kw : (G,) float64
        Mean sum of the customers' own maxima. [kW]
    """

    customers: NDArray[np.int64]
    expected_kw: NDArray[np.float64]
    q90_kw: NDArray[np.float64]
    sum_of_maxima_kw: NDArray[np.float64]

    def __post_init__(self) -> None:
        for array in (self.customers, self.expected_kw, self.q90_kw, self.sum_of_maxima_kw):
            read_only(array)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Law:
    """One customary law over the same numbers of customers, and how far it is off.

    Parameters
    ----------
    name, source : str
        What it is called and where its figures come from.
    kw : (G,) float64
        Maximum demand by the law; NaN where it says nothing. [kW]
    over_expected, over_q90 : (G,) float64
        The law over what the readings give; 1 is right, below 1 too small. [-]
    """

    name: str
    source: str
    kw: NDArray[np.float64]
    over_expected: NDArray[np.float64]
    over_q90: NDArray[np.float64]

    def __post_init__(self) -> None:
        for array in (self.kw, self.over_expected, self.over_q90):
            read_only(array)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Diversity:
    """Diversity of the metered customers of a group over the intervals in which all of them have readings.

    Parameters
    ----------
    interval_min : int
        Demand interval of every maximum. [min]
    period_h : float
        Hours in which every customer has a reading; all figures are of this period. [h]
    customers : int
        Customers. [-]
    maximum_kw, sum_of_maxima_kw, load_diversity_kw : float
        Maximum coincident demand, sum of the customers' own maxima, and their difference. [kW]
    coincidence_factor, diversity_factor : float or None
        F_c, and F_D = 1/F_c; None where nobody draws anything. [-]
    admd_kw : float
        Maximum coincident demand over the number of customers: the after-diversity maximum demand at this number. [kW]
    load_factor, loss_factor, loss_factor_by_formula : float or None
        F_LD; F_LS from the readings; and 0.3 F_LD + 0.7 F_LD². [-]
    utilisation_factor : float or None
        Maximum apparent power over the rating in service; None without one. [-]
    at_maximum_kw, contribution : (C,) float64
        Demand of each customer at the group's maximum, and over its own maximum. [kW, -]
    growth : Growth
        Maximum demand by number of customers.
    laws : tuple of Law
        The user's laws and tables over the same numbers.
    """

    interval_min: int
    period_h: float
    customers: int
    maximum_kw: float
    sum_of_maxima_kw: float
    load_diversity_kw: float
    coincidence_factor: float | None
    diversity_factor: float | None
    admd_kw: float
    load_factor: float | None
    loss_factor: float | None
    loss_factor_by_formula: float | None
    utilisation_factor: float | None
    at_maximum_kw: NDArray[np.float64]
    contribution: NDArray[np.float64]
    growth: Growth
    laws: tuple[Law, ...]

    def __post_init__(self) -> None:
        read_only(self.at_maximum_kw)
        read_only(self.contribution)


def diversity(
    blocks: Sequence[DayBlock],
    *,
    interval_min: int,
    power_factor: float,
    rng: np.random.Generator,
    rating_kva: float = 0.0,
    rusck: Rusck | None = None,
    velander: Velander | None = None,
    tables: Sequence[DiversityTable] = (),
    draws: int = DRAWS,
) -> Diversity | None:
    """Diversity of a group; None where no interval has readings of every customer.

    Parameters
    ----------
    blocks : sequence of DayBlock
        Readings of the customers of the group, or of one class of it.
    interval_min : int
        Demand interval. [min]
    power_factor : float
        Power factor of the group. [-]
    rng : numpy.random.Generator
        Source of randomness of the groups drawn.
    rating_kva : float
        Rating in service; 0 where there is none. [kVA]
    rusck, velander, tables
        What the user draws beside; nothing is drawn without the user's own figures.
    draws : int
        Groups drawn for each number of customers. [-]

    Notes
    -----
    Groups are drawn without replacement from the customers metered, on the same days, so that what moves customers
    together stays in; numbers beyond those metered are therefore not shown. The period and the demand interval are
    those of the readings for every curve. The laws take the mean of the customers' own maxima as the maximum of one.
    """
    kw = np.concatenate([block.kw.reshape(block.kw.shape[0], -1) for block in blocks], axis=1)
    kw = kw[:, np.isfinite(kw).all(axis=0)]
    if kw.size == 0:
        return None
    own = kw.max(axis=1)
    total = kw.sum(axis=0)
    top = int(np.argmax(total))
    maximum, spread = float(total[top]), bool(own.sum() > 0.0 and total[top] > 0.0)
    factor = float(total.mean()) / maximum if spread else None
    growth = maximum_by_number(kw, rng, draws)
    period_h = kw.shape[1] * interval_min / 60.0
    annual_kwh = float(kw.mean()) * HOURS_A_YEAR
    return Diversity(
        interval_min=interval_min,
        period_h=period_h,
        customers=kw.shape[0],
        maximum_kw=maximum,
        sum_of_maxima_kw=float(own.sum()),
        load_diversity_kw=load_diversity_kw(maximum, own.tolist()),
        coincidence_factor=coincidence_factor(maximum, own.tolist()) if spread else None,
        diversity_factor=1.0 / coincidence_factor(maximum, own.tolist()) if spread else None,
        admd_kw=maximum / kw.shape[0],
        load_factor=factor,
        loss_factor=loss_factor(total) if spread else None,
        loss_factor_by_formula=None if factor is None else loss_factor_from(factor),
        utilisation_factor=float(np.abs(total).max()) / power_factor / rating_kva if rating_kva > 0.0 else None,
        at_maximum_kw=kw[:, top].copy(),
        contribution=contribution_factors(kw[:, top], own),
        growth=growth,
        laws=_laws(growth, annual_kwh, rusck, velander, tables),
    )


def maximum_by_number(kw: NDArray[np.float64], rng: np.random.Generator, draws: int = DRAWS) -> Growth:
    """Maximum demand of groups drawn without replacement, by number of customers.

    Parameters
    ----------
    kw : (C, T) float64
        Readings in which none is missing. [kW]
    rng : numpy.random.Generator
        Source of randomness.
    draws : int
        Groups drawn for each number; every customer once where the number is 1, and one group where it is C. [-]
    """
    count = kw.shape[0]
    numbers = np.unique(np.rint(np.geomspace(1, count, min(count, 12))).astype(np.int64))
    own = kw.max(axis=1)
    expected, high, maxima = [], [], []
    for number in numbers.tolist():
        if number == 1:
            groups = [np.array([c]) for c in range(count)]
        elif number == count:
            groups = [np.arange(count)]
        else:
            groups = [rng.choice(count, number, replace=False) for _ in range(draws)]
        found = np.array([kw[group].sum(axis=0).max() for group in groups])
        expected.append(float(found.mean()))
        high.append(float(np.quantile(found, 0.9)))
        maxima.append(number * float(own.mean()))
    return Growth(
        customers=numbers,
        expected_kw=np.array(expected),
        q90_kw=np.array(high),
        sum_of_maxima_kw=np.array(maxima),
    )


def _laws(
    growth: Growth,
    annual_kwh: float,
    rusck: Rusck | None,
    velander: Velander | None,
    tables: Sequence[DiversityTable],
) -> tuple[Law, ...]:
    made = []

    def law(name: str, source: str, kw: NDArray[np.float64]) -> Law:
        return Law(
            name=name,
            source=source or "not traced to a source",
            kw=kw,
            over_expected=kw / growth.expected_kw,
            over_q90=kw / growth.q90_kw,
        )

    number = growth.customers.astype(np.float64)
    if rusck is not None and rusck.coincidence_of_many > 0.0:
        factor = rusck_coincidence(number, rusck.coincidence_of_many)
        made.append(law("square-root law (Rusck)", rusck.source, growth.sum_of_maxima_kw * factor))
    if velander is not None and (velander.k1_kw_per_kwh > 0.0 or velander.k2_kw_per_sqrt_kwh > 0.0):
        kw = velander_kw(number * annual_kwh, velander.k1_kw_per_kwh, velander.k2_kw_per_sqrt_kwh)
        made.append(law("two-term law (Velander)", velander.source, kw))
    for table in tables:
        row = np.array([table_factor(n, table.customers, table.factor) for n in growth.customers.tolist()])
        factor = row if table.kind == "coincidence factor" else 1.0 / row
        made.append(law(table.name, table.source, growth.sum_of_maxima_kw * factor))
    return tuple(made)
