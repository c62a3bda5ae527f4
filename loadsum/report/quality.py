"""Which readings of which customer on which day were usable: what the report's calendar shows."""

import itertools
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from loadsum.intake.readings import Readings

FULL, PART, ESTIMATED, NONE = "f", "p", "e", "-"


@dataclass(frozen=True, slots=True, kw_only=True)
class QualityCalendar:
    """State of every customer's readings on every day.

    Parameters
    ----------
    first_day : int
        Local day of the first sign, days since 1970-01-01. [d]
    days : int
        Days of the calendar. [d]
    customers : mapping of str to tuple of (int, str)
        For each customer how many days in a row have one sign: ``f`` all readings usable, ``e`` all there but some
        estimated, ``p`` some missing or left out, ``-`` none.
    """

    first_day: int
    days: int
    customers: Mapping[str, tuple[tuple[int, str], ...]]


def quality_calendar(readings: Readings) -> QualityCalendar:
    """State of every customer's readings by local day.

    Parameters
    ----------
    readings : Readings
        Aligned readings.
    """
    first, last = int(readings.local_day.min()), int(readings.local_day.max())
    days = last - first + 1
    place = readings.local_day - first
    asked = np.bincount(place, minlength=days)
    signs = {}
    for index, customer in enumerate(readings.customers):
        known = np.isfinite(readings.kw[index])
        present = np.bincount(place[known], minlength=days)
        estimated = np.bincount(place[known & readings.estimated[index]], minlength=days)
        state = np.full(days, PART)
        state[(present == asked) & (estimated == 0) & (asked > 0)] = FULL
        state[(present == asked) & (estimated > 0)] = ESTIMATED
        state[present == 0] = NONE
        signs[customer] = tuple((len(list(run)), sign) for sign, run in itertools.groupby(state.tolist()))
    return QualityCalendar(first_day=first, days=days, customers=signs)
