"""NEM12 interval data: records 100, 200, 300, 400, 500 and 900 of the Australian meter data file format."""

import datetime as dt
import math
import re
from dataclasses import dataclass, field

from loadsum.errors import Fault, InputError

LENGTHS = (5, 15, 30)
# Unit -> (how many make a kWh or kvarh, whether reactive); written in any case.
UNITS = {
    "wh": (1e3, False),
    "kwh": (1.0, False),
    "mwh": (1e-3, False),
    "varh": (1e3, True),
    "kvarh": (1.0, True),
    "mvarh": (1e-3, True),
}
# First letter of a channel -> (reactive, sign as seen from the network); import to the customer is E, export B.
CHANNELS = {"E": (False, 1.0), "B": (False, -1.0), "Q": (True, 1.0), "K": (True, -1.0)}
FLAG, RANGE_FLAG = re.compile(r"[AEFNSV]\d{0,2}"), re.compile(r"[AEFNS]\d{0,2}")
LARGEST = 1e12
EPOCH_ORDINAL = dt.date(1970, 1, 1).toordinal()
MOST_FAULTS = 50


@dataclass(slots=True, kw_only=True)
class Channel:
    """One register of one meter, with the days that follow its 200 record."""

    meter: str
    suffix: str
    minutes: int
    per_kilo: float
    day: list[int] = field(default_factory=list)
    line: list[int] = field(default_factory=list)
    values: list[list[float]] = field(default_factory=list)
    quality: list[str | list[str]] = field(default_factory=list)

    @property
    def count(self) -> int:
        """Intervals of a day. [-]"""
        return 1440 // self.minutes


@dataclass(slots=True, kw_only=True)
class Nem12:
    """Records of one file.

    Parameters
    ----------
    channels : list of Channel
        Channels of energy.
    others : list of str
        Channels that are no energy.
    missing : list of str
        Records that the file should have and has not.
    """

    channels: list[Channel]
    others: list[str]
    missing: list[str]


def parse_nem12(content: bytes, name: str) -> Nem12:
    """Records of one NEM12 file, or of several one after the other.

    Raises
    ------
    InputError
        The file is no NEM12, holds accumulated (NEM13) data, or records are at fault; all faults at once.
    """
    try:
        text = content.decode("ascii")
    except UnicodeDecodeError as error:
        raise InputError(name, [Fault(name, f"is no NEM12 text: byte {error.start} is not ASCII")]) from error
    channels: dict[tuple[str, str, int, float], Channel] = {}
    faults: list[Fault] = []
    others: list[str] = []
    seen = set()
    current: Channel | None = None
    open_day = False
    for number, record in enumerate(text.splitlines(), start=1):
        kind = record[:3]
        seen.add(kind)
        if kind == "300":
            open_day = current is not None and _day(current, record, number, name, faults)
        elif kind == "400":
            if open_day and current is not None:
                _quality(current, record, number, name, faults)
        elif kind == "200":
            current = _channel(record, number, name, channels, faults, others)
            open_day = False
        elif kind in ("100", "250"):
            version = (*record.split(","), "")[1].strip()
            if kind == "250" or version == "NEM13":
                reason = "holds NEM13 accumulated readings, which say nothing of single intervals; ask for NEM12"
                raise InputError(name, [Fault(f"{name}:{number}", reason)])
            if version != "NEM12":
                raise InputError(name, [Fault(f"{name}:{number}", f"is called {version[:20]!r}, not NEM12")])
        elif kind not in ("500", "550", "900") and record.strip(" ,\t\x1a"):
            faults.append(Fault(f"{name}:{number}", f"is no record of NEM12: {record[:30]!r}"))
        if len(faults) >= MOST_FAULTS:
            break
    if "300" not in seen and not faults:
        faults.append(Fault(name, "holds no interval record (300)"))
    faults.extend(fault for channel in channels.values() for fault in _untiled(channel, name))
    if faults:
        raise InputError(name, faults)
    said = (("100", "header (100)"), ("900", "end record (900)"))
    return Nem12(
        channels=list(channels.values()), others=others, missing=[what for kind, what in said if kind not in seen]
    )


