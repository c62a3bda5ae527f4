"""Readings of a revision held against those before it: what came, what went, what was replaced, one cause at a time."""

import datetime as dt
from collections.abc import Collection
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.readings import Readings

EPOCH = dt.date(1970, 1, 1)


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadingChange:
    """One cause by which the readings differ.

    Parameters
    ----------
    cause : str
        The cause in words, as reports print it.
    kind : str
        "period added", "period gone", "customer added", "customer gone" or "readings replaced".
    customer : str
        Customer; empty for a period.
    count : int
        Readings concerned. [-]
    """

    cause: str
    kind: str
    customer: str = ""
    count: int


def reading_changes(old: Readings, new: Readings) -> tuple[ReadingChange, ...]:
    """The causes by which the readings of a revision differ from those before it.

    Parameters
    ----------
    old, new : Readings
        Aligned readings over the same demand interval.
    """
    _same_interval(old, new)
    changes = []
    for kind, here, there in (("period added", new, old), ("period gone", old, new)):
        outside = ~np.isin(here.start_utc, there.start_utc)
        count = int(np.isfinite(here.kw[:, outside]).sum())
        if count:
            days = here.local_day[outside]
            first, last = (EPOCH + dt.timedelta(days=int(day)) for day in (days.min(), days.max()))
            words = kind.replace("period", f"readings of {first} to {last}")
            changes.append(ReadingChange(cause=words, kind=kind, count=count))
    for kind, mine, others in (("customer added", new, old), ("customer gone", old, new)):
        for index, name in enumerate(mine.customers):
            if name not in others.customers:
                count = int(np.isfinite(mine.kw[index]).sum())
                words = kind.replace("customer", f"customer {name}")
                changes.append(ReadingChange(cause=words, kind=kind, customer=name, count=count))
    common, old_at, new_at = np.intersect1d(old.start_utc, new.start_utc, assume_unique=True, return_indices=True)
    for name in old.customers:
        if name in new.customers and common.size:
            a = old.kw[old.customers.index(name), old_at]
            b = new.kw[new.customers.index(name), new_at]
            count = int((~((a == b) | (np.isnan(a) & np.isnan(b)))).sum())
            if count:
                words = f"readings of customer {name} replaced"
                changes.append(ReadingChange(cause=words, kind="readings replaced", customer=name, count=count))
    return tuple(changes)


def with_changes(old: Readings, new: Readings, chosen: Collection[ReadingChange]) -> Readings:
    """The readings before a revision with only some of its causes at work.

    Parameters
    ----------
    old, new : Readings
        Aligned readings over the same demand interval.
    chosen : collection of ReadingChange
        Causes at work, out of those of :func:`reading_changes`; none gives the old readings, all the new ones.
    """
    _same_interval(old, new)
    kinds = {(change.kind, change.customer) for change in chosen}
    went = {name for kind, name in kinds if kind == "customer gone"}
    came = {name for kind, name in kinds if kind == "customer added"}
    replaced = {name for kind, name in kinds if kind == "readings replaced"}
    names = tuple(sorted(({*old.customers} - went) | came))
    start = old.start_utc
    if ("period added", "") in kinds:
        start = np.union1d(start, new.start_utc)
    if ("period gone", "") in kinds:
        start = start[np.isin(start, new.start_utc)]
    sources = [(new if name in came else old, new) for name in names]
    kw, estimated, resolution = [], [], []
    kvar: list[NDArray[np.float64]] | None = [] if old.kvar is not None or new.kvar is not None else None
    for name, (before, after) in zip(names, sources, strict=True):
        first, second = (after, before) if name in replaced else (before, after)
        kw.append(_laid(first.kw, first, second.kw, second, name, start, np.nan))
        estimated.append(_laid(first.estimated, first, second.estimated, second, name, start, 0.0) > 0.0)
        if kvar is not None:
            a, b = (np.full(part.kw.shape, np.nan) if part.kvar is None else part.kvar for part in (first, second))
            kvar.append(_laid(a, first, b, second, name, start, np.nan))
        held = first if name in first.customers else second
        resolution.append(held.resolution_kw[held.customers.index(name)])
    day, interval = _calendar(old, new, start)
    return Readings(
        customers=names,
        start_utc=start.copy(),
        interval_min=old.interval_min,
        local_day=day,
        interval_of_day=interval,
        kw=np.array(kw).reshape(len(names), start.size),
        kvar=None if kvar is None else np.array(kvar).reshape(len(names), start.size),
        estimated=np.array(estimated, dtype=bool).reshape(len(names), start.size),
        resolution_kw=np.array(resolution, dtype=np.float64),
        findings=(new if chosen else old).findings,
        rows_in=(new if chosen else old).rows_in,
    )


def _laid(
    values: NDArray[np.generic],
    first: Readings,
    fallback: NDArray[np.generic],
    second: Readings,
    name: str,
    start: NDArray[np.int64],
    empty: float,
) -> NDArray[np.float64]:
    """One customer's row on a grid: from the first readings where they reach, else from the second."""
    row = np.full(start.size, empty)
    for part, source in ((fallback, second), (values, first)):
        if name in source.customers:
            _, here, there = np.intersect1d(start, source.start_utc, assume_unique=True, return_indices=True)
            row[here] = part[source.customers.index(name), there].astype(np.float64)
    return row


def _calendar(
    old: Readings, new: Readings, start: NDArray[np.int64]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:  # fmt: skip
    day, interval = np.zeros(start.size, dtype=np.int64), np.zeros(start.size, dtype=np.int64)
    for source in (new, old):
        _, here, there = np.intersect1d(start, source.start_utc, assume_unique=True, return_indices=True)
        day[here], interval[here] = source.local_day[there], source.interval_of_day[there]
    return day, interval


def _same_interval(old: Readings, new: Readings) -> None:
    if old.interval_min != new.interval_min:
        raise ValueError(f"demand intervals differ: {old.interval_min} and {new.interval_min} min")
