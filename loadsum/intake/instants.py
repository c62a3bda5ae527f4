"""Readings of a table -> average power with true instants; what cannot be used goes to the findings."""

import datetime as dt

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError
from loadsum.intake.clock import NAT, AmbiguousDatesError, Stamps, read_stamps
from loadsum.intake.findings import Finding
from loadsum.intake.intervals import intervals_min
from loadsum.intake.readers.raw import RawReadings
from loadsum.intake.registers import differences
from loadsum.intake.timed import Timed, left_out, picked
from loadsum.study.tables import MeterFiles

# Unit -> how many make, and how many are in, a kilowatt (hour): kept apart so that a value is rounded only once.
POWER_KW = {"W": (1.0, 1e3), "kW": (1.0, 1.0), "MW": (1e3, 1.0)}
ENERGY_KWH = {"Wh": (1.0, 1e3), "kWh": (1.0, 1.0), "MWh": (1e3, 1.0)}


def timed_readings(
    raw: RawReadings, source: MeterFiles, place: dt.tzinfo, findings: list[Finding], choices: list[str]
) -> Timed:
    """Readings of one file as average power with their instants.

    Raises
    ------
    InputError
        No stamp can be understood, day and month cannot be told apart, or the interval cannot be told.
    """
    if source.quantity == "register" and raw.exported is not None:
        raise InputError(
            raw.name,
            [Fault("readings.export_column", "an export register cannot be netted; give the energy of each interval")],
        )
    if source.first_stamp:
        start, minutes = counted(raw, source, place, choices)
        usable = np.ones(start.size, bool)
    else:
        start, minutes, usable = _stamped(raw, source, place, findings, choices)
    choices.append(f"{source.quantity} in {source.unit}" + (f" x {source.multiplier:g}" * (source.multiplier != 1.0)))
    usable &= _valued(raw, usable, findings)
    part = Timed(
        name=raw.name,
        customers=raw.customers,
        customer=raw.customer,
        start_s=start,
        minutes=minutes,
        kw=raw.value,
        kvar=raw.kvar,
        estimated=raw.flagged,
        line=raw.line,
    )
    exported = raw.exported if raw.exported is None or usable.all() else raw.exported[usable]
    part = picked(part, usable)
    if source.quantity == "register":
        part = differences(part, source.register_digits, findings)
    return _as_power(part, source, exported)


def _stamped(
    raw: RawReadings, source: MeterFiles, place: dt.tzinfo, findings: list[Finding], choices: list[str]
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.bool_]]:
    stamps = _understood(raw, source, place, 0)
    start, minutes = _instants(raw, source, stamps)
    ends = source.stamp == "end" and source.quantity != "register"
    named = ""
    if ends and stamps.skipped.any():
        # The last interval before a clock change ends in the skipped hour only if stamps count on from its start.
        other = _understood(raw, source, place, int(np.median(minutes)) * 60)
        if not other.skipped.any():
            stamps, ends, named = other, False, ", named by their start plus one interval"
            start, minutes = _instants(raw, source, stamps)
    if ends:
        start = np.where(start == NAT, NAT, start - minutes * 60)
    shown = "their own offset" if stamps.own_offset else f"{source.clock} clock"
    lengths = " and ".join(str(m) for m in np.unique(minutes[:1] if minutes.strides == (0,) else minutes).tolist())
    marks = "instants of a register" if source.quantity == "register" else f"the {source.stamp} of intervals"
    choices.append(f"stamps mark {marks} of {lengths} min, on {shown}{named}")
    if stamps.form != "ISO 8601":
        choices.append(f"form of the stamps: {stamps.form}")
    usable = start != NAT
    if not usable.all():
        anonymous = _without_values(raw)
        for flag, rule, what, effect in (
            (stamps.unread, "unreadable stamp", "have a stamp that cannot be understood", "they are left out"),
            (
                stamps.skipped,
                "stamp in the skipped hour",
                "stand in the hour that local time skips: the file ignores the clock change",
                'they are left out; state clock = "standard" if the file never changes its clock',
            ),
        ):
            chosen = flag[raw.stamp]
            if chosen.any():
                findings.extend(left_out(anonymous, chosen, rule, f"reading(s) {what}", effect))
    return start, minutes, usable


def _understood(raw: RawReadings, source: MeterFiles, place: dt.tzinfo, before_s: int) -> Stamps:
    texts = pd.Series(list(raw.stamps), dtype=str)
    try:
        stamps = read_stamps(
            texts, source.time_format, source.clock, place, day_first=source.day_first, before_s=before_s
        )
    except AmbiguousDatesError as error:
        raise InputError(
            raw.name, [Fault(raw.name, f'{error}; state readings.day_first = "yes" or "no", or readings.time_format')]
        ) from error
    if stamps.unread.all():
        row = int(np.argmax(raw.stamp == 0)) if raw.stamp.size else 0
        example = raw.stamps[0] if raw.stamps else ""
        advice = (
            'state readings.time_format, for example "%d/%m/%Y %H:%M"; of a table without stamps state first_stamp and '
            "interval_min"
        )
        raise InputError(
            raw.name, [Fault(f"{raw.name}:{raw.line[row]}", f"{example[:40]!r} is no stamp of 1970 to 2100; {advice}")]
        )
    return stamps


