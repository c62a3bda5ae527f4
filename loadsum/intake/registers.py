"""Cumulative registers -> energy of each interval: differences, rollover, replaced meters."""

import numpy as np

from loadsum.intake.findings import Finding
from loadsum.intake.timed import Timed, left_out, picked

NEAR_TOP = 0.9  # a register that falls from above this share of its range has rolled over


def differences(part: Timed, digits: int, findings: list[Finding]) -> Timed:
    """Energy of the interval that begins at each register reading.

    The last reading of each customer closes its last interval and has none of its own; it is counted as left out, like
    every reading whose successor is missing, repeated or lower.

    Parameters
    ----------
    part : Timed
        Register values in place of power.
    digits : int
        Digits before the decimal point; 0 where a fall means a new meter. [-]
    findings : list of Finding
        Receives rollovers, falls and gaps.
    """
    if part.start_s.size == 0:
        return part
    if part.kvar is not None:
        findings.extend(
            left_out(
                part,
                np.isfinite(part.kvar),
                "reactive register",
                "reading(s) of reactive demand beside a register of energy are not differenced",
                "they are not used: apparent power goes by the stated power factor",
                excluded=False,
            )
        )
    order = np.lexsort((part.line, part.start_s, part.customer))
    part = Timed(
        name=part.name,
        customers=part.customers,
        customer=part.customer[order],
        start_s=part.start_s[order],
        minutes=part.minutes[order],
        kw=part.kw[order],
        kvar=None,
        estimated=part.estimated[order],
        line=part.line[order],
    )
    last = np.ones(part.kw.size, bool)
    last[:-1] = part.customer[1:] != part.customer[:-1]
    step = np.zeros(part.kw.size, np.int64)
    step[:-1] = np.diff(part.start_s)
    rise = np.zeros(part.kw.size)
    rise[:-1] = np.diff(part.kw)
    guess = part.estimated.copy()
    guess[:-1] |= part.estimated[1:]
    top = 10.0**digits
    rolled = ~last & (rise < 0.0) & (digits > 0) & (part.kw > NEAR_TOP * top)
    rise = np.where(rolled, rise + top, rise)
    fell = ~last & (rise < 0.0)
    twice = ~last & ~fell & (step == 0)
    gap = ~last & ~fell & ~twice & (step != part.minutes * 60)
    for chosen, rule, message, effect in (
        (
            last,
            "closing register",
            "register reading(s) close the last interval",
            "they begin no interval of their own",
        ),
        (fell, "register fell", "register reading(s) are followed by a lower one: a new meter, or a fault", "left out"),
        (twice, "repeated register", "register reading(s) have a second one at the same instant", "left out"),
        (gap, "register gap", "register reading(s) are followed by a gap", "energy over a gap is not spread over it"),
    ):
        findings.extend(left_out(part, chosen, rule, message, effect))
    findings.extend(
        left_out(
            part,
            rolled,
            "register rolled over",
            f"rollover(s) at {top:g}",
            "the difference is taken across it",
            excluded=False,
        )
    )
    energy = Timed(
        name=part.name,
        customers=part.customers,
        customer=part.customer,
        start_s=part.start_s,
        minutes=part.minutes,
        kw=rise,
        kvar=None,
        estimated=guess,
        line=part.line,
    )
    return picked(energy, ~(last | fell | twice | gap))
