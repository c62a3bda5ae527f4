"""Several channels of one meter -> netted demand, every value accounted for."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from loadsum.intake.findings import Finding
from loadsum.intake.timed import Timed, left_out, picked


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Flow:
    """One channel: power towards (sign 1) or from the customer (-1), active or reactive."""

    sign: float
    reactive: bool
    readings: Timed


def netted(flows: Sequence[Flow], findings: list[Finding]) -> tuple[Timed, int]:
    """Netted readings of one customer, and how many there are, a value that repeats counting as one more.

    An interval that lacks one of the active channels is left out: what it would net to is not known.
    """
    active = [flow for flow in flows if not flow.reactive]
    if len(flows) == 1 and active[0].sign > 0.0:
        only = active[0].readings
        return only, only.kw.size
    rows = 0
    once = []
    for flow in flows:
        kept, repeats = _once(flow.readings, findings)
        rows += repeats
        once.append(Flow(sign=flow.sign, reactive=flow.reactive, readings=kept))
    starts = np.unique(np.concatenate([flow.readings.start_s for flow in once if not flow.reactive]))
    first = active[0].readings
    sums, line = {False: np.zeros(starts.size), True: np.zeros(starts.size)}, np.zeros(starts.size, dtype=np.int64)
    guess, minutes = np.zeros(starts.size, bool), np.zeros(starts.size, dtype=np.int64)
    for flow in once:
        part = flow.readings
        known = np.isin(part.start_s, starts)
        row = np.searchsorted(starts, part.start_s[known])
        whole = np.full(starts.size, np.nan)
        whole[row] = flow.sign * part.kw[known]
        clash = np.zeros(starts.size, bool)
        clash[row] = (minutes[row] != 0) & (minutes[row] != part.minutes[known])
        whole[clash] = np.nan
        sums[flow.reactive] += whole
        if not flow.reactive:
            guess[row] |= part.estimated[known]
            minutes[row] = np.where(minutes[row] == 0, part.minutes[known], minutes[row])
            line[row] = np.where(line[row] == 0, part.line[known], line[row])
    whole_part = Timed(
        name=first.name,
        customers=first.customers,
        customer=np.full(starts.size, first.customer[0], dtype=np.int32),
        start_s=starts,
        minutes=minutes,
        kw=sums[False],
        kvar=sums[True] if any(flow.reactive for flow in once) else None,
        estimated=guess,
        line=line,
    )
    lacking = np.isnan(whole_part.kw)
    findings.extend(
        left_out(
            whole_part,
            lacking,
            "channel missing",
            "reading(s) lack one of the meter's channels, or its channels disagree",
            "they count as missing",
        )
    )
    return picked(whole_part, ~lacking), rows + starts.size


def _once(part: Timed, findings: list[Finding]) -> tuple[Timed, int]:
    """Readings of one channel with each start once; a start given twice with different values has none."""
    order = np.argsort(part.start_s, kind="stable")
    again = np.zeros(order.size, bool)
    again[1:] = part.start_s[order][1:] == part.start_s[order][:-1]
    if not again.any():
        return part, 0
    head = np.flatnonzero(~again)[np.cumsum(~again) - 1]
    kw = part.kw[order]
    differs = again & (kw != kw[head])
    repeat, conflict = np.zeros(order.size, bool), np.zeros(order.size, bool)
    repeat[order], conflict[order] = again & ~differs, differs
    for chosen, rule, what, effect in (
        (repeat, "repeated reading", "value(s) repeat another of the same channel and interval", "repeats left out"),
        (conflict, "conflicting readings", "value(s) differ from another of the channel and interval", "none is used"),
    ):
        findings.extend(left_out(part, chosen, rule, what, effect))
    spoilt = part.kw.copy()
    spoilt[order[head[differs]]] = np.nan
    part = Timed(
        name=part.name,
        customers=part.customers,
        customer=part.customer,
        start_s=part.start_s,
        minutes=part.minutes,
        kw=spoilt,
        kvar=None,
        estimated=part.estimated,
        line=part.line,
    )
    return picked(part, ~(repeat | conflict)), int(again.sum())
