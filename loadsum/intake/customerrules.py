"""Rules that look at one customer at a time."""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.findings import Finding, Severity
from loadsum.intake.vee import NO_SLOTS, Doubt, Held, Rule, covered, runs

FEWEST = 200  # readings; below it a level exceeded 0.1 % of the time means nothing
SHORT_SHARE = 0.5  # of the longest record
FEWEST_DAYS = 28  # before and after a move


def _doubt(
    held: Held,
    rule: str,
    c: int,
    slots: NDArray[np.int64],
    message: str,
    effect: str,
    *,
    severity: Severity = "caution",
    count: int = -1,
    at: int = -1,
) -> Doubt:
    first = int(slots[0]) if at < 0 and slots.size else at
    finding = Finding(
        rule=rule,
        severity=severity,
        customer=held.customers[c],
        place=held.when(first) if first >= 0 else "",
        count=int(slots.size) if count < 0 else count,
        message=message,
        effect=effect,
    )
    return Doubt(finding=finding, customer=c, slots=slots)


def gaps(held: Held) -> Iterator[Doubt]:
    """Missing intervals between a customer's first and last reading."""
    for c in range(len(held.customers)):
        finite = np.isfinite(held.kw[c])
        if finite.all() or not finite.any():
            continue
        first, last = int(finite.argmax()), finite.size - int(finite[::-1].argmax())
        missing = ~finite[first:last]
        if not missing.any():
            continue
        found = runs(missing)
        start, longest = max(found, key=lambda run: run[1])
        at = held.interval_of_day[first:last][missing]
        per_interval = np.bincount(at)
        worst = int(per_interval.argmax())
        count = int(missing.sum())
        yield _doubt(
            held,
            "gap",
            c,
            NO_SLOTS,
            f"{count} intervals are missing in {len(found)} gap(s), the longest {longest}; most often the one that "
            f"begins at {held.clock(worst)} ({int(per_interval[worst])} days)",
            "the hours concerned rest on fewer days",
            severity="note",
            count=count,
            at=first + start,
        )


def short_days(held: Held) -> Iterator[Doubt]:
    """Days with some of their intervals missing, and the calendar they are counted by: 23 and 25 hours included."""
    day = held.local_day - held.local_day[0]
    length = np.bincount(day)
    for c in range(len(held.customers)):
        finite = np.isfinite(held.kw[c])
        if finite.all():
            continue
        number = np.bincount(day, weights=finite)
        short = (number > 0) & (number < length)
        short[[0, -1]] = False  # the record may begin and end within a day
        if short.any():
            first = int(np.flatnonzero(day == int(short.argmax()))[0])
            yield _doubt(
                held,
                "short day",
                c,
                NO_SLOTS,
                f"{int(short.sum())} day(s) lack some of their intervals",
                "what is there is used; such a day enters no sum over all customers in the hours it lacks",
                severity="note",
                count=int(short.sum()),
                at=first,
            )


def estimated(held: Held) -> Iterator[Doubt]:
    """Readings that the meter system flags as estimated."""
    for c in np.flatnonzero(held.estimated.any(axis=1)).tolist():
        slots = np.flatnonzero(held.estimated[c] & np.isfinite(held.kw[c]))
        if slots.size:
            yield _doubt(
                held,
                "flagged estimated",
                c,
                slots,
                f"{slots.size} intervals are flagged as estimated or substituted, the highest "
                f"{float(held.kw[c, slots].max()):.4g} kW",
                "they are not counted as observed",
            )


