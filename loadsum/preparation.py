"""The group of one transformer, made ready for the demand model: for a study and for its hold-out test alike."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.group import Group, group_demand
from loadsum.demand.hourly import GroupDemand
from loadsum.demand.served import (
    Served,
    cannot_be_studied,
    held_out_settings,
    scaled,
    served_by,
    settings_of,
    with_unmetered_block,
)
from loadsum.intake.hourclass import DayBlock
from loadsum.intake.load import Loaded
from loadsum.intake.readings import shared_resolution
from loadsum.study.checks import billed_kwh
from loadsum.study.tables import Study
from loadsum.study.unittables import Transformer


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Prepared:
    """The group of one transformer, ready for the demand model.

    Parameters
    ----------
    served : Served
        Who is served, and on what footing.
    usable : (n,) int64
        Customers of the study with readings. [-]
    allowance : float
        Factor for losses between the meters and the transformer. [-]
    group : Group
        The same for the demand model, the unmetered block among them.
    blocks : sequence of DayBlock
        Their readings.
    resolution_kw : float
        Resolution that all readings share; 0 where there is none. [kW]
    """

    served: Served
    usable: NDArray[np.int64]
    allowance: float
    group: Group
    blocks: Sequence[DayBlock]
    resolution_kw: float


def prepared(asked: Study, unit: Transformer, loaded: Loaded, blocks: Sequence[DayBlock]) -> Prepared | str:
    """The group of a transformer; where it cannot be studied, the reason."""
    readings = loaded.readings
    usable = np.flatnonzero((np.isfinite(readings.kw) & ~readings.estimated).any(axis=1))
    served = served_by(
        unit.id,
        len(asked.transformer) == 1,
        asked.customer,
        [readings.customers[c] for c in usable],
        {customer.id: billed_kwh(customer) for customer in asked.customer},
        head=unit.feeder_head,
    )
    reason = cannot_be_studied(served)
    if reason:
        return reason
    allowance = 1.0 + unit.losses_allowance_pct / 100.0
    made = Prepared(
        served=served,
        usable=usable,
        allowance=allowance,
        group=served.group,
        blocks=(),
        resolution_kw=shared_resolution(readings) * allowance,
    )
    group, group_blocks = grouped(made, unit, blocks, readings.interval_min)
    return replace(made, group=group, blocks=group_blocks)


def grouped(
    group_of: Prepared, unit: Transformer, blocks: Sequence[DayBlock], interval_min: int
) -> tuple[Group, list[DayBlock]]:
    """A group and its readings of other blocks of the same meters, losses and the unmetered block counted."""
    metered = [scaled(block, group_of.usable, group_of.allowance) for block in blocks]
    return with_unmetered_block(group_of.served.group, metered, unit, interval_min)


def tester(
    asked: Study, unit: Transformer, loaded: Loaded, group_of: Prepared, judged: Group
) -> Callable[[Sequence[DayBlock]], GroupDemand]:
    """What makes the adopted model of a group from some of its days, for a hold-out test."""
    settings = held_out_settings(settings_of(asked.model), group_of.resolution_kw)
    return lambda fitting: group_demand(
        fitting,
        interval_min=loaded.readings.interval_min,
        power_factor=unit.power_factor,
        settings=settings,
        group=judged,
    )
