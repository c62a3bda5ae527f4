"""Scenarios, headroom and laws as the study file asks for them."""

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.planned import Planned
from loadsum.peak.additions import AddedLoad, profiled, switched
from loadsum.peak.scenarios import Growth, Pickup, Scenario
from loadsum.study.loadtocome import Addition, ScenarioKeys
from loadsum.study.tables import Study


def scenarios_asked(
    study: Study, *, interval_min: int, profiles: Mapping[str, NDArray[np.float64]], customers: Mapping[str, int]
) -> tuple[Scenario, ...]:
    """Scenarios of a study file, the load as it is first.

    Parameters
    ----------
    study : Study
        Checked study.
    interval_min : int
        Demand interval. [min]
    profiles : mapping of str to (D, I) float64
        Demand of one device by the name of its profile file. [kW]
    customers : mapping of str to int
        Number of customers served, by class. [-]
    """
    if not study.scenario:
        return ()
    made = [Scenario(name="load as it is")]
    for keys in study.scenario:
        own = [row for row in study.addition if row.scenario == keys.name]
        made.append(
            Scenario(
                name=keys.name,
                note=keys.note,
                customers=tuple(
                    Planned(customer_class=row.customer_class, count=row.count, annual_kwh=row.annual_kwh)
                    for row in own
                    if row.kind == "customers" and row.count
                ),
                loads=tuple(added_load(row, interval_min, profiles) for row in own if row.kind != "customers"),
                growth=_growth(keys, customers),
                first_year=keys.first_year,
                horizon_years=keys.horizon_years,
                pickup=Pickup(
                    factor=keys.pickup_factor, duration_h=keys.pickup_h, outages_per_year=keys.outages_per_year
                )
                if keys.pickup_factor > 0.0
                else None,
            )
        )
    return tuple(made)


def headroom_asked(study: Study) -> tuple[Addition, ...]:
    """Additions of a study file that belong to no scenario: what headroom is counted in."""
    return tuple(row for row in study.addition if not row.scenario)


def added_load(row: Addition, interval_min: int, profiles: Mapping[str, NDArray[np.float64]]) -> AddedLoad:
    """One addition that is a device or a block."""
    together = row.synchronised or row.kind == "block"
    if row.profile:
        return profiled(
            row.name, row.count, profiles[row.profile], synchronised=together, seasons=row.seasons, hours=row.hours
        )
    shares: Sequence[float] = row.share_by_hour or (1.0,) * 24
    if row.hours:
        shares = [share if hour in row.hours else 0.0 for hour, share in enumerate(shares)]
    return switched(
        row.name, row.count, row.kw, shares, interval_min=interval_min, synchronised=together, seasons=row.seasons
    )


def _growth(keys: ScenarioKeys, customers: Mapping[str, int]) -> Growth | None:
    if keys.growth_pct_per_year == 0.0:
        return None
    if keys.growth_of == "customer class":
        return Growth(pct_per_year=keys.growth_pct_per_year, of="customer class", customer_class=keys.growth_class)
    if keys.growth_of == "number of customers":
        name = keys.growth_class or (next(iter(customers)) if len(customers) == 1 else "")
        if name not in customers:
            raise ValueError(f"scenario {keys.name!r}: no customer of class {name!r} is served")
        return Growth(
            pct_per_year=keys.growth_pct_per_year,
            of="number of customers",
            customer_class=name,
            customers=customers[name],
        )
    return Growth(pct_per_year=keys.growth_pct_per_year)
