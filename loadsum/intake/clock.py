"""Time stamps as files write them -> starts of intervals in UTC."""

import datetime as dt
import re
import zoneinfo
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

OFFSET = re.compile(r"([+-])(\d\d):?(\d\d)")
NAT = np.iinfo(np.int64).min  # a stamp that names no instant


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
    """

    first: NDArray[np.int64]
    second: NDArray[np.int64]
    skipped: NDArray[np.bool_]
    unread: NDArray[np.bool_]
    own_offset: bool


def read_stamps(texts: pd.Series, time_format: str, clock: str, place: dt.tzinfo) -> Stamps:
    """Instants of distinct stamps.

    Parameters
    ----------
    texts : Series of str
        Distinct stamps.
    time_format : str
        Form in strptime notation; ISO 8601 when empty.
    clock : str
        "local", "utc", "standard" or a fixed offset.
    place : tzinfo
        Zone of the place.
    """
    trimmed = texts.str.strip()
    own_offset = (
        bool(trimmed.str.contains(r"(?:Z|[+-]\d\d:?\d\d)$", regex=True).all())
        if not time_format
        else ("%z" in time_format)
    )
    parsed = pd.to_datetime(trimmed, format=time_format or "ISO8601", errors="coerce", utc=own_offset)
    unread = parsed.isna().to_numpy()
    if own_offset:
        seconds = _seconds(parsed)
        return Stamps(
            first=seconds, second=seconds, skipped=np.zeros(unread.size, bool), unread=unread, own_offset=True
        )
    if clock == "local" and isinstance(place, zoneinfo.ZoneInfo):
        first, second = (
            parsed.dt.tz_localize(place, ambiguous=np.full(len(parsed), summer), nonexistent="NaT").dt.tz_convert("UTC")
            for summer in (True, False)
        )
        skipped = first.isna().to_numpy() & ~unread
        return Stamps(first=_seconds(first), second=_seconds(second), skipped=skipped, unread=unread, own_offset=False)
    shown = {"utc": dt.UTC, "standard": standard_offset(place), "local": place}.get(clock) or zone(clock)
    seconds = _seconds(parsed.dt.tz_localize(shown).dt.tz_convert("UTC"))
    return Stamps(first=seconds, second=seconds, skipped=np.zeros(unread.size, bool), unread=unread, own_offset=False)


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
