"""Sum of the customers against a meter at the transformer or feeder head."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.align import Matrix
from loadsum.intake.findings import Finding
from loadsum.intake.readings import read_only

FEWEST = 100  # intervals in which all is metered; fewer compare nothing
DOUBTFUL_SHARE = 0.10  # of the measured energy; secondary losses are a few per cent (common practice)
TWICE = 1.5  # how much better the sum must fit without a customer before the link is suspected


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Reconciliation:
    """Measured demand of the group against the sum of its customers.

    Parameters
    ----------
    intervals : int
        Demand intervals in which the group's meter and every customer have a reading. [-]
    measured_kwh, summed_kwh : float
        Energy in those intervals. [kWh]
    unaccounted_share : float
        Measured less summed, per unit of measured: losses, unmetered load, customers that are missing or too many. [-]
    unaccounted_kw : (I,) float64
        The same by interval of the day, mean; NaN where nothing can be compared. [kW]
    """

    intervals: int
    measured_kwh: float
    summed_kwh: float
    unaccounted_share: float
    unaccounted_kw: NDArray[np.float64]

    def __post_init__(self) -> None:
        read_only(self.unaccounted_kw)


def reconciled(
    customers: tuple[str, ...],
    kw: NDArray[np.float64],
    start_utc: NDArray[np.int64],
    interval_of_day: NDArray[np.int64],
    head: Matrix | None,
    interval_min: int,
) -> tuple[Reconciliation | None, tuple[Finding, ...]]:
    """Comparison with the group's meter, and what it gives reason to doubt.

    A wrong link of a customer to the transformer is suspected where the difference follows that customer: where the
    sum fits the measurement at least half again as well with the customer left out.
    """
    if head is None:
        return None, ()
    shared, here, there = np.intersect1d(start_utc, head.start_utc, return_indices=True)
    measured, each = head.kw.sum(axis=0)[there], kw[:, here]
    whole = np.isfinite(measured) & np.isfinite(each).all(axis=0)
    count = int(whole.sum())
    if count < FEWEST:
        return None, (
            Finding(
                rule="reconciliation",
                severity="note",
                count=count,
                message=f"the group's meter and all customers have readings together in {count} of {shared.size} "
                f"intervals, fewer than {FEWEST}",
                effect="the sum of the customers is not compared with the group's meter",
            ),
        )
    measured, each, when = measured[whole], each[:, whole], interval_of_day[here][whole]
    difference = measured - each.sum(axis=0)
    hours = interval_min / 60.0
    share = float(difference.sum() / measured.sum()) if measured.sum() else float("nan")
    per_day = 1440 // interval_min
    number = np.bincount(when, minlength=per_day)
    total = np.bincount(when, weights=difference, minlength=per_day)
    by_interval = np.divide(total, number, out=np.full(per_day, np.nan), where=number > 0)
    result = Reconciliation(
        intervals=count,
        measured_kwh=float(measured.sum() * hours),
        summed_kwh=float(each.sum() * hours),
        unaccounted_share=share,
        unaccounted_kw=by_interval,
    )
    worst = int(np.nanargmax(np.abs(by_interval)))
    doubtful = not abs(share) <= DOUBTFUL_SHARE or share < 0.0
    findings = [
        Finding(
            rule="reconciliation",
            severity="caution" if doubtful else "note",
            count=count,
            message=f"the group's meter shows {result.measured_kwh:.6g} kWh, the customers together "
            f"{result.summed_kwh:.6g} kWh: {100.0 * share:.2f} % unaccounted for, most in the interval that begins "
            f"{worst * interval_min // 60:02d}:{worst * interval_min % 60:02d} "
            f"({by_interval[worst]:.3g} kW on average)",
            effect="losses, unmetered load, or customers missing or too many; nothing is corrected",
        )
    ]
    findings.extend(_suspected_links(customers, each, difference, count))
    return result, tuple(findings)


def _suspected_links(
    customers: tuple[str, ...], each: NDArray[np.float64], difference: NDArray[np.float64], count: int
) -> list[Finding]:
    spread = float(difference.std())
    found = []
    for c, name in enumerate(customers):
        row = each[c] - each[c].mean()
        energy = float(row @ row)
        if energy == 0.0:
            continue
        # Least squares of the difference on this customer: -1 where it is counted but not behind the meter.
        slope = float(row @ (difference - difference.mean())) / energy
        without = float((difference + each[c]).std())
        if slope < -0.5 and without * TWICE < spread:
            found.append(
                Finding(
                    rule="suspected wrong link",
                    severity="caution",
                    customer=name,
                    count=count,
                    message="without this customer the sum follows the group's meter "
                    f"{spread / max(without, 1e-12):.3g} times as closely (slope "
                    f"{slope:.2f} where -1 means that it is not behind the meter)",
                    effect="kept; check which transformer serves it",
                )
            )
    return found
