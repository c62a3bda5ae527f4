"""Channels of NEM12 meters -> netted demand of each meter, every value accounted for."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError
from loadsum.intake.findings import Finding
from loadsum.intake.readers.nem12 import CHANNELS, LENGTHS, Channel, parse_nem12
from loadsum.intake.timed import Timed, joined, left_out, picked

MARKET_OFFSET_S = 10 * 3600  # market time is ten hours ahead of UTC all year (provenance: memory)


def read_nem12(content: bytes, name: str, findings: list[Finding], choices: list[str]) -> tuple[Timed, int]:
    """Readings of one NEM12 file, netted, and how many there are in it.

    A reading is a meter's interval with all its channels; a value that a channel repeats is one more reading, left out.
    Intervals stand at market time; the first of a day begins at midnight.

    Raises
    ------
    InputError
        Records are at fault; all at once.
    """
    found = parse_nem12(content, name)
    for what in found.missing:
        findings.append(
            Finding(
                rule="record missing",
                severity="caution",
                place=name,
                count=1,
                message=f"the file has no {what}",
                effect="what it holds is used; it may have been cut",
            )
        )
    if found.others:
        findings.append(
            Finding(
                rule="channel not used",
                severity="note",
                place=name,
                count=len(found.others),
                message=f"channels that are no energy: {', '.join(sorted(set(found.others))[:8])}",
                effect="left aside; none on demand",
            )
        )
    choices.append("units and stamps as in the file, on market time (+10:00) all year")
    choices.append("channels E less B are demand, Q less K reactive demand; only values flagged A count as observed")
    meters = sorted({channel.meter for channel in found.channels})
    parts: list[Timed] = []
    rows = 0
    for code, meter in enumerate(meters):
        for minutes in LENGTHS:
            days = [
                _once(channel, name, findings)
                for channel in found.channels
                if channel.meter == meter and channel.minutes == minutes and channel.day
            ]
            rows += sum(channel.repeated for channel in days)
            if any(not channel.reactive for channel in days):
                part = _meter(days, code, tuple(meters), name)
                rows += part.kw.size
                parts.append(_left_out(part, days, findings))
            elif days:
                findings.append(
                    Finding(
                        rule="channel not used",
                        severity="note",
                        customer=meter,
                        place=f"{name}:{days[0].line[0]}",
                        count=sum(channel.value.size for channel in days),
                        message="the meter has reactive channels only",
                        effect="no demand comes of them",
                    )
                )
    if not parts:
        raise InputError(name, [Fault(name, "holds no channel of active energy")])
    return joined(parts), rows


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ChannelDays:
    """One channel with each day once.

    Parameters
    ----------
    reactive : bool
        Whether it measures reactive energy.
    sign : float
        1 towards the customer, -1 from it. [-]
    day : (D,) int64
        Market day, increasing. [d]
    value : (D, n) float64
        Average power; NaN where empty, flagged N, or in conflict. [kW or kvar]
    observed : (D, n) bool
        Flagged A.
    conflict : (D,) bool
        Days given twice with different values.
    line : (D,) int64
        Line of the day's record.
    repeated : int
        Values of days that stand in the file again. [-]
    """

    reactive: bool
    sign: float
    day: NDArray[np.int64]
    value: NDArray[np.float64]
    observed: NDArray[np.bool_]
    conflict: NDArray[np.bool_]
    line: NDArray[np.int64]
    repeated: int


def _once(channel: Channel, name: str, findings: list[Finding]) -> ChannelDays:
    value = np.array(channel.values) / (channel.per_kilo * channel.minutes / 60.0)
    observed, absent = np.ones(value.shape, bool), np.zeros(value.shape, bool)
    for row, flag in enumerate(channel.quality):
        if isinstance(flag, list):
            observed[row] = [mark[0] == "A" for mark in flag]
            absent[row] = [mark[0] == "N" for mark in flag]
        elif flag[0] != "A":
            observed[row], absent[row] = False, flag[0] == "N"
    value[absent] = np.nan
    day, line = np.array(channel.day), np.array(channel.line)
    order = np.argsort(day, kind="stable")
    again = np.zeros(day.size, bool)
    again[1:] = day[order][1:] == day[order][:-1]
    first = np.flatnonzero(~again)[np.cumsum(~again) - 1]
    same = value[order] == value[order][first]
    same |= np.isnan(value[order]) & np.isnan(value[order][first])
    conflict = np.zeros(day.size, bool)
    conflict[first[~same.all(axis=1)]] = True
    for chosen, rule, how in (
        (again & same.all(axis=1), "repeated reading", "repeat another day's record of the channel"),
        (again & ~same.all(axis=1), "conflicting readings", "differ from another record of the channel and day"),
    ):
        if chosen.any():
            number = int(chosen.sum()) * channel.count
            findings.append(
                Finding(
                    rule=rule,
                    severity="excluded",
                    customer=channel.meter,
                    place=f"{name}:{line[order][chosen][0]}",
                    count=number,
                    excluded=number,
                    message=f"{number} value(s) {how}",
                    effect="the repeats are left out" if rule == "repeated reading" else "none of the values is used",
                )
            )
    value = value[order]
    value[conflict] = np.nan
    reactive, sign = CHANNELS[channel.suffix[0]]
    return ChannelDays(
        reactive=reactive,
        sign=sign,
        day=day[order][~again],
        value=value[~again],
        observed=observed[order][~again],
        conflict=conflict[~again],
        line=line[order][~again],
        repeated=int(again.sum()) * channel.count,
    )


def _meter(channels: list[ChannelDays], code: int, meters: tuple[str, ...], name: str) -> Timed:
    """Netted intervals of one meter; demand NaN where an active channel has no value."""
    days = np.unique(np.concatenate([channel.day for channel in channels]))
    count = channels[0].value.shape[1]
    sums = {False: np.zeros((days.size, count)), True: np.zeros((days.size, count))}
    observed, line = np.ones((days.size, count), bool), np.zeros(days.size, dtype=np.int64)
    for channel in channels:
        row = np.searchsorted(days, channel.day)
        whole = np.full((days.size, count), np.nan)
        whole[row] = channel.sign * channel.value
        sums[channel.reactive] += whole
        if not channel.reactive:
            observed[row] &= channel.observed
        line[row] = np.where(line[row] == 0, channel.line, line[row])
    length_s = 86400 // count
    start = days[:, None] * 86400 + np.arange(count) * length_s - MARKET_OFFSET_S
    return Timed(
        name=name,
        customers=meters,
        customer=np.full(start.size, code, dtype=np.int32),
        start_s=start.ravel(),
        minutes=np.full(start.size, length_s // 60, dtype=np.int64),
        kw=sums[False].ravel(),
        kvar=sums[True].ravel() if any(channel.reactive for channel in channels) else None,
        estimated=~observed.ravel(),
        line=np.repeat(line, count),
    )


def _left_out(part: Timed, channels: list[ChannelDays], findings: list[Finding]) -> Timed:
    absent = np.isnan(part.kw)
    if not absent.any():
        return part
    days = np.unique(np.concatenate([channel.day for channel in channels]))
    clash, lacking = np.zeros(days.size, bool), np.zeros(days.size, bool)
    for channel in channels:
        if not channel.reactive:
            clash |= np.isin(days, channel.day[channel.conflict])
            lacking |= ~np.isin(days, channel.day)
    count = channels[0].value.shape[1]
    clash, lacking = np.repeat(clash, count), np.repeat(lacking, count)
    for chosen, rule, what in (
        (absent & clash, "conflicting readings", "stand in a day whose records differ"),
        (absent & lacking & ~clash, "channel missing", "lack one of the meter's channels on that day"),
        (absent & ~lacking & ~clash, "empty reading", "hold no value or are flagged N"),
    ):
        findings.extend(left_out(part, chosen, rule, f"reading(s) {what}", "they count as missing"))
    return picked(part, ~absent)
