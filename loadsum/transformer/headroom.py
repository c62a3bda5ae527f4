"""Headroom: how many more customers, chargers or kW each rating carries and still meets every criterion."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from loadsum.demand.hourly import GroupDemand

MOST = 4096


@dataclass(frozen=True, slots=True, kw_only=True)
class Headroom:
    """Room left at one rating.

    Parameters
    ----------
    rating_kva : float
        Nameplate rating. [kVA]
    what : str
        What is added one by one.
    count : int or None
        Most that can be added with every criterion met; None where not even the load as it is meets them. [-]
    kw : float or None
        Mean demand of so many in their highest interval, or the block itself. [kW]
    limited_by : str
        Quantity of the criterion that the next one breaks; empty where the search ended first.
    at_least : bool
        Whether the search ended at its largest number with every criterion still met.
    """

    rating_kva: float
    what: str
    count: int | None
    kw: float | None
    limited_by: str
    at_least: bool


def headroom(
    ratings_kva: Sequence[float],
    what: str,
    demand_with: Callable[[int], GroupDemand],
    meets: Callable[[GroupDemand, float], bool | None],
    *,
    kw_each: float,
    limited_by: Callable[[GroupDemand, float], str] | None = None,
    most: int = MOST,
) -> tuple[Headroom, ...]:
    """Room left at each rating for one kind of load.

    Parameters
    ----------
    ratings_kva : sequence of float
        Ratings, increasing. [kVA]
    what : str
        What is added.
    demand_with : callable
        Demand model of the group with so many added; asked once for each number.
    meets : callable
        Whether a rating meets every criterion for a demand; a criterion that the data do not decide is not met.
    kw_each : float
        Mean demand of one in its highest interval. [kW]
    limited_by : callable or None
        Quantity of the criterion that a demand breaks at a rating.
    most : int
        Largest number looked at. [-]

    Raises
    ------
    ValueError
        The load added generates: room then need not fall with the number, and halving would be wrong.

    Notes
    -----
    Load that is not negative never lowers an exceedance, so the criteria are met up to some number and not beyond:
    the number is doubled until they fail and then halved in. A higher rating starts from the room of the lower one.
    """
    if kw_each < 0.0:
        raise ValueError(f"{what!r} generates ({kw_each} kW); headroom is for load")
    made: dict[int, GroupDemand] = {}

    def good(count: int, rating: float) -> bool:
        if count not in made:
            made[count] = demand_with(count)
        return meets(made[count], rating) is True

    rows = []
    least = 0
    for rating in ratings_kva:
        if not good(0, rating):
            reason = limited_by(made[0], rating) if limited_by is not None else ""
            rows.append(Headroom(rating_kva=rating, what=what, count=None, kw=None, limited_by=reason, at_least=False))
            continue
        low, high = least, max(least, 1)
        while high <= most and good(high, rating):
            low, high = high, 2 * high
        ended = high > most
        high = min(high, most + 1)
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (middle, high) if good(middle, rating) else (low, middle)
        ended = ended and low == most
        least = low
        reason = ""
        if limited_by is not None and not ended:
            good(low + 1, rating)
            reason = limited_by(made[low + 1], rating)
        rows.append(
            Headroom(rating_kva=rating, what=what, count=low, kw=low * kw_each, limited_by=reason, at_least=ended)
        )
    return tuple(rows)
