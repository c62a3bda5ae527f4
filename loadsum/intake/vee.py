"""Validation of aligned readings: each rule says what it doubts; only rules that say so leave readings out.

Limits are common practice without a source, and can be set in the study file.
"""

import datetime as dt
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.findings import Finding

EPOCH = dt.datetime(1970, 1, 1)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Held:
    """What the rules are held against.

    Parameters
    ----------
    customers : tuple of str
        Identifiers.
    kw : (C, T) float64
        Average demand; NaN where missing. [kW]
    estimated : (C, T) bool
        Flagged as estimated.
    start_utc : (T,) int64
        Interval starts. [s]
    interval_min : int
        Demand interval. [min]
    may_export : frozenset of str
        Customers that may export.
    service_kw : dict of str to float
        Service ratings that are known. [kW]
    """

    customers: tuple[str, ...]
    kw: NDArray[np.float64]
    estimated: NDArray[np.bool_]
    start_utc: NDArray[np.int64]
    interval_min: int
    may_export: frozenset[str]
    service_kw: dict[str, float]

    def when(self, slot: int) -> str:
        """Start of an interval, UTC."""
        return (EPOCH + dt.timedelta(seconds=int(self.start_utc[slot]))).strftime("%Y-%m-%d %H:%M UTC")


def runs(flags: NDArray[np.bool_]) -> list[tuple[int, int]]:
    """Start and length of each run of True."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], flags, [False]]).astype(np.int8)))
    return [(int(a), int(b - a)) for a, b in zip(edges[::2], edges[1::2], strict=True)]


def gaps(held: Held) -> Iterator[Finding]:
    """Missing intervals between a customer's first and last reading."""
    for c, name in enumerate(held.customers):
        known = np.flatnonzero(np.isfinite(held.kw[c]))
        if known.size == 0:
            continue
        missing = ~np.isfinite(held.kw[c, known[0] : known[-1] + 1])
        found = runs(missing)
        if found:
            start, longest = max(found, key=lambda run: run[1])
            yield Finding(
                rule="gap",
                severity="note",
                customer=name,
                place=held.when(int(known[0]) + start),
                count=int(missing.sum()),
                message=f"{int(missing.sum())} intervals are missing in {len(found)} gap(s), the longest {longest}",
                effect="the hours concerned rest on fewer days",
            )


def estimated(held: Held) -> Iterator[Finding]:
    """Readings that the meter system flags as estimated."""
    for c, name in enumerate(held.customers):
        slots = np.flatnonzero(held.estimated[c] & np.isfinite(held.kw[c]))
        if slots.size:
            yield Finding(
                rule="flagged estimated",
                severity="excluded",
                customer=name,
                place=held.when(int(slots[0])),
                count=int(slots.size),
                excluded=int(slots.size),
                message=f"{slots.size} intervals are flagged as estimated or substituted",
                effect="they are not counted as observed",
            )


def spikes(held: Held, factor: float = 5.0) -> Iterator[Finding]:
    """Readings far above everything else the customer does: more than ``factor`` times its 99.9 % level."""
    for c, name in enumerate(held.customers):
        row = held.kw[c][np.isfinite(held.kw[c])]
        if row.size < 200:
            continue
        limit = factor * float(np.quantile(row, 0.999))
        slots = np.flatnonzero(np.nan_to_num(held.kw[c], nan=-np.inf) > limit) if limit > 0.0 else np.empty(0, int)
        if slots.size:
            yield Finding(
                rule="spike",
                severity="caution",
                customer=name,
                place=held.when(int(slots[0])),
                count=int(slots.size),
                message=f"{slots.size} reading(s) above {limit:.4g} kW, {factor:g} times what the customer exceeds "
                "0.1 % of the time",
                effect="kept; ask whether the meter or the file is at fault",
            )


def stuck(held: Held, hours: float = 12.0) -> Iterator[Finding]:
    """The same value, not zero, for half a day and more."""
    yield from _equal_runs(held, hours, zero=False)


def zeros(held: Held, hours: float = 24.0) -> Iterator[Finding]:
    """Exactly zero for a day and more: a gap that was filled with zeros, an outage, or nobody there."""
    yield from _equal_runs(held, hours, zero=True)


