"""Readings with their instants, as average power: what every reader ends in."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.findings import Finding

CHUNK = 2**16  # readings looked at together, so that what is made of them stays in the processor's memory


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Timed:
    """Readings of one file with their instants, as average power.

    Parameters
    ----------
    name : str
        Name by which findings call the file.
    customers : tuple of str
        Distinct identifiers.
    customer : (n,) int32 or int64
        Which of them each reading belongs to. [-]
    start_s : (n,) int64
        Start of the interval, seconds since 1970-01-01 UTC. [s]
    minutes : (n,) int64
        Length of the interval. [min]
    kw : (n,) float64
        Average power. [kW]
    kvar : (n,) float64 or None
        Average reactive power; NaN where not metered. [kvar]
    estimated : (n,) bool
        Flagged as estimated.
    line : (n,) int32 or int64
        Line or record of the file. [-]
    """

    name: str
    customers: tuple[str, ...]
    customer: NDArray[np.integer]
    start_s: NDArray[np.int64]
    minutes: NDArray[np.int64]
    kw: NDArray[np.float64]
    kvar: NDArray[np.float64] | None
    estimated: NDArray[np.bool_]
    line: NDArray[np.integer]

    def place(self, row: int) -> str:
        """``file:line`` of a reading."""
        return f"{self.name}:{self.line[row]}"


def readings_of_each(customer: NDArray[np.integer]) -> NDArray[np.int64]:
    """Readings of each customer, by code, (C,) int64; in chunks, because a count turns its codes into wide ones. [-]"""
    count = np.zeros(0, np.int64)
    for begin in range(0, customer.size, CHUNK):
        some = np.bincount(customer[begin : begin + CHUNK], minlength=count.size)
        some[: count.size] += count
        count = some
    return count


def left_out(
    part: Timed, chosen: NDArray[np.bool_], rule: str, message: str, effect: str, *, excluded: bool = True
) -> list[Finding]:
    """One finding for each customer of a file that has chosen readings."""
    rows = np.flatnonzero(chosen)
    order = np.argsort(part.customer[rows], kind="stable")
    who, first, count = np.unique(part.customer[rows][order], return_index=True, return_counts=True)
    return [
        Finding(
            rule=rule,
            severity="excluded" if excluded else "caution",
            customer=part.customers[int(c)],
            place=part.place(int(rows[order[f]])),
            count=int(n),
            excluded=int(n) if excluded else 0,
            message=f"{n} {message}",
            effect=effect,
        )
        for c, f, n in zip(who.tolist(), first.tolist(), count.tolist(), strict=True)
    ]


def picked(part: Timed, keep: NDArray[np.bool_]) -> Timed:
    """The readings of a file that are kept; the same object where all are."""
    if keep.all():
        return part
    return Timed(
        name=part.name,
        customers=part.customers,
        customer=part.customer[keep],
        start_s=part.start_s[keep],
        minutes=part.minutes[keep],
        kw=part.kw[keep],
        kvar=None if part.kvar is None else part.kvar[keep],
        estimated=part.estimated[keep],
        line=part.line[keep],
    )


def joined(parts: Sequence[Timed]) -> Timed:
    """Readings of parts that share one list of customers, one after the other."""
    if len(parts) == 1:
        return parts[0]
    reactive = any(part.kvar is not None for part in parts)
    kvar = [np.full(part.kw.size, np.nan) if part.kvar is None else part.kvar for part in parts]
    return Timed(
        name=parts[0].name,
        customers=parts[0].customers,
        customer=np.concatenate([part.customer for part in parts]),
        start_s=np.concatenate([part.start_s for part in parts]),
        minutes=np.concatenate([part.minutes for part in parts]),
        kw=np.concatenate([part.kw for part in parts]),
        kvar=np.concatenate(kvar) if reactive else None,
        estimated=np.concatenate([part.estimated for part in parts]),
        line=np.concatenate([part.line for part in parts]),
    )


def total(parts: Sequence[Timed]) -> int:
    """Readings of all files. [-]"""
    return sum(part.start_s.size for part in parts)
