"""Scenarios and headroom of one transformer, judged by the same criteria as the choice of rating."""

from collections.abc import Callable, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand
from loadsum.demand.planned import Planned
from loadsum.errors import Fault, InputError
from loadsum.peak.additions import with_added
from loadsum.peak.asked import added_load, headroom_asked, scenarios_asked
from loadsum.peak.scenarios import Rebuild, ScenarioResult, compare
from loadsum.study.loadtocome import Addition
from loadsum.study.tables import Study
from loadsum.transformer.headroom import Headroom, headroom
from loadsum.transformer.loading import NORMAL, allowed_pu
from loadsum.transformer.selection import evaluate


def load_to_come(
    study: Study,
    demand: GroupDemand,
    ratings_kva: Sequence[float],
    *,
    profiles: Mapping[str, NDArray[np.float64]],
    customers: Mapping[str, int],
    rebuild: Rebuild,
) -> tuple[tuple[ScenarioResult, ...], tuple[Headroom, ...]]:
    """Scenarios side by side, and the room each rating has left; empty where the study file asks for none.

    Parameters
    ----------
    study : Study
        Checked study.
    demand : GroupDemand
        Demand model of the group as it is.
    ratings_kva : sequence of float
        Ratings, increasing. [kVA]
    profiles : mapping of str to (D, I) float64
        Demand of one device by the name of its profile file. [kW]
    customers : mapping of str to int
        Number of customers served, by class. [-]
    rebuild : callable
        Demand model of the group with further customers and with the readings of some classes multiplied.

    Raises
    ------
    InputError
        Headroom is asked for in something that generates.

    Notes
    -----
    Hours are those above the normal loading allowed, or above nameplate where none is stated. Criteria that need demand
    paths (temperatures, ageing, annual probability) are not judged here: only exceedance criteria are, and a scenario
    that meets them may fail the others.
    """
    criteria = [criterion for criterion in study.criterion if criterion.quantity in JUDGED]
    meets: Callable[[GroupDemand, float], bool | None] | None = None
    if criteria:

        def judged(changed: GroupDemand, rating: float) -> bool | None:
            rows = [
                row.by_rating[0].meets for row in evaluate(changed, [rating], criteria, study.allowed_loading).criteria
            ]
            return False if False in rows else None if None in rows else True

        meets = judged
    share = allowed_pu(demand, NORMAL, study.allowed_loading)
    scenarios = compare(
        demand,
        scenarios_asked(study, interval_min=demand.interval_min, profiles=profiles, customers=customers),
        ratings_kva,
        share=share.tolist(),
        meets=meets,
        rebuild=rebuild,
    )
    rooms: list[Headroom] = []
    if meets is not None:
        for row in headroom_asked(study):
            rooms.extend(_room(study, demand, ratings_kva, row, profiles, rebuild, meets))
    return scenarios, tuple(rooms)


JUDGED = ("exceedance hours per year", "exceedance probability in any interval")


def _room(
    study: Study,
    demand: GroupDemand,
    ratings_kva: Sequence[float],
    row: Addition,
    profiles: Mapping[str, NDArray[np.float64]],
    rebuild: Rebuild,
    meets: Callable[[GroupDemand, float], bool | None],
) -> tuple[Headroom, ...]:
    def limited_by(changed: GroupDemand, rating: float) -> str:
        criteria = [criterion for criterion in study.criterion if criterion.quantity in JUDGED]
        found = evaluate(changed, [rating], criteria, study.allowed_loading).criteria
        return next((result.quantity for result in found if result.by_rating[0].meets is not True), "")

    if row.kind == "customers":

        def with_more(count: int) -> GroupDemand:
            if count == 0:
                return demand
            return rebuild([Planned(customer_class=row.customer_class, count=count, annual_kwh=row.annual_kwh)], {})

        each = _highest_mean_kw(with_more(1)) - _highest_mean_kw(demand)
    else:
        load = added_load(row, demand.interval_min, profiles)

        def with_more(count: int) -> GroupDemand:
            return with_added(demand, [load.of(count)])

        each = max(float(kw @ weight) for kw, weight in zip(load.kw, load.weight, strict=True))
        if min(float(kw.min()) for kw in load.kw) < 0.0:
            fault = Fault("addition", f"{row.name!r} generates; headroom is counted in load: give it a scenario")
            raise InputError("study file", [fault])
    return headroom(ratings_kva, row.name, with_more, meets, kw_each=max(each, 0.0), limited_by=limited_by)


def _highest_mean_kw(demand: GroupDemand) -> float:
    return max(hour.mean_kw() for row in demand.hours for hour in row if hour is not None)
