"""Time stamps as files write them -> starts of intervals in UTC."""

import datetime as dt
import re
import zoneinfo
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

OFFSET = re.compile(r"([+-])(\d\d):?(\d\d)")
OWN_OFFSET = r"(?:[Zz]|[+-]\d\d:?\d\d)$"
NAT = np.iinfo(np.int64).min  # a stamp that names no instant
FIRST_YEAR, LAST_YEAR = 1970, 2100  # no interval meter has readings outside
# Common forms beside ISO 8601; where day and month can be told apart only by their numbers, the file must prove it.
NUMBERED = re.compile(r"\s*(\d{1,2})([/.-])(\d{1,2})\2(\d{4})(?:[ T]+(\d{1,2}:\d\d(:\d\d)?)( ?[AaPp][Mm])?)?\s*")
COMPACT = re.compile(r"\d{8}|\d{12}|\d{14}")


class AmbiguousDatesError(ValueError):
    """Stamps whose day and month cannot be told apart; the text says why."""


def zone(text: str) -> dt.tzinfo:
    """The zone that a study file names: an IANA zone or a fixed offset."""
    fixed = OFFSET.fullmatch(text)
    if fixed is None:
        return zoneinfo.ZoneInfo(text)
    minutes = int(fixed[2]) * 60 + int(fixed[3])
    return dt.timezone(dt.timedelta(minutes=minutes if fixed[1] == "+" else -minutes))


def standard_offset(place: dt.tzinfo) -> dt.timezone:
    """Standard time of a zone, all year."""
    winter, summer = (dt.datetime(2030, month, 1, tzinfo=place) for month in (1, 7))
    offsets = [when.utcoffset() or dt.timedelta(0) for when in (winter, summer)]
    return dt.timezone(min(offsets))


def grid_phase_s(place: dt.tzinfo, interval_min: int) -> int:
    """How far local demand intervals begin after whole multiples of their length in UTC. [s]"""
    offset = standard_offset(place).utcoffset(None)
    return int(-offset.total_seconds()) % (interval_min * 60)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Stamps:
    """Distinct stamps of a file as instants.

    Parameters
    ----------
    first, second : (U,) int64
        Instant of each stamp, seconds since 1970-01-01 UTC, at its first and second occurrence for a customer; they
        differ only in the hour that local time repeats. The smallest integer where a stamp names no instant. [s]
    skipped : (U,) bool
        Stamps in the hour that local time skips: the file ignores the clock change.
    unread : (U,) bool
        Stamps that cannot be understood.
    own_offset : bool
        Whether the stamps carry their own offset, which is believed.
    form : str
        How the stamps were understood, in words.
    """

    first: NDArray[np.int64]
    second: NDArray[np.int64]
    skipped: NDArray[np.bool_]
    unread: NDArray[np.bool_]
    own_offset: bool
    form: str


