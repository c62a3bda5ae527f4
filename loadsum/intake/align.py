"""Readings of all files -> one matrix of customers by demand intervals, every reading accounted for."""

import datetime as dt
import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.errors import Fault
from loadsum.intake.duplicates import without_duplicates
from loadsum.intake.findings import Finding
from loadsum.intake.timed import CHUNK, Timed, left_out, picked, readings_of_each, total

MOST_CELLS = 400_000_000  # of the matrix; 1 000 customers over 45 years of hours
EPOCH = dt.datetime(1970, 1, 1)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Matrix:
    """Readings averaged up to the demand interval.

    Parameters
    ----------
    customers : tuple of str
        C identifiers in order.
    start_utc : (T,) int64
        Interval starts. [s]
    kw : (C, T) float64
        Average power; NaN where readings are missing. [kW]
    kvar : (C, T) float64 or None
        Average reactive power; None where no file has any. [kvar]
    estimated : (C, T) bool
        Intervals any part of which is flagged as estimated.
    readings_behind : (C, T) int
        Readings of the files that each interval was made from. [-]
    findings : tuple of Finding
        Duplicates, conflicts, intervals that are not whole.
    """

    customers: tuple[str, ...]
    start_utc: NDArray[np.int64]
    kw: NDArray[np.float64]
    kvar: NDArray[np.float64] | None
    estimated: NDArray[np.bool_]
    readings_behind: NDArray[np.integer]
    findings: tuple[Finding, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Grid:
    """Cells that readings fall into: customers by demand intervals, each cut into the finest common part."""

    row: dict[str, int]
    first_s: int
    slots: int
    interval_min: int
    part_min: int

    def cells(self, part: Timed, unit_min: int) -> NDArray[np.int64]:
        """Cell of each reading at a resolution, (n,) int64. [-]"""
        of_customer = np.array([self.row.get(name, 0) for name in part.customers], dtype=np.int64)
        per_row = self.slots * (self.interval_min // unit_min)
        cell = np.empty(part.start_s.size, dtype=np.int64)
        for begin in range(0, cell.size, CHUNK):
            some = slice(begin, begin + CHUNK)
            place = (part.start_s[some] - self.first_s) // (unit_min * 60)
            cell[some] = of_customer[part.customer[some]] * per_row + place
        return cell


def aligned(parts: Sequence[Timed], interval_min: int, phase_s: int = 0) -> tuple[Matrix | None, list[Fault]]:
    """One matrix from the readings of all files.

    A reading that repeats another of the same customer and interval is left out; where two disagree, both are, unless
    only one of them was observed. An interval of the study that its readings do not fill, or fill twice, is left
    empty, and its readings are counted as left out.

    Parameters
    ----------
    parts : sequence of Timed
        Readings, one entry a file.
    interval_min : int
        Demand interval. [min]
    phase_s : int
        How far demand intervals begin after whole multiples of their length, UTC: half an hour for hours of a zone
        that stands half an hour off. [s]
    """
    faults = [fault for part in parts for fault in _too_coarse(part, interval_min)]
    if faults:
        return None, faults
    findings: list[Finding] = []
    parts = [_on_grid(part, interval_min, phase_s, findings) for part in parts]
    if total(parts) == 0:
        said = f" ({findings[0].message})" if findings else ""
        return None, [Fault("readings", f"no reading could be used{said}")]
    grid, faults = _grid(parts, interval_min, phase_s)
    if grid is None:
        return None, faults
    cells = [grid.cells(part, grid.part_min) for part in parts]
    uniform = all((_distinct(part.minutes) == interval_min).all() for part in parts)
    if uniform and _fills(cells, grid):
        return _reshaped(parts[0], grid, findings), []
    keep = without_duplicates(parts, cells, len(grid.row) * grid.slots * (interval_min // grid.part_min), findings)
    parts = [picked(part, kept) for part, kept in zip(parts, keep, strict=True)]
    cells = [cell if kept.all() else cell[kept] for cell, kept in zip(cells, keep, strict=True)]
    if uniform:
        return _scattered(parts, cells, grid, findings), []
    del cells, keep
    return _averaged(parts, grid, findings), []


def _too_coarse(part: Timed, interval_min: int) -> list[Fault]:
    longest = int(part.minutes.max()) if part.minutes.size else 0
    if longest <= interval_min:
        return []
    advice = "coarser readings are never split: use the longer interval"
    return [
        Fault(
            "study.demand_interval_min", f"is {interval_min}, but {part.name} has readings of {longest} min; {advice}"
        )
    ]


def _on_grid(part: Timed, interval_min: int, phase_s: int, findings: list[Finding]) -> Timed:
    """Readings that lie within one demand interval and begin on a whole multiple of their own length."""
    off = np.zeros(part.start_s.size, bool)
    for begin in range(0, off.size, CHUNK):
        some = slice(begin, begin + CHUNK)
        since = part.start_s[some] - phase_s
        since -= since // (interval_min * 60) * (interval_min * 60)  # a remainder, the quick way
        if since.any():
            length = part.minutes[some] * 60
            off[some] = (since % length != 0) | (since + length > interval_min * 60)
    if not off.any():
        return part
    findings.extend(
        left_out(
            part,
            off,
            "off the grid",
            "reading(s) do not begin on a whole multiple of their interval",
            "they are left out; check the clock and the stamping of the file",
        )
    )
    return picked(part, ~off)


def _grid(parts: Sequence[Timed], interval_min: int, phase_s: int) -> tuple[Grid | None, list[Fault]]:
    used = sorted(
        {part.customers[c] for part in parts for c in np.flatnonzero(readings_of_each(part.customer)).tolist()}
    )
    step = interval_min * 60
    filled = [part for part in parts if part.start_s.size]
    first = (min(int(part.start_s.min()) for part in filled) - phase_s) // step
    last = (max(int(part.start_s.max()) for part in filled) - phase_s) // step
    lengths = {int(m) for part in filled for m in _distinct(part.minutes)}
    slots = last - first + 1
    if len(used) * slots > MOST_CELLS:
        span = " to ".join((EPOCH + dt.timedelta(seconds=n * step)).strftime("%Y-%m-%d") for n in (first, last))
        return None, [Fault("readings", f"stamps run from {span}, too long for a table; check the form of the dates")]
    return Grid(
        row={name: n for n, name in enumerate(used)},
        first_s=first * step + phase_s,
        slots=slots,
        interval_min=interval_min,
        part_min=math.gcd(interval_min, *lengths),
    ), []


def _distinct(minutes: NDArray[np.int64]) -> NDArray[np.int64]:
    return minutes[:1] if minutes.strides == (0,) else np.unique(minutes)


def _fills(cells: Sequence[NDArray[np.int64]], grid: Grid) -> bool:
    """Whether the readings are those of one file that fill every cell once and in order."""
    if len(cells) != 1 or cells[0].size != len(grid.row) * grid.slots:
        return False
    (cell,) = cells
    ranges = range(0, cell.size, CHUNK)
    return all(np.array_equal(cell[n : n + CHUNK], np.arange(n, min(n + CHUNK, cell.size))) for n in ranges)


def _reshaped(part: Timed, grid: Grid, findings: list[Finding]) -> Matrix:
    """Readings that are in the order of the matrix already."""
    shape = (len(grid.row), grid.slots)
    return Matrix(
        customers=tuple(grid.row),
        start_utc=_starts(grid),
        kw=part.kw.reshape(shape),
        kvar=None if part.kvar is None else part.kvar.reshape(shape),
        estimated=part.estimated.reshape(shape),
        readings_behind=np.broadcast_to(np.int16(1), shape),
        findings=tuple(findings),
    )


def _scattered(
    parts: Sequence[Timed], cells: Sequence[NDArray[np.int64]], grid: Grid, findings: list[Finding]
) -> Matrix:
    """Readings of the demand interval itself, each in its cell."""
    shape = (len(grid.row), grid.slots)
    size = shape[0] * shape[1]
    reactive = any(part.kvar is not None for part in parts)
    kw, kvar, guess = np.full(size, np.nan), np.full(size, np.nan) if reactive else None, np.zeros(size, bool)
    for part, cell in zip(parts, cells, strict=True):
        kw[cell] = part.kw
        if kvar is not None and part.kvar is not None:
            kvar[cell] = part.kvar
        if part.estimated.any():
            guess[cell] = part.estimated
    return Matrix(
        customers=tuple(grid.row),
        start_utc=_starts(grid),
        kw=kw.reshape(shape),
        kvar=None if kvar is None else kvar.reshape(shape),
        estimated=guess.reshape(shape),
        readings_behind=np.broadcast_to(np.int16(1), shape),
        findings=tuple(findings),
    )


def _starts(grid: Grid) -> NDArray[np.int64]:
    return grid.first_s + np.arange(grid.slots, dtype=np.int64) * (grid.interval_min * 60)


def _averaged(parts: Sequence[Timed], grid: Grid, findings: list[Finding]) -> Matrix:
    """Readings averaged up; an interval that they do not fill exactly once is left empty."""
    shape = (len(grid.row), grid.slots)
    size = shape[0] * shape[1]
    filled, behind, energy = np.zeros(size, np.int32), np.zeros(size, np.int16), np.zeros(size)
    guess, twice = np.zeros(size, bool), np.zeros(size, bool)
    quarter = np.zeros(size) if any(part.kvar is not None for part in parts) else None
    for part in parts:
        cell = grid.cells(part, grid.interval_min)
        behind += np.bincount(cell, minlength=size).astype(np.int16)
        filled += np.bincount(cell, weights=part.minutes, minlength=size).astype(np.int32)
        energy += np.bincount(cell, weights=part.kw * part.minutes, minlength=size)
        if quarter is not None:
            own = part.kvar if part.kvar is not None else np.full(part.kw.size, np.nan)
            quarter += np.bincount(cell, weights=own * part.minutes, minlength=size)
        guess |= np.bincount(cell, weights=part.estimated, minlength=size) > 0.0
    _mark_covered_twice(parts, grid, twice)
    good = (filled == grid.interval_min) & ~twice
    for part in parts:
        lost = ~good[grid.cells(part, grid.interval_min)]
        message = f"reading(s) fill only part of a demand interval of {grid.interval_min} min, or fill it twice"
        findings.extend(left_out(part, lost, "interval not filled", message, "the intervals are left empty"))
    return Matrix(
        customers=tuple(grid.row),
        start_utc=_starts(grid),
        kw=np.where(good, energy / grid.interval_min, np.nan).reshape(shape),
        kvar=None if quarter is None else np.where(good, quarter / grid.interval_min, np.nan).reshape(shape),
        estimated=(guess & good).reshape(shape),
        readings_behind=behind.reshape(shape),
        findings=tuple(findings),
    )


def _mark_covered_twice(parts: Sequence[Timed], grid: Grid, twice: NDArray[np.bool_]) -> None:
    """Demand intervals any part of which is covered by two readings, where meters of different intervals overlap."""
    lengths = {int(m) for part in parts if part.minutes.size for m in np.unique(part.minutes)}
    if len(lengths) < 2:
        return
    per_slot = grid.interval_min // grid.part_min
    cover = np.zeros(twice.size * per_slot, np.uint8)
    for part in parts:
        units = part.minutes // grid.part_min
        first = grid.cells(part, grid.part_min)
        inside = np.arange(int(units.sum())) - np.repeat(np.cumsum(units) - units, units)
        np.add.at(cover, np.repeat(first, units) + inside, 1)
    twice |= (cover.reshape(-1, per_slot) > 1).any(axis=1)