def _instants(raw: RawReadings, source: MeterFiles, stamps: Stamps) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Instant of each reading's stamp, and the length of its interval."""
    start = stamps.first[raw.stamp]
    twofold = (stamps.second != stamps.first) & (stamps.second != NAT)
    if twofold.any():
        rows = np.flatnonzero(twofold[raw.stamp])
        late = rows[_second_time(raw, rows, start)]
        start[late] = stamps.second[raw.stamp[late]]
    if source.interval_min:
        return start, np.broadcast_to(np.int64(source.interval_min), start.shape)
    minutes = intervals_min(raw.customer, raw.stamp, start, stamps.first)
    if minutes is None:
        raise InputError(
            raw.name, [Fault(raw.name, "the interval of its readings cannot be told; state readings.interval_min")]
        )
    return start, minutes


def _second_time(raw: RawReadings, rows: NDArray[np.int64], start: NDArray[np.int64]) -> NDArray[np.bool_]:
    """Which readings of the repeated hour belong to its second pass.

    Of an even number of readings of one customer and stamp the later half does, in the order of the file, which may
    run backwards; a single one, or an odd number, stays with the first pass and is left to the rule of duplicates.
    """
    key = raw.customer[rows].astype(np.int64) * max(len(raw.stamps), 1) + raw.stamp[rows]
    frame = pd.Series(np.arange(rows.size)).groupby(key)
    rank, count = frame.cumcount().to_numpy(), frame.transform("size").to_numpy()
    known = start[start != NAT]
    own = raw.customer[start != NAT]
    same = own[1:] == own[:-1]
    backwards = bool(same.any()) and float(np.median(np.sign(np.diff(known)[same]))) < 0.0
    late = rank < count // 2 if backwards else rank >= count // 2
    chosen: NDArray[np.bool_] = late & (count % 2 == 0)
    return chosen


def counted(
    raw: RawReadings, source: MeterFiles, place: dt.tzinfo, choices: list[str]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Instants of a table without stamps: stated for the first row, counted on from there."""
    if not source.interval_min:
        raise InputError(raw.name, [Fault("readings.interval_min", "must be stated beside readings.first_stamp")])
    first = read_stamps(pd.Series([source.first_stamp]), "", source.clock, place)
    if first.unread[0] or first.skipped[0]:
        raise InputError(raw.name, [Fault("readings.first_stamp", f"{source.first_stamp!r} is no instant in ISO 8601")])
    minutes = source.interval_min
    begin = int(first.first[0]) - (minutes * 60 if source.stamp == "end" else 0)
    choices.append(
        f"no stamps in the file: the first row stands at {source.first_stamp} ({source.clock} clock, {source.stamp} of "
        f"its interval), the others follow every {minutes} min, as the study file states"
    )
    start = begin + raw.stamp.astype(np.int64) * (minutes * 60)
    return start, np.broadcast_to(np.int64(minutes), start.shape)


def _valued(raw: RawReadings, usable: NDArray[np.bool_], findings: list[Finding]) -> NDArray[np.bool_]:
    """Readings that hold a number and belong to somebody."""
    absent = np.isnan(raw.value)
    nobody = np.array([not name for name in raw.customers], bool)
    if not absent.any() and not nobody.any():
        return np.ones(raw.value.size, bool)
    bad = np.zeros(raw.value.size, bool)
    bad[[row for row, _ in raw.unreadable]] = True
    anonymous = _without_values(raw)
    lost = nobody[raw.customer]
    for chosen, rule, what, effect in (
        (absent & ~bad, "empty reading", "hold no value", "they count as missing"),
        (bad, "unreadable reading", _unreadable(raw), "they count as missing"),
        (lost & ~absent, "no identifier", "belong to no customer", "they are left out"),
    ):
        if (chosen & usable).any():
            findings.extend(left_out(anonymous, chosen & usable, rule, f"reading(s) {what}", effect))
    used: NDArray[np.bool_] = ~(absent | lost)
    return used


def _unreadable(raw: RawReadings) -> str:
    return f"are no number of a believable size, such as {raw.unreadable[0][1]!r}" if raw.unreadable else ""


def _without_values(raw: RawReadings) -> Timed:
    none = np.broadcast_to(np.int64(0), raw.value.shape)
    return Timed(
        name=raw.name,
        customers=raw.customers,
        customer=raw.customer,
        start_s=none,
        minutes=none,
        kw=raw.value,
        kvar=None,
        estimated=raw.flagged,
        line=raw.line,
    )


def _as_power(part: Timed, source: MeterFiles, exported: NDArray[np.float64] | None) -> Timed:
    units = POWER_KW if source.quantity == "power" else ENERGY_KWH
    if source.unit not in units:
        raise InputError(
            "study file",
            [Fault("readings.unit", f"{source.unit} is no unit of {source.quantity}: one of {', '.join(units)}")],
        )
    times, per = units[source.unit]
    times *= source.multiplier
    divisor: float | NDArray[np.float64] = per
    if source.quantity != "power":
        uniform = part.minutes.strides == (0,) and part.minutes.size
        divisor = per * int(part.minutes[0]) / 60.0 if uniform else np.asarray(per * part.minutes / 60.0, np.float64)
    kw = part.kw
    if times != 1.0:
        kw = kw * times
    if isinstance(divisor, np.ndarray) or divisor != 1.0:
        kw = kw / divisor
    if exported is not None:
        kw = kw - np.nan_to_num(exported) * times / divisor
    return Timed(
        name=part.name,
        customers=part.customers,
        customer=part.customer,
        start_s=part.start_s,
        minutes=part.minutes,
        kw=kw,
        kvar=None if part.kvar is None else part.kvar * times / divisor,
        estimated=part.estimated,
        line=part.line,
    )