def read_stamps(
    texts: pd.Series, time_format: str, clock: str, place: dt.tzinfo, *, day_first: str = "", before_s: int = 0
) -> Stamps:
    """Instants of distinct stamps.

    Parameters
    ----------
    texts : Series of str
        Distinct stamps.
    time_format : str
        Form in strptime notation; ISO 8601, or day, month and year told apart by their numbers, when empty.
    clock : str
        "local", "utc", "standard" or a fixed offset.
    place : tzinfo
        Zone of the place.
    day_first : str
        "yes", "no", or empty where the file must prove it.
    before_s : int
        Seconds from the start of an interval to its stamp. They are taken off before local time is told apart, so
        that the last interval before a clock change stays where it is. [s]

    Raises
    ------
    AmbiguousDatesError
        Day and month cannot be told apart, or the file mixes both orders.
    """
    trimmed = texts.str.strip()
    marked = trimmed.str.contains(OWN_OFFSET, regex=True).to_numpy(dtype=bool) & trimmed.str.contains(":").to_numpy(
        bool
    )
    own_offset = "%z" in time_format if time_format else bool(marked.mean() > 0.5) if len(marked) else False
    form = time_format or "ISO 8601"
    if not time_format:
        time_format, form = _told_form(trimmed, day_first)
        wrong = ~marked if own_offset else marked
        trimmed = trimmed.where(~wrong, "")
    late = trimmed.str.contains(r"[ T]24:00(?::00)?$", regex=True).to_numpy(dtype=bool)  # the end of the day, named so
    if late.any():
        trimmed = trimmed.str.replace(r"([ T])24:00((?::00)?)$", r"\g<1>00:00\g<2>", regex=True)
    parsed = pd.to_datetime(trimmed, format=time_format or "ISO8601", errors="coerce", utc=own_offset)
    if not hasattr(parsed, "dt"):
        parsed = pd.Series(pd.NaT, index=trimmed.index)
    bare = parsed.dt.tz_localize(None) if own_offset else parsed
    years = bare.dt.year.to_numpy(dtype=np.float64)
    believable = (years >= FIRST_YEAR) & (years <= LAST_YEAR)
    bare = bare.where(believable) - pd.Timedelta(seconds=before_s) + pd.to_timedelta(late.astype(np.int64), unit="D")
    unread = bare.isna().to_numpy()
    none_skipped = np.zeros(unread.size, bool)
    if own_offset:
        seconds = _seconds(bare)
        return Stamps(first=seconds, second=seconds, skipped=none_skipped, unread=unread, own_offset=True, form=form)
    if clock == "local" and isinstance(place, zoneinfo.ZoneInfo):
        first, second = (
            bare.dt.tz_localize(place, ambiguous=np.full(len(bare), summer), nonexistent="NaT").dt.tz_convert("UTC")
            for summer in (True, False)
        )
        skipped = first.isna().to_numpy() & ~unread
        return Stamps(
            first=_seconds(first), second=_seconds(second), skipped=skipped, unread=unread, own_offset=False, form=form
        )
    shown = {"utc": dt.UTC, "standard": standard_offset(place), "local": place}.get(clock) or zone(clock)
    offset = shown.utcoffset(None)
    if offset is None:
        raise ValueError(f"clock {clock!r} is no fixed offset")
    seconds = _seconds(bare)
    seconds = np.where(seconds == NAT, NAT, seconds - int(offset.total_seconds()))
    return Stamps(first=seconds, second=seconds, skipped=none_skipped, unread=unread, own_offset=False, form=form)


def _told_form(texts: pd.Series, day_first: str) -> tuple[str, str]:
    """strptime form of stamps that are not ISO 8601, empty where they are, and how it was told."""
    known = texts[texts != ""]
    head = known.head(50)
    if len(head) and head.map(lambda text: COMPACT.fullmatch(text) is not None).all():
        length = len(head.iloc[0])
        return {8: "%Y%m%d", 12: "%Y%m%d%H%M", 14: "%Y%m%d%H%M%S"}[length], "year, month, day without separators"
    if not len(head) or not head.map(lambda text: NUMBERED.fullmatch(text) is not None).mean() > 0.5:
        return "", "ISO 8601"
    sample = next(found for found in (NUMBERED.fullmatch(text) for text in head) if found is not None)
    parts = known.str.extract(r"^\s*(\d{1,2})[/.-](\d{1,2})[/.-]").astype(float)
    first_big, second_big = bool((parts[0] > 12).any()), bool((parts[1] > 12).any())
    if first_big and second_big:
        raise AmbiguousDatesError("mixes dates with the day first and dates with the month first")
    if not day_first and not first_big and not second_big:
        raise AmbiguousDatesError(f"does not say whether {sample[0].strip()!r} has the day or the month first")
    if (day_first == "no" and first_big) or (day_first == "yes" and second_big):
        raise AmbiguousDatesError(f"does not fit day_first = {day_first!r}")
    days = day_first == "yes" or first_big
    mark = sample[2]
    form = f"%d{mark}%m{mark}%Y" if days else f"%m{mark}%d{mark}%Y"
    if sample[5]:
        hour = "%I" if sample[7] else "%H"
        spaced = " %p" if sample[7] and sample[7].startswith(" ") else "%p" if sample[7] else ""
        form += f" {hour}:%M" + (":%S" if sample[6] else "") + spaced
    how = "stated" if day_first else "proved by the file, which has numbers above 12 there"
    return form, f"{'day' if days else 'month'} first, {how}"


def local_calendar(
    start_utc: NDArray[np.int64], place: dt.tzinfo, interval_min: int
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Local day, and position of each interval on the local clock, (T,) int64 each. [d, -]"""
    instants = pd.Series(pd.to_datetime(start_utc, unit="s", utc=True))
    local = instants.dt.tz_convert(place).dt.tz_localize(None)
    seconds = _seconds(local)
    return seconds // 86400, (seconds % 86400) // (interval_min * 60)


def _seconds(stamps: pd.Series) -> NDArray[np.int64]:
    naive = stamps.dt.tz_localize(None) if stamps.dt.tz is not None else stamps
    whole = naive.to_numpy().astype("datetime64[s]")
    return np.where(np.isnat(whole), NAT, whole.astype(np.int64))
