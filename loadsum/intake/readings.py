"""Readings aligned in true time: what the readers make and every later stage uses."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.findings import Finding

UNITS_PER_KW = 12_000_000  # resolutions are taken as multiples of a twelfth of a milliwatt, for averages of intervals


def read_only(array: NDArray[np.generic]) -> None:
    """Make an array read-only in place; every array that crosses a stage boundary is."""
    array.flags.writeable = False


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Readings:
    """Average demand of each customer over each demand interval.

    Parameters
    ----------
    customers : tuple of str
        C identifiers, with leading zeros kept.
    start_utc : (T,) int64
        Start of each interval, seconds since 1970-01-01 UTC; increasing, equally spaced. [s]
    interval_min : int
        Demand interval. [min]
    local_day : (T,) int64
        Local calendar day of the interval's start, days since 1970-01-01. [d]
    interval_of_day : (T,) int64
        Position on the local clock, 0 to 1440/interval_min - 1. The repeated hour of a 25-hour day bears the
        same numbers twice; the missing hour of a 23-hour day has none. [-]
    kw : (C, T) float64
        Average demand; NaN where there is no usable reading. Export is negative. [kW]
    kvar : (C, T) float64 or None
        Average reactive demand where metered. [kvar]
    estimated : (C, T) bool
        Readings that the meter system flags as estimated or substituted; they are never counted as observed.
    resolution_kw : (C,) float64
        Meter resolution expressed as demand; 0 where unknown. [kW]
    findings : tuple of Finding
        Doubts, one per rule, place and customer.
    rows_in : int
        Readings in the files, every one of which is used or stands in a finding. [-]
    """

    customers: tuple[str, ...]
    start_utc: NDArray[np.int64]
    interval_min: int
    local_day: NDArray[np.int64]
    interval_of_day: NDArray[np.int64]
    kw: NDArray[np.float64]
    kvar: NDArray[np.float64] | None
    estimated: NDArray[np.bool_]
    resolution_kw: NDArray[np.float64]
    findings: tuple[Finding, ...]
    rows_in: int

    def __post_init__(self) -> None:
        shape = (len(self.customers), self.start_utc.size)
        if self.kw.shape != shape or self.estimated.shape != shape:
            raise ValueError(f"kw {self.kw.shape} and estimated {self.estimated.shape} must be {shape}")
        if self.local_day.shape != shape[1:] or self.interval_of_day.shape != shape[1:]:
            raise ValueError(f"local_day and interval_of_day must be {shape[1:]}")
        if self.kvar is not None and self.kvar.shape != shape:
            raise ValueError(f"kvar {self.kvar.shape} must be {shape}")
        if self.resolution_kw.shape != shape[:1]:
            raise ValueError(f"resolution_kw must be {shape[:1]}, got {self.resolution_kw.shape}")
        for array in (
            self.start_utc,
            self.local_day,
            self.interval_of_day,
            self.kw,
            self.estimated,
            self.resolution_kw,
        ):
            read_only(array)
        if self.kvar is not None:
            read_only(self.kvar)

    @property
    def intervals_per_day(self) -> int:
        """Demand intervals in a day of 24 hours. [-]"""
        return 1440 // self.interval_min


def shared_resolution(readings: Readings) -> float:
    """Largest step of which the readings of every meter are multiples; 0 where one has no resolution. [kW]"""
    moving = np.array([np.any(row[np.isfinite(row)] != 0.0) for row in readings.kw], dtype=bool)
    known = readings.resolution_kw[moving]
    if known.size == 0 or np.any(known <= 0.0):
        return 0.0
    units = np.rint(known * UNITS_PER_KW)
    if np.any(np.abs(known * UNITS_PER_KW - units) > 1e-3 * units):
        return 0.0
    return float(np.gcd.reduce(units.astype(np.int64))) / UNITS_PER_KW


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TemperatureRecord:
    """Outdoor temperature by day, and by interval where the series is fine enough.

    Parameters
    ----------
    day : (M,) int64
        Local calendar day, days since 1970-01-01; increasing. [d]
    daily_mean_c : (M,) float64
        Mean outdoor temperature of the day. [°C]
    by_interval_c : (M, I) float64 or None
        Temperature in each demand interval of the day. [°C]
    """

    day: NDArray[np.int64]
    daily_mean_c: NDArray[np.float64]
    by_interval_c: NDArray[np.float64] | None = None

    def __post_init__(self) -> None:
        if self.daily_mean_c.shape != self.day.shape:
            raise ValueError(f"daily_mean_c {self.daily_mean_c.shape} must be {self.day.shape}")
        read_only(self.day)
        read_only(self.daily_mean_c)
        if self.by_interval_c is not None:
            read_only(self.by_interval_c)
