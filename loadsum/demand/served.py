"""Who a transformer serves, and who else was metered: customers of the study -> group of the demand model."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.group import Group
from loadsum.demand.planned import Planned
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import Calendar, DayBlock, lagged_daily_mean
from loadsum.intake.readings import TemperatureRecord
from loadsum.study.tables import Customer, ModelKeys
from loadsum.study.unittables import Transformer

COUNTS = ("existing", "planned", "transferred in")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Served:
    """Customers of one transformer.

    Parameters
    ----------
    group : Group
        The group as the demand model takes it.
    customers : tuple of Customer
        Customers that count, metered or not.
    without_readings : tuple of str
        Customers that count, have no readings and give no energy: they stand as typical members of their class.
    impossible : tuple of str
        Customers that count and that no metered customer of their class can stand for.
    """

    group: Group
    customers: tuple[Customer, ...]
    without_readings: tuple[str, ...]
    impossible: tuple[str, ...]


def served_by(
    unit: str,
    alone: bool,
    listed: Sequence[Customer],
    metered: Sequence[str],
    annual_kwh: Mapping[str, float],
    *,
    head: bool = False,
) -> Served:
    """The group of one transformer.

    Parameters
    ----------
    unit : str
        Asset number of the transformer.
    alone : bool
        Whether it is the only one of the study: then customers need not name it.
    listed : sequence of Customer
        Customers of the study; every metered customer as one class where none is listed.
    metered : sequence of str
        Identifiers in the order of the readings' rows; only those with a usable reading.
    annual_kwh : mapping of str to float
        Billed energy per year of customers that give it. [kWh]
    head : bool
        Whether it is the head of the feeder, which serves the customers of every transformer.
    """
    known = {customer.id: customer for customer in listed}
    if not listed:
        known = {name: Customer(id=name) for name in metered}
    classes = tuple(known[name].customer_class if name in known else "" for name in metered)

    def counts(customer: Customer) -> bool:
        here = head or customer.transformer == unit or (alone and not customer.transformer)
        return here and customer.role in COUNTS

    inside = [customer for customer in known.values() if counts(customer)]
    names = {customer.id for customer in inside}
    served = np.array([name in names for name in metered], dtype=bool)
    planned, bare, impossible = [], [], []
    for customer in inside:
        if customer.id in metered:
            continue
        if customer.customer_class not in classes:
            impossible.append(customer.id)
            continue
        energy = annual_kwh.get(customer.id, 0.0)
        if energy == 0.0:
            bare.append(customer.id)
        planned.append(Planned(customer_class=customer.customer_class, count=customer.count, annual_kwh=energy))
    return Served(
        group=Group(
            served=served,
            classes=classes,
            planned=tuple(planned),
            may_export=np.array([name in known and known[name].export for name in metered], dtype=bool),
        ),
        customers=tuple(inside),
        without_readings=tuple(bare),
        impossible=tuple(impossible),
    )


UNMETERED = "unmetered block"


def cannot_be_studied(served: Served) -> str:
    """Why a transformer cannot be studied; empty where it can."""
    if served.impossible:
        named = ", ".join(served.impossible[:5]) + (", ..." if len(served.impossible) > 5 else "")
        return f"no metered customer is of the class of {named}; add a reference class or their readings"
    if not served.customers:
        return "no customer is served by it; check the transformer of each customer"
    return ""


def scaled(block: DayBlock, rows: NDArray[np.int64], factor: float) -> DayBlock:
    """Readings of some customers with an allowance for losses between meters and transformer."""
    return replace(block, kw=block.kw[rows] * factor, kvar=None if block.kvar is None else block.kvar[rows] * factor)


def with_unmetered_block(
    group: Group, blocks: Sequence[DayBlock], unit: Transformer, interval_min: int
) -> tuple[Group, list[DayBlock]]:
    """The group with the stated unmetered block as one more customer that does the same every day."""
    if unit.unmetered_kw == 0.0:
        return group, list(blocks)
    intervals = blocks[0].kw.shape[2]
    hour = np.arange(intervals) * interval_min // 60
    runs = np.isin(hour, unit.unmetered_hours) if unit.unmetered_hours else np.ones(intervals, dtype=bool)
    profile = np.where(runs, unit.unmetered_kw, 0.0)
    extended = [
        replace(
            block,
            kw=np.concatenate([block.kw, np.broadcast_to(profile, (1, *block.kw.shape[1:]))]),
            kvar=None if block.kvar is None else np.concatenate([block.kvar, np.zeros((1, *block.kvar.shape[1:]))]),
        )
        for block in blocks
    ]
    return replace(
        group,
        served=np.append(group.served, True),
        classes=(*group.classes, UNMETERED),
        may_export=None if group.may_export is None else np.append(group.may_export, False),
    ), extended


def numbers_by_class(customers: Sequence[Customer]) -> dict[str, int]:
    """Number of customers of each class. [-]"""
    found: dict[str, int] = {}
    for customer in customers:
        found[customer.customer_class] = found.get(customer.customer_class, 0) + customer.count
    return found


def with_more(
    group: Group, blocks: Sequence[DayBlock], planned: Sequence[Planned], factors: Mapping[str, float]
) -> tuple[Group, list[DayBlock]]:
    """The group with further customers, and with the readings of some classes multiplied.

    Parameters
    ----------
    group, blocks
        The group as it is.
    planned : sequence of Planned
        Customers to come.
    factors : mapping of str to float
        Factor on every reading of a class; 1 where a class is not named. [-]
    """
    own = np.array([factors.get(name, 1.0) for name in group.classes])
    grown = [replace(block, kw=block.kw * own[:, None, None]) if factors else block for block in blocks]
    before = [
        replace(entry, annual_kwh=entry.annual_kwh * factors.get(entry.customer_class, 1.0)) for entry in group.planned
    ]
    return replace(group, planned=(*before, *planned)), grown


def settings_of(keys: ModelKeys) -> ModelSettings:
    """Settings of the demand model that the study file asks for."""
    standard = ModelSettings()
    return ModelSettings(
        temperature=keys.temperature,
        common_component=keys.common_component,
        shrinkage=keys.shrinkage,
        mean_uncertainty=keys.mean_uncertainty,
        borrowed_days=keys.borrowed_days or standard.borrowed_days,
        lattice_kw=keys.lattice_w / 1000.0,
        correlation=None if keys.correlation < 0.0 else keys.correlation,
        resamples=keys.resamples,
    )


def record_by_class(
    record: TemperatureRecord | None, days: Calendar
) -> dict[tuple[str, str], NDArray[np.float64]] | None:
    """Lagged daily means of a temperature record by season and day type; None where there is no record. [°C]"""
    if record is None:
        return None
    found: dict[tuple[str, str], list[float]] = {}
    for day, value in lagged_daily_mean(record).items():
        s, k = days.place(day)
        found.setdefault((days.season_names[s], days.day_types[k]), []).append(value)
    return {key: np.array(values) for key, values in found.items()}


def held_out_settings(settings: ModelSettings, resolution_kw: float) -> ModelSettings:
    """The same model for the hold-out test, which asks for levels only: no intervals, and a coarser lattice. [kW]"""
    return replace(settings, resamples=0, lattice_kw=max(resolution_kw, 0.02))


def tested_group(group: Group, metered: bool) -> tuple[Group, str]:
    """The metered customers that a hold-out test can judge, and what to say of them.

    Where nobody served is metered, the customers metered elsewhere stand in: the test then judges the model on them.
    """
    if metered:
        return replace(group, planned=()), ""
    elsewhere = np.array([name not in ("", UNMETERED) for name in group.classes], dtype=bool)
    note = "No customer served is metered; the customers metered elsewhere were tested in their place, as one group."
    return replace(group, planned=(), served=elsewhere), note
