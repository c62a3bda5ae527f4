"""Validation of aligned readings: each rule says what it doubts; readings are left out only where the user asks.

Limits are common practice without a source unless said otherwise, and can be set in the study file under [findings].
"""

import datetime as dt
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.findings import Finding
from loadsum.study.tables import FindingLimits

EPOCH = dt.datetime(1970, 1, 1)
NO_SLOTS: NDArray[np.int64] = np.empty(0, dtype=np.int64)


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
    local_day, interval_of_day : (T,) int64
        Local calendar day and position on the local clock. [d, -]
    interval_min : int
        Demand interval. [min]
    may_export : frozenset of str
        Customers that may export.
    service_kw : dict of str to float
        Service ratings that are known. [kW]
    limits : FindingLimits
        Limits of the rules.
    """

    customers: tuple[str, ...]
    kw: NDArray[np.float64]
    estimated: NDArray[np.bool_]
    start_utc: NDArray[np.int64]
    local_day: NDArray[np.int64]
    interval_of_day: NDArray[np.int64]
    interval_min: int
    may_export: frozenset[str]
    service_kw: dict[str, float]
    limits: FindingLimits

    def when(self, slot: int) -> str:
        """Start of an interval, UTC."""
        return (EPOCH + dt.timedelta(seconds=int(self.start_utc[slot]))).strftime("%Y-%m-%d %H:%M UTC")

    def clock(self, interval: int) -> str:
        """Local time at which an interval of the day begins."""
        minute = interval * self.interval_min
        return f"{minute // 60:02d}:{minute % 60:02d}"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Doubt:
    """A finding before it is known whether its readings are left out.

    Parameters
    ----------
    finding : Finding
        The finding.
    customer : int
        Row of the customer; -1 where it is about all. [-]
    slots : (n,) int64
        Intervals that a user may leave out by this rule. [-]
    """

    finding: Finding
    customer: int = -1
    slots: NDArray[np.int64]


Rule = Callable[[Held], Iterator[Doubt]]


def runs(flags: NDArray[np.bool_]) -> list[tuple[int, int]]:
    """Start and length of each run of True."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], flags, [False]]).astype(np.int8)))
    return [(int(a), int(b - a)) for a, b in zip(edges[::2], edges[1::2], strict=True)]


def covered(found: list[tuple[int, int]]) -> NDArray[np.int64]:
    """Intervals of some runs."""
    return np.concatenate([np.arange(start, start + length) for start, length in found]) if found else NO_SLOTS


def left_out_by_rule(
    held: Held, readings_behind: NDArray[np.integer], rules: tuple[Rule, ...]
) -> tuple[NDArray[np.float64], tuple[Finding, ...]]:
    """Demand without the readings that the user's rules leave out, and the findings of every rule.

    Each reading is counted as left out under one finding only, the first in the order of the rules.

    Parameters
    ----------
    held : Held
        Aligned readings.
    readings_behind : (C, T) int
        Readings of the files that each interval was made from. [-]
    rules : tuple of Rule
        The rules.
    """
    kw, findings = held.kw, []
    for rule in rules:
        for doubt in rule(held):
            finding = doubt.finding
            if finding.rule in held.limits.exclude and doubt.slots.size:
                if kw is held.kw:
                    kw = kw.copy()
                rows = slice(None) if doubt.customer < 0 else slice(doubt.customer, doubt.customer + 1)
                gone = np.isfinite(kw[rows][:, doubt.slots])
                if doubt.customer < 0:
                    gone &= held.kw[:, doubt.slots] == 0.0
                number = int(readings_behind[rows][:, doubt.slots][gone].sum())
                block = kw[rows][:, doubt.slots]
                block[gone] = np.nan
                kw[rows, doubt.slots] = block
                finding = Finding(
                    rule=finding.rule,
                    severity="excluded",
                    customer=finding.customer,
                    place=finding.place,
                    count=finding.count,
                    excluded=number,
                    message=finding.message,
                    effect="left out, as the study file asks",
                )
            findings.append(finding)
    return kw, tuple(findings)
