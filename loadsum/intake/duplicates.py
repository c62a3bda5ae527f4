"""Several readings of one customer and interval: repeats, superseded estimates, conflicts."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.findings import Finding
from loadsum.intake.timed import Timed, left_out

EQUAL = 1e-9  # relative difference of readings that are the same up to rounding of the file
KINDS = (
    (
        1,
        "repeated reading",
        "reading(s) repeat another of the same interval with the same value",
        "the repeats are left out",
    ),
    (
        2,
        "superseded estimate",
        "estimated reading(s) stand beside an observed one of the same interval",
        "the observed reading is used",
    ),
    (
        3,
        "conflicting readings",
        "reading(s) give different values for the same interval",
        "none of the values is used",
    ),
)


def without_duplicates(
    parts: Sequence[Timed], cells: Sequence[NDArray[np.int64]], size: int, findings: list[Finding]
) -> list[NDArray[np.bool_]]:
    """Which readings of each file are used, where each cell may be used once.

    Parameters
    ----------
    parts : sequence of Timed
        Readings.
    cells : sequence of (n,) int64
        Cell of customer and start that each reading falls into, below ``size``. [-]
    size : int
        Number of cells. [-]
    findings : list of Finding
        Receives what is left out.
    """
    seen = np.zeros(size, bool)
    for cell in cells:
        seen[cell] = True
    keep = [np.ones(cell.size, bool) for cell in cells]
    if int(np.count_nonzero(seen)) == sum(cell.size for cell in cells):
        return keep
    del seen
    count = np.zeros(size, np.int32)
    for cell in cells:
        np.add.at(count, cell, 1)
    rows = [np.flatnonzero(count[cell] > 1) for cell in cells]
    file = np.repeat(np.arange(len(parts)), [r.size for r in rows])
    row = np.concatenate(rows)
    cell = np.concatenate([c[r] for c, r in zip(cells, rows, strict=True)])
    kw = np.concatenate([p.kw[r] for p, r in zip(parts, rows, strict=True)])
    kvar = np.concatenate(
        [np.zeros(r.size) if p.kvar is None else np.nan_to_num(p.kvar[r]) for p, r in zip(parts, rows, strict=True)]
    )
    guess = np.concatenate([p.estimated[r] for p, r in zip(parts, rows, strict=True)])
    minutes = np.concatenate([p.minutes[r] for p, r in zip(parts, rows, strict=True)])
    kind = _kinds(cell, kw, kvar, minutes, guess)
    for n, part in enumerate(parts):
        mine = file == n
        keep[n][row[mine]] = kind[mine] == 0
        for code, rule, message, effect in KINDS:
            chosen = np.zeros(part.kw.size, bool)
            chosen[row[mine][kind[mine] == code]] = True
            if chosen.any():
                findings.extend(left_out(part, chosen, rule, message, effect))
    return keep


def _kinds(
    cell: NDArray[np.int64],
    kw: NDArray[np.float64],
    kvar: NDArray[np.float64],
    minutes: NDArray[np.int64],
    guess: NDArray[np.bool_],
) -> NDArray[np.int8]:
    """0 used, 1 repeat, 2 superseded estimate, 3 conflict; (n,) int8."""
    order = np.lexsort((np.arange(cell.size), guess, cell))
    new = np.ones(cell.size, bool)
    new[1:] = cell[order][1:] != cell[order][:-1]
    first = np.flatnonzero(new)
    group = np.cumsum(new) - 1
    observed = ~guess[order]
    some = np.logical_or.reduceat(observed, first)[group]  # an observed reading stands in the cell, and comes first
    head = first[group]
    differs = np.zeros(cell.size, bool)
    for values in (kw[order], kvar[order], minutes[order].astype(np.float64)):
        differs |= np.abs(values - values[head]) > EQUAL * np.maximum(np.abs(values[head]), 1e-3)
    counted = differs & (observed | ~some)  # an estimate beside an observed reading makes no conflict
    conflict = np.logical_or.reduceat(counted, first)[group]
    kind = np.zeros(cell.size, np.int8)
    kind[order] = np.where(conflict, 3, np.where(new, 0, np.where(differs, 2, 1)))
    return kind
