"""Sum of the customers against a meter at the transformer or feeder head."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.findings import Finding
from loadsum.intake.readings import read_only
from loadsum.study.tables import Customer, Study

FEWEST = 100  # intervals in which all is metered; fewer compare nothing
DOUBTFUL_SHARE = 0.10  # of the measured energy; secondary losses are a few per cent (common practice)
BLOCK_SHARE = 0.05  # of the mean measured demand, from which load at some hours only is called unmetered
TWICE = 1.5  # how much better the sum must fit without a customer before the link is suspected
BEHIND = ("existing", "leaving", "transferred out")  # roles of customers that the group's meter has measured


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ReconciledClass:
    """Measured and summed demand of one season and day type by interval of the day.

    Parameters
    ----------
    season, day_type : str
        Class of days.
    intervals : int
        Demand intervals compared. [-]
    measured_kw, summed_kw, unaccounted_kw : (I,) float64
        Means of what the group's meter shows, of the customers' sum, and of the difference; NaN where nothing can be
        compared. [kW]
    """

    season: str
    day_type: str
    intervals: int
    measured_kw: NDArray[np.float64]
    summed_kw: NDArray[np.float64]
    unaccounted_kw: NDArray[np.float64]

    def __post_init__(self) -> None:
        for array in (self.measured_kw, self.summed_kw, self.unaccounted_kw):
            read_only(array)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Reconciliation:
    """Measured demand of a group against the sum of its customers.

    Parameters
    ----------
    transformer : str
        Transformer whose meter it is; empty where the meter is that of the whole group.
    customers : int
        Customers in the sum. [-]
    intervals : int
        Demand intervals in which the group's meter and every customer have an observed reading. [-]
    measured_kwh, summed_kwh : float
        Energy in those intervals. [kWh]
    unaccounted_share : float
        Measured less summed, per unit of measured: losses, unmetered load, customers that are missing or too many. [-]
    every_hour_share : float
        Median over the intervals of the day of the same, so what all hours have in common: losses, or customers. [-]
    unaccounted_kw : (I,) float64
        Measured less summed by interval of the day, mean; NaN where nothing can be compared. [kW]
    by_class : tuple of ReconciledClass
        Seasons and day types apart.
    """

    transformer: str = ""
    customers: int
    intervals: int
    measured_kwh: float
    summed_kwh: float
    unaccounted_share: float
    every_hour_share: float
    unaccounted_kw: NDArray[np.float64]
    by_class: tuple[ReconciledClass, ...] = ()

    def __post_init__(self) -> None:
        read_only(self.unaccounted_kw)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Compared:
    """Readings of customers or of group meters as reconciliation takes them.

    Parameters
    ----------
    names : tuple of str
        Identifiers.
    start_utc : (T,) int64
        Interval starts. [s]
    kw : (C, T) float64
        Observed demand; NaN where there is none or it is estimated. [kW]
    """

    names: tuple[str, ...]
    start_utc: NDArray[np.int64]
    kw: NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Clock:
    """When the intervals of the customers' readings are.

    Parameters
    ----------
    interval_min : int
        Demand interval. [min]
    interval_of_day : (T,) int64
        Position on the local clock. [-]
    day_class : (T,) int64
        Class of days, counting through ``names``. [-]
    names : tuple of (season, day type)
        The classes.
    """

    interval_min: int
    interval_of_day: NDArray[np.int64]
    day_class: NDArray[np.int64]
    names: tuple[tuple[str, str], ...]

    @property
    def per_day(self) -> int:
        """Demand intervals of a day. [-]"""
        return 1440 // self.interval_min

    def text(self, interval: int) -> str:
        """Local time at which an interval of the day begins."""
        return f"{interval * self.interval_min // 60 % 24:02d}:{interval * self.interval_min % 60:02d}"


def groups_of(study: Study, metered: Sequence[str], meters: Sequence[str]) -> dict[str, tuple[list[int], list[int]]]:
    """Rows of the meters and of the customers that belong together, by transformer.

    A meter whose identifier is that of a transformer is compared with the customers of that transformer; the others
    together with all customers, under the empty name.
    """
    known = {customer.id: customer for customer in study.customer}
    if not known:
        known = {name: Customer(id=name) for name in metered}
    units = {unit.id: unit for unit in study.transformer if unit.id}
    behind = [c for c, name in enumerate(metered) if name in known and known[name].role in BEHIND]
    groups: dict[str, tuple[list[int], list[int]]] = {}
    for m, meter in enumerate(meters):
        unit = units.get(meter)
        mine = behind
        if unit is not None and not unit.feeder_head and len(study.transformer) > 1:
            mine = [c for c in behind if known[metered[c]].transformer == meter]
        groups.setdefault(meter if unit is not None else "", ([], mine))[0].append(m)
    return groups


def reconciled(
    metered: Compared, head: Compared, groups: Mapping[str, tuple[list[int], list[int]]], clock: Clock
) -> tuple[tuple[Reconciliation, ...], tuple[Finding, ...]]:
    """Comparison of each group's meter with its customers, and what it gives reason to doubt.

    A wrong link of a customer to the transformer is suspected where the difference follows that customer: where the
    sum fits the measurement at least half again as well with the customer left out, or, for a customer of another
    transformer, with it counted here.
    """
    results, findings = [], []
    for unit, (meters, customers) in groups.items():
        result, doubts = _one_group(unit, metered, head, meters, customers, clock)
        results += [result] if result is not None else []
        findings += doubts
    return tuple(results), tuple(findings)


def _one_group(
    unit: str, metered: Compared, head: Compared, meters: list[int], customers: list[int], clock: Clock
) -> tuple[Reconciliation | None, list[Finding]]:
    shared, here, there = np.intersect1d(metered.start_utc, head.start_utc, return_indices=True)
    measured, each = head.kw[meters].sum(axis=0)[there], metered.kw[customers][:, here]
    whole = np.isfinite(measured) & np.isfinite(each).all(axis=0)
    count = int(whole.sum())
    named = f"the meter of {unit}" if unit else "the group's meter"
    if count < FEWEST or not customers:
        return None, [
            Finding(
                rule="reconciliation",
                severity="note",
                place=unit,
                count=count,
                message=f"{named} and all {len(customers)} customers behind it have readings together in {count} of "
                f"{shared.size} intervals; {FEWEST} are needed",
                effect="the sum of the customers is not compared with the group's meter",
            )
        ]
    measured, each, rows = measured[whole], each[:, whole], here[whole]
    summed = each.sum(axis=0)
    difference = measured - summed
    hours = clock.interval_min / 60.0
    when = clock.interval_of_day[rows]
    by_interval = _means(difference, when, clock.per_day)
    with np.errstate(invalid="ignore", divide="ignore"):
        shares = by_interval / _means(measured, when, clock.per_day)
    shares = shares[np.isfinite(shares)]
    result = Reconciliation(
        transformer=unit,
        customers=len(customers),
        intervals=count,
        measured_kwh=float(measured.sum() * hours),
        summed_kwh=float(summed.sum() * hours),
        unaccounted_share=float(difference.sum() / measured.sum()) if measured.sum() else float("nan"),
        every_hour_share=float(np.median(shares)) if shares.size else float("nan"),
        unaccounted_kw=by_interval,
        by_class=tuple(_classes(measured, summed, rows, clock)),
    )
    findings = [_overall(result, named, clock), *_unmetered(result, named, measured, when, clock)]
    findings += _suspected_links(metered, rows, customers, difference, unit)
    return result, findings


def _means(values: NDArray[np.float64], place: NDArray[np.int64], size: int) -> NDArray[np.float64]:
    """Mean of the values in each place, NaN where there is none."""
    number = np.bincount(place, minlength=size)
    total = np.bincount(place, weights=values, minlength=size)
    return np.asarray(np.divide(total, number, out=np.full(size, np.nan), where=number > 0), dtype=np.float64)


def _classes(
    measured: NDArray[np.float64], summed: NDArray[np.float64], rows: NDArray[np.int64], clock: Clock
) -> list[ReconciledClass]:
    found = []
    for n, (season, day_type) in enumerate(clock.names):
        mine = clock.day_class[rows] == n
        if mine.any():
            when = clock.interval_of_day[rows][mine]
            means = [_means(values[mine], when, clock.per_day) for values in (measured, summed)]
            found.append(
                ReconciledClass(
                    season=season,
                    day_type=day_type,
                    intervals=int(mine.sum()),
                    measured_kw=means[0],
                    summed_kw=means[1],
                    unaccounted_kw=means[0] - means[1],
                )
            )
    return found


def _overall(result: Reconciliation, named: str, clock: Clock) -> Finding:
    share = result.unaccounted_share
    worst = int(np.nanargmax(np.abs(result.unaccounted_kw)))
    doubtful = not abs(share) <= DOUBTFUL_SHARE or share < 0.0
    return Finding(
        rule="reconciliation",
        severity="caution" if doubtful else "note",
        place=result.transformer,
        count=result.intervals,
        message=f"{named} shows {result.measured_kwh:.6g} kWh, its {result.customers} customers together "
        f"{result.summed_kwh:.6g} kWh: {100.0 * share:.2f} % unaccounted for, most in the interval that begins "
        f"{clock.text(worst)} ({result.unaccounted_kw[worst]:.3g} kW on average)",
        effect="losses, unmetered load, or customers missing or too many; nothing is corrected",
    )


def _unmetered(
    result: Reconciliation, named: str, measured: NDArray[np.float64], when: NDArray[np.int64], clock: Clock
) -> list[Finding]:
    """Load at some hours of the day beyond the share that all hours have in common."""
    expected = result.every_hour_share * _means(measured, when, clock.per_day)
    with np.errstate(invalid="ignore"):
        beyond = result.unaccounted_kw - expected
        at = np.flatnonzero(beyond > BLOCK_SHARE * float(measured.mean()))
    if at.size == 0:
        return []
    breaks = np.flatnonzero(np.diff(at) > 1) + 1
    spans = [f"{clock.text(int(run[0]))} to {clock.text(int(run[-1]) + 1)}" for run in np.split(at, breaks)]
    return [
        Finding(
            rule="unmetered load",
            severity="caution",
            place=result.transformer,
            count=int(np.isin(when, at).sum()),
            message=f"{named} shows {float(beyond[at].mean()):.3g} kW more than the customers from "
            f"{', '.join(spans)}, beyond the {100.0 * result.every_hour_share:.2f} % that all hours have in common",
            effect="kept; such as street lighting: state it as unmetered_kw with its hours, or find the customer",
        )
    ]


def _suspected_links(
    metered: Compared, rows: NDArray[np.int64], customers: list[int], difference: NDArray[np.float64], unit: str
) -> list[Finding]:
    spread = float(difference.std())
    found: list[Finding] = []
    inside = set(customers)
    others = range(len(metered.names)) if unit else customers
    for c in others:
        own = metered.kw[c, rows]
        if not np.isfinite(own).all():
            continue
        row = own - own.mean()
        energy = float(row @ row)
        if energy == 0.0:
            continue
        # Least squares of the difference on this customer: -1 where it is counted but not behind the meter, and +1
        # where it is behind the meter but not counted.
        slope = float(row @ (difference - difference.mean())) / energy
        sign = -1.0 if c in inside else 1.0
        corrected = float((difference - sign * own).std())
        if sign * slope > 0.5 and corrected * TWICE < spread:
            how, which = ("without", "not") if c in inside else ("with", "")
            found.append(
                Finding(
                    rule="suspected wrong link",
                    severity="caution",
                    customer=metered.names[c],
                    place=unit,
                    count=int(rows.size),
                    message=f"{how} this customer the sum follows the group's meter "
                    f"{spread / max(corrected, 1e-12):.3g} times as closely (slope {slope:.2f} where {sign:+g} means "
                    f"that it is {which} behind the meter)".replace("  ", " "),
                    effect="kept; check which transformer serves it",
                )
            )
    return found


def observed(
    names: tuple[str, ...], start_utc: NDArray[np.int64], kw: NDArray[np.float64], estimated: NDArray[np.bool_]
) -> Compared:
    """Readings without the estimated ones, which are never counted as observed."""
    return Compared(names=names, start_utc=start_utc, kw=np.where(estimated, np.nan, kw))
