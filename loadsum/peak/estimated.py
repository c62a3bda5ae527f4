"""Exceedance hours with the estimated readings left out, as adopted, and with them taken in."""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.readings import Readings
from loadsum.peak.exceedance import ExceedanceTable


@dataclass(frozen=True, slots=True, kw_only=True)
class EstimatedRow:
    """One rating under one of its limits.

    Parameters
    ----------
    rating_kva : float
        Nameplate rating. [kVA]
    of : str
        Limit that the exceedance is of: nameplate, or allowed loading.
    left_out_h, taken_in_h : float
        Expected exceedance hours a year over the covered hours, without the estimated readings and with them. [h]
    """

    rating_kva: float
    of: str
    left_out_h: float
    taken_in_h: float


@dataclass(frozen=True, slots=True, kw_only=True)
class EstimatedReadings:
    """What the estimated readings of the customers served would do, were they counted as observed.

    Parameters
    ----------
    customers : int
        Customers served that have estimated readings. [-]
    readings : int
        Their demand intervals that are estimated in whole or in part. [-]
    share : float
        The same, of all demand intervals of all metered customers served. [-]
    left_out_covered_h, taken_in_covered_h : float
        Hours of the year that the readings speak for, without the estimated ones and with them. [h]
    rows : tuple of EstimatedRow
        Every rating under each of its limits.
    """

    customers: int
    readings: int
    share: float
    left_out_covered_h: float
    taken_in_covered_h: float
    rows: tuple[EstimatedRow, ...]


def estimated_readings(
    readings: Readings,
    served: Sequence[int] | NDArray[np.integer],
    ratings_kva: Sequence[float],
    left_out: Mapping[str, ExceedanceTable],
    taken_in: Callable[[], Mapping[str, ExceedanceTable]],
) -> EstimatedReadings | None:
    """Exceedance of each rating without the estimated readings of the customers served, and with them.

    Parameters
    ----------
    readings : Readings
        Aligned readings.
    served : sequence of int
        Rows of the metered customers served. [-]
    ratings_kva : sequence of float
        Ratings, in the order of the levels of each table. [kVA]
    left_out : mapping of str to ExceedanceTable
        Exceedance by limit, from the readings without the estimated ones.
    taken_in : callable
        Makes the same from all readings; called only where there are estimated ones.

    Returns
    -------
    EstimatedReadings or None
        None where no reading of the customers served is estimated.

    Notes
    -----
    The adopted figures are those without. A substituted reading is often an average of like days; counted as observed
    it would hide peaks, and a poor substitution would invent them.
    """
    rows = np.asarray(served, dtype=np.int64)
    known = np.isfinite(readings.kw[rows])
    flagged = readings.estimated[rows] & known
    if not flagged.any():
        return None
    given = taken_in()
    return EstimatedReadings(
        customers=int(flagged.any(axis=1).sum()),
        readings=int(flagged.sum()),
        share=float(flagged.sum() / known.sum()),
        left_out_covered_h=next(iter(left_out.values())).covered_h,
        taken_in_covered_h=next(iter(given.values())).covered_h,
        rows=tuple(
            EstimatedRow(
                rating_kva=float(rating),
                of=of,
                left_out_h=without.year.expected_h,
                taken_in_h=with_them.year.expected_h,
            )
            for of, table in left_out.items()
            for rating, without, with_them in zip(ratings_kva, table.levels, given[of].levels, strict=True)
        ),
    )