def _untiled(channel: Channel, name: str) -> list[Fault]:
    """Days of varying quality whose intervals are not all covered by a 400 record."""
    faults = []
    for line, quality in zip(channel.line, channel.quality, strict=True):
        if isinstance(quality, str) and not quality.startswith("V"):
            continue
        gap = 1 if isinstance(quality, str) else quality.index("") + 1 if "" in quality else 0
        if gap:
            faults.append(Fault(f"{name}:{line}", f"is of varying quality, but no 400 record covers interval {gap}"))
    return faults


def _channel(
    record: str,
    number: int,
    name: str,
    channels: dict[tuple[str, str, int, float], Channel],
    faults: list[Fault],
    other: list[str],
) -> Channel | None:
    parts = [part.strip() for part in record.split(",")]
    if len(parts) < 9 or not parts[1]:
        faults.append(Fault(f"{name}:{number}", "200 record needs a meter, a suffix, a unit and an interval length"))
        return None
    meter, suffix, unit, length = parts[1], parts[4].upper(), parts[7].lower(), parts[8]
    if unit not in UNITS or suffix[:1] not in CHANNELS:
        other.append(f"{meter} {suffix} {parts[7]}".strip())
        return None
    if not length.isdigit() or int(length) not in LENGTHS:
        faults.append(Fault(f"{name}:{number}", f"interval length must be 5, 15 or 30, got {length[:10]!r}"))
        return None
    if UNITS[unit][1] != CHANNELS[suffix[0]][0]:
        faults.append(Fault(f"{name}:{number}", f"channel {suffix} cannot be in {parts[7]}"))
        return None
    key = (meter, suffix, int(length), UNITS[unit][0])
    if key not in channels:
        channels[key] = Channel(meter=meter, suffix=suffix, minutes=int(length), per_kilo=UNITS[unit][0])
    return channels[key]


def _day(channel: Channel, record: str, number: int, name: str, faults: list[Fault]) -> bool:
    """Add the day of a 300 record; False where it is at fault."""
    count = channel.count
    parts = record.split(",")
    flag = parts[count + 2].strip() if len(parts) > count + 2 else ""
    if FLAG.fullmatch(flag) is None:
        found = next((n for n, part in enumerate(parts[2:]) if FLAG.fullmatch(part.strip())), None)
        what = f"found {found}" if found is not None else "the record has no quality flag"
        faults.append(Fault(f"{name}:{number}", f"a day of {channel.minutes} min has {count} values; {what}"))
        return False
    date = parts[1].strip()
    try:
        day = dt.date(int(date[:4]), int(date[4:6]), int(date[6:]))
    except ValueError:
        day = dt.date.min
    if len(date) != 8 or not 1970 <= day.year <= 2100:
        faults.append(Fault(f"{name}:{number}", f"date {date[:12]!r} is not YYYYMMDD of 1970 to 2100"))
        return False
    texts = parts[2 : count + 2]
    try:
        values = list(map(float, texts))
    except ValueError:
        try:
            values = [float(text) if text.strip() else math.nan for text in texts]
        except ValueError as error:
            faults.append(Fault(f"{name}:{number}", f"a value cannot be read: {str(error)[:60]}"))
            return False
    if not all(-LARGEST < value < LARGEST or not text.strip() for value, text in zip(values, texts, strict=True)):
        faults.append(Fault(f"{name}:{number}", "a value is no number of a believable size"))
        return False
    channel.day.append(day.toordinal() - EPOCH_ORDINAL)
    channel.line.append(number)
    channel.values.append(values)
    channel.quality.append(flag)
    return True


def _quality(channel: Channel, record: str, number: int, name: str, faults: list[Fault]) -> None:
    parts = [part.strip() for part in record.split(",")]
    flags = channel.quality[-1]
    if isinstance(flags, str):
        flags = [""] * channel.count if flags[:1] == "V" else [flags] * channel.count
        channel.quality[-1] = flags
    whole = len(parts) > 3 and parts[1].isdigit() and parts[2].isdigit()
    if not whole or not 1 <= int(parts[1]) <= int(parts[2]) <= channel.count:
        faults.append(Fault(f"{name}:{number}", f"range of intervals must lie within 1 to {channel.count}"))
        return
    if not RANGE_FLAG.fullmatch(parts[3]):
        faults.append(Fault(f"{name}:{number}", f"{parts[3][:10]!r} is no quality flag of a range"))
        return
    first, last = int(parts[1]) - 1, int(parts[2])
    flags[first:last] = [parts[3]] * (last - first)
