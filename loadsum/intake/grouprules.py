"""Rules that hold customers against one another, and the full list of rules."""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.customerrules import CUSTOMER_RULES
from loadsum.intake.findings import Finding
from loadsum.intake.vee import NO_SLOTS, Doubt, Held, Rule, left_out_by_rule, runs

FEWEST_CUSTOMERS = 4
USUALLY_ALIVE = 0.2  # a customer at zero more often than this tells nothing of an outage
DRIFT_H = 2.0  # greatest shift looked for [h]
DRIFT_DAYS = 56  # shortest record in which a drift is looked for [d]
DRIFT_CORRELATION = 0.5  # with the group, below which the shift is not to be told
DRIFT_GAIN = 0.1  # by which the shifted correlation must beat the unshifted


def outages(held: Held) -> Iterator[Doubt]:
    """Most customers at zero together, with what the same customers do in the interval after."""
    if len(held.customers) < FEWEST_CUSTOMERS:
        return
    known = np.isfinite(held.kw)
    dead = held.kw == 0.0
    alive = dead.sum(axis=1) < USUALLY_ALIVE * np.maximum(known.sum(axis=1), 1)
    if alive.sum() < FEWEST_CUSTOMERS:
        return
    number = known[alive].sum(axis=0)
    share = dead[alive].sum(axis=0) / np.maximum(number, 1)
    total = np.nansum(held.kw[alive], axis=0)
    for start, length in runs((share >= held.limits.outage_share) & (number >= FEWEST_CUSTOMERS)):
        slots = np.arange(start, start + length)
        after = start + length
        said = ""
        if after < total.size:
            usual = float(np.median(total[held.interval_of_day == held.interval_of_day[after]]))
            ratio = f", {total[after] / usual:.2g} times what is usual then" if usual > 0.0 else ""
            said = f"; {total[after]:.4g} kW in the interval after{ratio}"
        yield Doubt(
            finding=Finding(
                rule="outage",
                severity="caution",
                place=held.when(start),
                count=int(dead[:, slots].sum()),
                message=f"most customers read zero together for {length} interval(s){said}",
                effect="kept; an outage and the pickup after it are not ordinary demand",
            ),
            slots=slots,
        )


def unit_mixup(held: Held) -> Iterator[Doubt]:
    """A customer whose mean differs from the others' by a factor that a wrong unit would explain."""
    finite = np.isfinite(held.kw)
    number = finite.sum(axis=1)
    means = np.where(finite, held.kw, 0.0).sum(axis=1) / np.maximum(number, 1)
    positive = means[(number > 0) & (means > 0.0)]
    if positive.size < 3:
        return
    middle = float(np.median(positive))
    for c in np.flatnonzero((means > 0.0) & (number > 0)).tolist():
        ratio = means[c] / middle
        if ratio > held.limits.unit_ratio or ratio < 1.0 / held.limits.unit_ratio:
            yield Doubt(
                finding=Finding(
                    rule="unit in doubt",
                    severity="caution",
                    customer=held.customers[c],
                    count=int(number[c]),
                    message=f"mean demand {means[c]:.4g} kW is {ratio:.3g} times the middle of the customers'",
                    effect="kept; check whether the file is in Wh instead of kWh, or in kW instead of kWh",
                ),
                customer=c,
                slots=NO_SLOTS,
            )


def drift(held: Held) -> Iterator[Doubt]:
    """A clock that moves against the group's: the shift of best correlation differs between parts of the record."""
    finite = np.isfinite(held.kw)
    number = finite.sum(axis=1)
    per_day = 1440 // held.interval_min
    if len(held.customers) < FEWEST_CUSTOMERS or held.start_utc.size < DRIFT_DAYS * per_day:
        return
    filled = np.where(finite, held.kw, 0.0)
    total = filled.sum(axis=0)
    reach = int(DRIFT_H * 60.0 / held.interval_min)
    for c in np.flatnonzero(number >= DRIFT_DAYS * per_day).tolist():
        rest = total - filled[c]
        thirds = np.array_split(np.flatnonzero(finite[c]), 3)
        shifts = [_best_shift(filled[c], rest, rows, reach) for rows in thirds]
        told = [shift for shift in shifts if shift is not None]
        if len(told) == len(shifts) and told[0] != told[-1] and told == sorted(told, reverse=told[0] > told[-1]):
            minutes = [shift * held.interval_min for shift in told]
            yield Doubt(
                finding=Finding(
                    rule="clock drift",
                    severity="caution",
                    customer=held.customers[c],
                    place=held.when(int(thirds[0][0])),
                    count=int(number[c]),
                    message=f"follows the group best when moved by {minutes[0]:+d} min early in its record and by "
                    f"{minutes[-1]:+d} min late in it",
                    effect="kept as stamped; a wrong clock makes customers look less coincident than they are",
                ),
                customer=c,
                slots=NO_SLOTS,
            )


def _best_shift(own: NDArray[np.float64], rest: NDArray[np.float64], rows: NDArray[np.int64], reach: int) -> int | None:
    """Shift of best correlation with the rest of the group, None where it cannot be told. [intervals]"""
    rows = rows[(rows >= reach) & (rows < own.size - reach)]
    if rows.size < 2 * reach + 2 or own[rows].std() == 0.0:
        return None
    shifts = range(-reach, reach + 1)
    score = np.array(
        [
            np.corrcoef(own[rows], rest[rows + shift])[0, 1] if rest[rows + shift].std() > 0.0 else 0.0
            for shift in shifts
        ]
    )
    best = int(score.argmax())
    if score[best] < DRIFT_CORRELATION or best in (0, score.size - 1):
        return None
    return best - reach if score[best] > score[reach] + DRIFT_GAIN else 0


RULES: tuple[Rule, ...] = (*CUSTOMER_RULES, outages, unit_mixup, drift)


def judged(held: Held, readings_behind: NDArray[np.integer]) -> tuple[NDArray[np.float64], tuple[Finding, ...]]:
    """Demand without what the user's rules leave out, and the findings of every rule in order."""
    return left_out_by_rule(held, readings_behind, RULES)
