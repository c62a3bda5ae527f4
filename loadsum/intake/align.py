"""Readings of all files -> one matrix of customers by demand intervals, every reading accounted for."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from loadsum.errors import Fault
from loadsum.intake.findings import Finding

MOST_INTERVALS = 4_000_000  # 38 years of 5-minute intervals


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Timed:
    """Readings with their instants, as average power.

    Parameters
    ----------
    customer : (n,) object
        Identifier.
    start_s : (n,) int64
        Start of the interval, seconds since 1970-01-01 UTC. [s]
    minutes : (n,) int64
        Length of the interval. [min]
    kw, kvar : (n,) float64
        Average power; kvar NaN where not metered. [kW, kvar]
    estimated : (n,) bool
        Flagged as estimated.
    place : (n,) object
        ``file:line``.
    """

    customer: NDArray[np.object_]
    start_s: NDArray[np.int64]
    minutes: NDArray[np.int64]
    kw: NDArray[np.float64]
    kvar: NDArray[np.float64]
    estimated: NDArray[np.bool_]
    place: NDArray[np.object_]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Matrix:
    """Readings averaged up to the demand interval.

    Parameters
    ----------
    customers : tuple of str
        C identifiers in order.
    start_utc : (T,) int64
        Interval starts. [s]
    kw, kvar : (C, T) float64
        Average power; NaN where readings are missing. [kW, kvar]
    estimated : (C, T) bool
        Intervals any part of which is flagged as estimated.
    findings : tuple of Finding
        Duplicates, conflicts, intervals that are not whole.
    """

    customers: tuple[str, ...]
    start_utc: NDArray[np.int64]
    kw: NDArray[np.float64]
    kvar: NDArray[np.float64]
    estimated: NDArray[np.bool_]
    findings: tuple[Finding, ...]


def aligned(parts: Sequence[Timed], interval_min: int) -> tuple[Matrix | None, list[Fault]]:
    """One matrix from the readings of all files.

    A reading that repeats another of the same customer and interval is left out; where the two disagree, both are. An
    interval of the study that its readings do not fill is left empty, and its readings are counted as left out.
    """
    start = np.concatenate([part.start_s for part in parts])
    if start.size == 0:
        return None, [Fault("readings", "no reading could be used; see the findings")]
    customer, names = pd.factorize(np.concatenate([part.customer for part in parts]), sort=True)
    kw, kvar = (np.concatenate([getattr(part, key) for part in parts]) for key in ("kw", "kvar"))
    minutes, estimated = (np.concatenate([getattr(part, key) for part in parts]) for key in ("minutes", "estimated"))
    place = np.concatenate([part.place for part in parts])
    too_long = minutes > interval_min
    if too_long.any():
        longest = int(minutes[too_long].max())
        return None, [
            Fault(
                "study.demand_interval_min",
                f"is {interval_min}, but readings in {place[too_long][0].rsplit(':', 1)[0]} cover {longest} min each; "
                "coarser readings are never split: use the longer interval",
            )
        ]
    step = interval_min * 60
    first, last = int(start.min()) // step, int(start.max()) // step
    if last - first >= MOST_INTERVALS:
        return None, [Fault("readings", "stamps span more than a lifetime of meters; check the form of the dates")]
    keep, findings = _single(customer, start, minutes, kw, place, names)
    slot = start // step - first
    shape = (len(names), last - first + 1)
    flat = customer * shape[1] + slot
    filled = np.bincount(flat[keep], weights=minutes[keep], minlength=shape[0] * shape[1])
    energy = np.bincount(flat[keep], weights=(kw * minutes)[keep], minlength=filled.size)
    reactive = np.bincount(flat[keep], weights=(kvar * minutes)[keep], minlength=filled.size)
    guess = np.bincount(flat[keep], weights=estimated[keep], minlength=filled.size) > 0.0
    whole = filled == interval_min
    part = (filled > 0.0) & ~whole
    if part.any():
        lost = keep & part[flat]
        findings.extend(
            _by_customer(
                lost,
                customer,
                names,
                place,
                "interval not filled",
                f"reading(s) fill only part of a demand interval of {interval_min} min",
                "the intervals are left empty",
            )
        )
    value = np.where(whole, energy / interval_min, np.nan).reshape(shape)
    return Matrix(
        customers=tuple(str(name) for name in names),
        start_utc=np.arange(first, last + 1, dtype=np.int64) * step,
        kw=value,
        kvar=np.where(whole, reactive / interval_min, np.nan).reshape(shape),
        estimated=(guess & whole).reshape(shape),
        findings=tuple(findings),
    ), []


def _single(
    customer: NDArray[np.int64],
    start: NDArray[np.int64],
    minutes: NDArray[np.int64],
    kw: NDArray[np.float64],
    place: NDArray[np.object_],
    names: NDArray[np.object_],
) -> tuple[NDArray[np.bool_], list[Finding]]:
    """Which readings stand alone or come first of equal ones; repeats and conflicts as findings."""
    order = np.lexsort((np.arange(start.size), start, customer))
    same = np.zeros(start.size, dtype=bool)
    same[1:] = (customer[order][1:] == customer[order][:-1]) & (start[order][1:] == start[order][:-1])
    group = np.cumsum(~same) - 1
    size = np.bincount(group)
    low = np.full(size.size, np.inf)
    high = np.full(size.size, -np.inf)
    np.minimum.at(low, group, kw[order])
    np.maximum.at(high, group, kw[order])
    differs = (high - low > 1e-9 * np.maximum(np.abs(high), 1.0))[group]
    conflict, repeat = np.zeros(start.size, bool), np.zeros(start.size, bool)
    conflict[order] = differs & (size[group] > 1)
    repeat[order] = same & ~differs
    findings = _by_customer(
        repeat,
        customer,
        names,
        place,
        "repeated reading",
        "reading(s) repeat an earlier one of the same interval with the same value",
        "the repeats are left out",
    )
    findings += _by_customer(
        conflict,
        customer,
        names,
        place,
        "conflicting readings",
        "reading(s) give different values for the same interval",
        "neither value is used",
    )
    return ~(conflict | repeat), findings


def _by_customer(
    chosen: NDArray[np.bool_],
    customer: NDArray[np.int64],
    names: NDArray[np.object_],
    place: NDArray[np.object_],
    rule: str,
    message: str,
    effect: str,
) -> list[Finding]:
    """One finding for each customer that has chosen readings, all of them left out."""
    where = np.flatnonzero(chosen)
    findings = []
    for c in np.unique(customer[where]):
        mine = where[customer[where] == c]
        findings.append(
            Finding(
                rule=rule,
                severity="excluded",
                customer=str(names[c]),
                place=str(place[mine[0]]),
                count=int(mine.size),
                excluded=int(mine.size),
                message=f"{mine.size} {message}",
                effect=effect,
            )
        )
    return findings
