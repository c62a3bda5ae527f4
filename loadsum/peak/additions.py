"""Load added to a group: each device by its own readings or a stated law per hour, diversified or as one block."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.convolution import BracketedSum, DemandSum, plain_distributions
from loadsum.demand.hourly import GroupDemand, HourDemand
from loadsum.demand.lattice import LatticeMass, lattice_mass
from loadsum.demand.samplingerror import Resamples
from loadsum.demand.temperature import TemperatureResponse
from loadsum.intake.readings import read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class AddedLoad:
    """Like devices, or a block of load, added to every day of the classes stated.

    Parameters
    ----------
    name : str
        What is added.
    count : int
        How many. [-]
    kw : tuple of I (n,) float64
        What one device may draw in each interval of the day; negative where it generates. [kW]
    weight : tuple of I (n,) float64
        Probability of each. [-]
    synchronised : bool
        Whether all act as one block (timer, tariff start, the same sun), not independently of each other.
    seasons : tuple of str
        Seasons in which it is there; all when empty.
    """

    name: str
    count: int
    kw: tuple[NDArray[np.float64], ...]
    weight: tuple[NDArray[np.float64], ...]
    synchronised: bool
    seasons: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if self.count < 0:
            raise ValueError(f"count of {self.name!r} must not be negative, got {self.count}")
        for i, (kw, weight) in enumerate(zip(self.kw, self.weight, strict=True)):
            if kw.size == 0 or kw.shape != weight.shape or abs(float(weight.sum()) - 1.0) > 1e-9 or weight.min() < 0.0:
                raise ValueError(f"{self.name!r}, interval {i}: need weights that sum to 1, got {weight.sum()}")
            read_only(kw)
            read_only(weight)

    def of(self, count: int) -> "AddedLoad":
        """The same in another number."""
        return replace(self, count=count)


def switched(
    name: str,
    count: int,
    kw: float,
    share_by_hour: Sequence[float],
    *,
    interval_min: int,
    synchronised: bool,
    seasons: tuple[str, ...] = (),
) -> AddedLoad:
    """Devices that draw one power or none, with a stated probability for each hour of the day.

    Parameters
    ----------
    kw : float
        Power of one device while it is on. [kW]
    share_by_hour : sequence of 24 float
        Probability that a device is on in each hour of the day. [-]
    """
    if len(share_by_hour) != 24 or not all(0.0 <= share <= 1.0 for share in share_by_hour):
        raise ValueError(f"{name!r} needs 24 probabilities between 0 and 1, got {list(share_by_hour)}")
    hour = [i * interval_min // 60 for i in range(1440 // interval_min)]
    return AddedLoad(
        name=name,
        count=count,
        kw=tuple(np.array([0.0, kw]) for _ in hour),
        weight=tuple(np.array([1.0 - share_by_hour[h], share_by_hour[h]]) for h in hour),
        synchronised=synchronised,
        seasons=seasons,
    )


def profiled(
    name: str,
    count: int,
    days_kw: NDArray[np.float64],
    *,
    synchronised: bool,
    seasons: tuple[str, ...] = (),
    hours: Sequence[int] = (),
) -> AddedLoad:
    """Devices by readings of one or many days, each day equally likely.

    Parameters
    ----------
    days_kw : (D, I) float64
        Average demand of one device in each interval of each day. [kW]
    hours : sequence of int
        Hours of the day at which it is there; all when empty.
    """
    if days_kw.ndim != 2 or not np.isfinite(days_kw).all():
        raise ValueError(f"the profile of {name!r} must be whole days, got {days_kw.shape}")
    intervals = days_kw.shape[1]
    there = np.isin(np.arange(intervals) * 24 // intervals, hours) if len(hours) else np.ones(intervals, dtype=np.bool_)
    columns = [np.where(there[i], days_kw[:, i], 0.0) for i in range(intervals)]
    return AddedLoad(
        name=name,
        count=count,
        kw=tuple(columns),
        weight=tuple(np.full(column.size, 1.0 / column.size) for column in columns),
        synchronised=synchronised,
        seasons=seasons,
    )


def with_added(demand: GroupDemand, added: Sequence[AddedLoad]) -> GroupDemand:
    """The group with load added, independent of the load that is there; intervals without readings stay without.

    Raises
    ------
    ValueError
        An addition has another number of intervals in the day.
    """
    intervals = len(demand.hours[0])
    for load in added:
        if len(load.kw) != intervals:
            raise ValueError(f"{load.name!r} has {len(load.kw)} intervals in the day, the study {intervals}")
    hours = []
    for block, row in zip(demand.blocks, demand.hours, strict=True):
        here = [load for load in added if load.count and (not load.seasons or block.season in load.seasons)]
        hours.append(tuple(None if hour is None else _with(hour, here) for hour in row))
    return replace(demand, hours=tuple(hours))


def scaled_demand(demand: GroupDemand, factor: float) -> GroupDemand:
    """The group with every reading multiplied by a factor above 0; exact, because the lattice is stretched with it."""
    if not factor > 0.0:
        raise ValueError(f"factor must be above 0, got {factor}")
    if factor == 1.0:
        return demand
    return replace(
        demand,
        hours=tuple(tuple(None if hour is None else _stretched(hour, factor) for hour in row) for row in demand.hours),
        sums_kw=tuple(sums * factor for sums in demand.sums_kw),
    )


def _with(hour: HourDemand, added: Sequence[AddedLoad]) -> HourDemand:
    """One interval with load added."""
    added = [load for load in added if np.any(load.kw[hour.interval][load.weight[hour.interval] > 0.0])]
    if not added:
        return hour
    step = hour.total.up.step_kw
    ends: dict[str, list[tuple[LatticeMass, int]]] = {"down": [], "up": []}
    for load in added:
        kw, weight = load.kw[hour.interval], load.weight[hour.interval]
        size, copies = (float(load.count), 1) if load.synchronised else (1.0, load.count)
        down = lattice_mass(kw * size, step, "down", weight)
        up = lattice_mass(kw * size, step, "up", weight)
        ends["down"].append((down, copies))
        ends["up"].append((up, copies))
    total = _extended(hour.total, ends)
    extra = DemandSum(terms=tuple(term for term, _ in ends["up"]), counts=tuple(n for _, n in ends["up"]))
    variance = extra.variance_kw2()
    whole_down, whole_up = plain_distributions(total)
    independent = DemandSum(terms=(hour.independent, *extra.terms), counts=(1, *extra.counts))
    return replace(
        hour,
        total=total,
        still=_extended(hour.still, ends),
        whole_down=whole_down,
        whole_up=whole_up,
        response=_with_steady(hour, variance),
        independent=plain_distributions(BracketedSum(down=independent, up=independent))[0],
        covariance_variance_kw2=hour.covariance_variance_kw2 + variance,
        can_export=hour.can_export or any(float(load.kw[hour.interval].min()) < 0.0 for load in added),
        resamples=_with_certain(hour, variance),
    )


def _extended(total: BracketedSum, ends: dict[str, list[tuple[LatticeMass, int]]]) -> BracketedSum:
    down, up = (
        DemandSum(
            terms=(*side.terms, *(term for term, _ in ends[name])), counts=(*side.counts, *(n for _, n in ends[name]))
        )
        for name, side in (("down", total.down), ("up", total.up))
    )
    same = all(
        a.offset == b.offset and np.array_equal(a.mass, b.mass)
        for (a, _), (b, _) in zip(ends["down"], ends["up"], strict=True)
    )
    return BracketedSum(down=up, up=up) if total.exact and same else BracketedSum(down=down, up=up)


def _with_certain(hour: HourDemand, variance_kw2: float) -> Resamples | None:
    """Resampled weeks move the metered part only; load added as stated does not move."""
    if hour.resamples is None:
        return None
    own = hour.variance_kw2()
    both = own + variance_kw2
    stretch = np.sqrt((hour.resamples.stretch**2 * own + variance_kw2) / both) if both > 0.0 else hour.resamples.stretch
    return replace(hour.resamples, shift_kw=hour.resamples.shift_kw.copy(), stretch=stretch)


def _with_steady(hour: HourDemand, variance_kw2: float) -> TemperatureResponse | None:
    """Temperature stretches the metered part only: less of the whole, the more is added."""
    if hour.response is None or hour.response.power == 0.0:
        return hour.response
    own = hour.variance_kw2()
    return replace(hour.response, power=hour.response.power * own / (own + variance_kw2))


def _stretched(hour: HourDemand, factor: float) -> HourDemand:
    """One interval with every demand multiplied."""

    def mass(term: LatticeMass) -> LatticeMass:
        return replace(term, step_kw=term.step_kw * factor)

    def both(total: BracketedSum) -> BracketedSum:
        up = replace(total.up, terms=tuple(mass(term) for term in total.up.terms))
        if total.exact:
            return BracketedSum(down=up, up=up)
        return BracketedSum(down=replace(total.down, terms=tuple(mass(term) for term in total.down.terms)), up=up)

    response = hour.response
    if response is not None:
        response = replace(
            response,
            slope_kw_per_k=response.slope_kw_per_k * factor,
            covariance=response.covariance * factor**2,
            level_kw=response.level_kw * factor,
        )
    moved = hour.resamples
    if moved is not None:
        moved = replace(moved, shift_kw=moved.shift_kw * factor, stretch=moved.stretch.copy())
    return replace(
        hour,
        total=both(hour.total),
        still=both(hour.still),
        whole_down=mass(hour.whole_down),
        whole_up=mass(hour.whole_up),
        independent=mass(hour.independent),
        shared=None if hour.shared is None else mass(hour.shared),
        response=response,
        covariance_variance_kw2=hour.covariance_variance_kw2 * factor**2,
        mean_variance_kw2=hour.mean_variance_kw2 * factor**2,
        resamples=moved,
    )
