"""Readings of one table as the file gives them."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RawReadings:
    """Readings of one file as it gives them.

    Parameters
    ----------
    name : str
        Name by which faults call the file.
    customers, stamps : tuple of str
        Distinct identifiers and distinct stamps; no stamps where the file has none, ``stamp`` is then the row.
    customer, stamp : (n,) int32 or int64
        Which of them each reading has. [-]
    value : (n,) float64
        Value as written; NaN where the field is empty. [unit of the file]
    kvar : (n,) float64 or None
        Reactive value as written. [unit of the file]
    exported : (n,) float64 or None
        Exported value as written. [unit of the file]
    flagged : (n,) bool
        Readings that the file flags as estimated.
    line : (n,) int32 or int64
        Line of the file. [-]
    unreadable : tuple of (row, text)
        Readings whose field is no number, by their position in ``value``.
    layout : str
        Layout it was read as.
    choices : tuple of str
        What was guessed or mapped.
    """

    name: str
    customers: tuple[str, ...]
    stamps: tuple[str, ...]
    customer: NDArray[np.integer]
    stamp: NDArray[np.integer]
    value: NDArray[np.float64]
    kvar: NDArray[np.float64] | None
    exported: NDArray[np.float64] | None
    flagged: NDArray[np.bool_]
    line: NDArray[np.integer]
    unreadable: tuple[tuple[int, str], ...]
    layout: str
    choices: tuple[str, ...]