def _equal_runs(held: Held, hours: float, *, zero: bool) -> Iterator[Finding]:
    least = max(int(np.ceil(hours * 60.0 / held.interval_min)), 6)
    for c, name in enumerate(held.customers):
        row = held.kw[c]
        same = (row[1:] == row[:-1]) & ((row[1:] == 0.0) if zero else (row[1:] != 0.0))
        found = [run for run in runs(same) if run[1] + 1 >= least]
        if not found:
            continue
        count = sum(length + 1 for _, length in found)
        start, longest = max(found, key=lambda run: run[1])
        days = (longest + 1) * held.interval_min / 1440.0
        yield Finding(
            rule="zeros like a gap" if zero else "stuck value",
            severity="caution",
            customer=name,
            place=held.when(start),
            count=count,
            message=f"{count} intervals in {len(found)} run(s) of the same value, the longest {longest + 1} intervals "
            f"({days:.1f} days) at {row[start]:.4g} kW",
            effect="kept; if the meter was out these readings hide demand",
        )


def outages(held: Held) -> Iterator[Finding]:
    """Most customers at zero together."""
    if len(held.customers) < 4:
        return
    known = np.isfinite(held.kw)
    dead = (held.kw == 0.0) & known
    usually = dead.sum(axis=1) < 0.2 * np.maximum(known.sum(axis=1), 1)
    if usually.sum() < 4:
        return
    share = dead[usually].sum(axis=0) / np.maximum(known[usually].sum(axis=0), 1)
    for start, length in runs(share >= 0.8):
        after = np.nansum(held.kw[:, start + length : start + length + 1])
        yield Finding(
            rule="outage",
            severity="caution",
            place=held.when(start),
            count=int(dead[:, start : start + length].sum()),
            message=f"most customers read zero together for {length} interval(s); {after:.4g} kW in the interval after",
            effect="kept; an outage and the pickup after it are not ordinary demand",
        )


def negative(held: Held) -> Iterator[Finding]:
    """Negative demand of a customer that is not said to export."""
    for c, name in enumerate(held.customers):
        slots = np.flatnonzero(np.nan_to_num(held.kw[c]) < 0.0)
        if slots.size and name not in held.may_export:
            yield Finding(
                rule="negative demand",
                severity="caution",
                customer=name,
                place=held.when(int(slots[0])),
                count=int(slots.size),
                message=f"{slots.size} reading(s) are negative, the lowest {np.nanmin(held.kw[c]):.4g} kW, but the "
                "customer is not said to export",
                effect="kept as export; say export = true if it has generation",
            )


def above_service(held: Held) -> Iterator[Finding]:
    """Demand above the rating of the service."""
    for c, name in enumerate(held.customers):
        limit = held.service_kw.get(name, 0.0)
        slots = np.flatnonzero(np.nan_to_num(held.kw[c]) > limit) if limit > 0.0 else np.empty(0, int)
        if slots.size:
            yield Finding(
                rule="above service rating",
                severity="caution",
                customer=name,
                place=held.when(int(slots[0])),
                count=int(slots.size),
                message=f"{slots.size} reading(s) above the service rating of {limit:g} kW, the highest "
                f"{np.nanmax(held.kw[c]):.4g} kW",
                effect="kept; the rating or the unit may be wrong",
            )


def unit_mixup(held: Held) -> Iterator[Finding]:
    """A customer whose mean differs from the others' by about a factor of 1000, or of the intervals in an hour."""
    means = np.array([np.nanmean(row) if np.isfinite(row).any() else np.nan for row in held.kw])
    positive = means[np.isfinite(means) & (means > 0.0)]
    if positive.size < 3:
        return
    middle = float(np.median(positive))
    for c, name in enumerate(held.customers):
        ratio = means[c] / middle if np.isfinite(means[c]) and means[c] > 0.0 else 1.0
        if ratio > 300.0 or ratio < 1.0 / 300.0:
            yield Finding(
                rule="unit in doubt",
                severity="caution",
                customer=name,
                count=int(np.isfinite(held.kw[c]).sum()),
                message=f"mean demand {means[c]:.4g} kW is {ratio:.3g} times the middle of the customers'",
                effect="kept; check whether the file is in Wh instead of kWh, or in kW instead of kWh",
            )


def short_record(held: Held) -> Iterator[Finding]:
    """A customer with readings on much fewer intervals than the longest record."""
    known = np.isfinite(held.kw).sum(axis=1)
    for c, name in enumerate(held.customers):
        if known[c] < 0.5 * known.max():
            yield Finding(
                rule="short record",
                severity="caution",
                customer=name,
                count=int(known[c]),
                message=f"{known[c]} intervals, against {known.max()} of the customer with most",
                effect="what it has not shown is borrowed from its class",
            )


RULES: tuple[Callable[[Held], Iterator[Finding]], ...] = (
    gaps,
    estimated,
    spikes,
    stuck,
    zeros,
    outages,
    negative,
    above_service,
    unit_mixup,
    short_record,
)


def validate(held: Held) -> tuple[Finding, ...]:
    """Findings of every rule, in the order of the rules."""
    return tuple(finding for rule in RULES for finding in rule(held))
