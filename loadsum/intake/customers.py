"""The customers of the study held against the readings: who is missing, who is too many, whose energy disagrees."""

from collections.abc import Iterator

import numpy as np

from loadsum.intake.findings import Finding
from loadsum.intake.readings import Readings
from loadsum.study.checks import billed_kwh
from loadsum.study.tables import Study

HOURS_PER_YEAR = 8766.0  # mean calendar year
SERVED = ("existing", "planned", "transferred in")
DOUBTFUL = 1.4  # metered energy that differs from the bills by more than this factor is doubtful
EXACT = 0.12  # so near to 2, 3 or 4 the factor points at power taken for energy
LEAST_SHARE_OF_YEAR = 0.75


def customer_findings(study: Study, readings: Readings) -> tuple[Finding, ...]:
    """What the list of customers and the readings have to say about one another.

    Parameters
    ----------
    study : Study
        Study with its customers; where it lists none every customer of the readings is served, and there is nothing
        to find.
    readings : Readings
        Aligned readings.
    """
    if not study.customer:
        return ()
    return (
        *_without_readings(study, readings),
        *_without_customer(study, readings),
        *_against_bills(study, readings),
        *_without_transformer(study),
        *_idle_transformers(study),
        *_of_other_transformers(study),
    )


def _without_readings(study: Study, readings: Readings) -> Iterator[Finding]:
    metered = set(readings.customers)
    for customer in study.customer:
        if customer.id in metered or customer.role in ("planned", "transferred in"):
            continue
        if customer.role == "reference only":
            effect = "it lends nothing to its class"
        elif billed_kwh(customer):
            effect = f"it takes the distribution of class {customer.customer_class}, scaled to its bills"
        else:
            effect = f"it takes the distribution of class {customer.customer_class} as it stands"
        yield Finding(
            rule="customer without readings",
            severity="caution",
            customer=customer.id,
            message="listed as a customer, but no file has readings of it",
            effect=effect,
        )


def _without_customer(study: Study, readings: Readings) -> Iterator[Finding]:
    listed = {customer.id for customer in study.customer}
    for index, name in enumerate(readings.customers):
        if name not in listed:
            count = int(np.isfinite(readings.kw[index]).sum())
            yield Finding(
                rule="readings without customer",
                severity="caution",
                customer=name,
                count=count,
                message=f"{count} readings of a customer that is not listed",
                effect="not used; add the customer, or leave its file out",
            )


def _against_bills(study: Study, readings: Readings) -> Iterator[Finding]:
    """Delivered energy of a year against the bills, where the readings cover most of a year."""
    place = {name: index for index, name in enumerate(readings.customers)}
    for customer in study.customer:
        billed, index = billed_kwh(customer), place.get(customer.id)
        if not billed or index is None or customer.role == "planned":
            continue
        kw = readings.kw[index]
        known = np.isfinite(kw)
        if known.sum() * readings.interval_min < LEAST_SHARE_OF_YEAR * HOURS_PER_YEAR * 60.0:
            continue
        metered = float(np.maximum(kw[known], 0.0).mean()) * HOURS_PER_YEAR
        ratio = metered / billed
        if 1.0 / DOUBTFUL <= ratio <= DOUBTFUL:
            continue
        larger = max(ratio, 1.0 / ratio) if ratio else float("inf")
        cause = "check the unit, the multiplier and the identifier"
        if round(larger, 0) in (2.0, 4.0) and abs(larger / round(larger) - 1.0) < EXACT:
            minutes = 60 // round(larger)
            cause = f"so it would be if {minutes}-min power were taken for energy, or the reverse; check the unit"
        yield Finding(
            rule="energy against bills",
            severity="caution",
            customer=customer.id,
            count=int(known.sum()),
            message=f"{metered:.0f} kWh a year metered, {billed:.0f} kWh billed: {ratio:.2f} times as much; {cause}",
            effect="kept as read; nothing was scaled",
        )


def _without_transformer(study: Study) -> Iterator[Finding]:
    if len(study.transformer) < 2:
        return
    for customer in study.customer:
        if not customer.transformer and customer.role in SERVED:
            yield Finding(
                rule="customer without transformer",
                severity="caution",
                customer=customer.id,
                message="the study has several transformers, and none of them is named for this customer",
                effect="in no transformer's demand",
            )


def _idle_transformers(study: Study) -> Iterator[Finding]:
    if len(study.transformer) < 2:
        return
    served = {customer.transformer for customer in study.customer if customer.role in SERVED}
    for unit in study.transformer:
        if unit.id not in served and not unit.feeder_head:
            yield Finding(
                rule="transformer without customers",
                severity="caution",
                place=unit.id,
                message=f"no customer is connected to transformer {unit.id}",
                effect="no results for it",
            )


def _of_other_transformers(study: Study) -> Iterator[Finding]:
    if len(study.transformer) > 1 or not study.transformer[0].id:
        return
    others = [c for c in study.customer if c.transformer and c.transformer != study.transformer[0].id]
    if others:
        yield Finding(
            rule="customers of other transformers",
            severity="note",
            count=len(others),
            message=f"{len(others)} listed customers name another transformer than {study.transformer[0].id}",
            effect="not served here; those with readings lend them to their class",
        )