def spikes(held: Held) -> Iterator[Doubt]:
    """Readings far above everything else the customer does."""
    for c in range(len(held.customers)):
        row = held.kw[c]
        known = row[np.isfinite(row)]
        if known.size < FEWEST:
            continue
        # The level itself must not be made of the spikes: the top one in a thousand is left out of it.
        at = known.size - 1 - max(known.size // 1000, 1)
        limit = held.limits.spike_factor * float(np.partition(known, at)[at])
        slots = np.flatnonzero(row > limit) if limit > 0.0 else NO_SLOTS
        if slots.size:
            yield _doubt(
                held,
                "spike",
                c,
                slots,
                f"{slots.size} reading(s) above {limit:.4g} kW, {held.limits.spike_factor:g} times what the customer "
                f"exceeds 0.1 % of the time, the highest {float(np.nanmax(row)):.4g} kW",
                "kept; ask whether the meter or the file is at fault",
            )


def stuck(held: Held) -> Iterator[Doubt]:
    """The same value, not zero, for half a day and more."""
    yield from _equal_runs(held, held.limits.stuck_h, zero=False)


def zeros(held: Held) -> Iterator[Doubt]:
    """Exactly zero for a day and more: a gap that was filled with zeros, an outage, or nobody there."""
    yield from _equal_runs(held, held.limits.zero_h, zero=True)


def _equal_runs(held: Held, hours: float, *, zero: bool) -> Iterator[Doubt]:
    least = max(int(np.ceil(hours * 60.0 / held.interval_min)), 6)
    for c in range(len(held.customers)):
        row = held.kw[c]
        same = (row[1:] == row[:-1]) & ((row[1:] == 0.0) if zero else (row[1:] != 0.0))
        found = [(start, length + 1) for start, length in runs(same) if length + 1 >= least]
        if not found:
            continue
        slots = covered(found)
        start, longest = max(found, key=lambda run: run[1])
        days = longest * held.interval_min / 1440.0
        yield _doubt(
            held,
            "zeros like a gap" if zero else "stuck value",
            c,
            slots,
            f"{slots.size} intervals in {len(found)} run(s) of the same value, the longest {longest} intervals "
            f"({days:.1f} days) at {row[start]:.4g} kW",
            "kept; if the meter was out these readings hide demand",
            at=start,
        )


def negative(held: Held) -> Iterator[Doubt]:
    """Negative demand of a customer that is not said to export."""
    for c, name in enumerate(held.customers):
        slots = np.flatnonzero(held.kw[c] < 0.0)
        if slots.size and name not in held.may_export:
            yield _doubt(
                held,
                "negative demand",
                c,
                slots,
                f"{slots.size} reading(s) are negative, the lowest {float(np.nanmin(held.kw[c])):.4g} kW, but the "
                "customer is not said to export",
                "kept as export; say export = true if it has generation",
            )


def above_service(held: Held) -> Iterator[Doubt]:
    """Demand above the rating of the service."""
    for c, name in enumerate(held.customers):
        limit = held.service_kw.get(name, 0.0)
        slots = np.flatnonzero(held.kw[c] > limit) if limit > 0.0 else NO_SLOTS
        if slots.size:
            yield _doubt(
                held,
                "above service rating",
                c,
                slots,
                f"{slots.size} reading(s) above the service rating of {limit:g} kW, the highest "
                f"{float(np.nanmax(held.kw[c])):.4g} kW",
                "kept; the rating or the unit may be wrong",
            )


def short_record(held: Held) -> Iterator[Doubt]:
    """A customer with readings on much fewer intervals than the longest record."""
    known = np.isfinite(held.kw).sum(axis=1)
    for c in np.flatnonzero(known < SHORT_SHARE * known.max()).tolist():
        yield _doubt(
            held,
            "short record",
            c,
            NO_SLOTS,
            f"{known[c]} intervals, against {known.max()} of the customer with most",
            "what it has not shown is borrowed from its class",
            count=int(known[c]),
        )


def moved(held: Held) -> Iterator[Doubt]:
    """A customer that moved in or out: hardly any demand for four weeks and more at one end of its record."""
    day = held.local_day - held.local_day[0]
    size = int(day[-1]) + 1
    for c in range(len(held.customers)):
        finite = np.isfinite(held.kw[c])
        number = np.bincount(day, weights=finite, minlength=size)
        energy = np.bincount(day, weights=np.where(finite, np.abs(held.kw[c]), 0.0), minlength=size)
        days = np.flatnonzero(number > 0)
        if days.size < 2 * FEWEST_DAYS:
            continue
        mean = energy[days] / number[days]
        usual = float(np.median(np.sort(mean)[mean.size // 2 :]))
        low = mean < held.limits.moved_share * usual
        if usual <= 0.0 or not low.any() or low.all():
            continue
        lead, trail = int((~low).argmax()), int((~low[::-1]).argmax())
        for length, what, at in ((lead, "in after", 0), (trail, "out for", days.size - trail)):
            if length >= FEWEST_DAYS:
                yield _doubt(
                    held,
                    "moved in or out",
                    c,
                    NO_SLOTS,
                    f"seems to have moved {what} {length} days: until there below "
                    f"{100.0 * held.limits.moved_share:g} % of what it uses otherwise ({usual:.3g} kW on average)",
                    "kept; days of an empty home make the customer look smaller than it is",
                    count=length,
                    at=int(np.flatnonzero(day == days[at])[0]),
                )


CUSTOMER_RULES: tuple[Rule, ...] = (
    gaps,
    short_days,
    estimated,
    spikes,
    stuck,
    zeros,
    negative,
    above_service,
    short_record,
    moved,
)
