"""Energy and number of readings by customer and month: how two studies tell which readings differ."""

from dataclasses import dataclass

import numpy as np

from loadsum.intake.readings import Readings


@dataclass(frozen=True, slots=True, kw_only=True)
class CustomerMonths:
    """What the readings of one customer add up to in each calendar month.

    Parameters
    ----------
    customer : str
        Customer.
    first_month : str
        Month of the first entry, ``2031-01``; local calendar.
    readings : tuple of int
        Usable readings of each month in turn. [-]
    energy_kwh : tuple of float
        Net energy of those readings. [kWh]
    """

    customer: str
    first_month: str
    readings: tuple[int, ...]
    energy_kwh: tuple[float, ...]


def energy_by_month(readings: Readings) -> tuple[CustomerMonths, ...]:
    """Energy and number of usable readings of every customer in every month.

    Parameters
    ----------
    readings : Readings
        Aligned readings.
    """
    month = readings.local_day.astype("datetime64[D]").astype("datetime64[M]").astype(np.int64)
    first = int(month.min())
    place = month - first
    months = int(place.max()) + 1
    label = str(np.datetime64(first, "M"))
    hours = readings.interval_min / 60.0
    rows = []
    for index, customer in enumerate(readings.customers):
        known = np.isfinite(readings.kw[index])
        count = np.bincount(place[known], minlength=months)
        energy = np.bincount(place[known], weights=readings.kw[index, known] * hours, minlength=months)
        rows.append(
            CustomerMonths(
                customer=customer,
                first_month=label,
                readings=tuple(count.tolist()),
                energy_kwh=tuple(energy.tolist()),
            )
        )
    return tuple(rows)
