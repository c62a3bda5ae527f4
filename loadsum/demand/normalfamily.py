"""How far off the customary normal laws are on this group, where each rating is exceeded most."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.convolution import sum_distribution
from loadsum.demand.hourly import GroupDemand, HourDemand
from loadsum.demand.lattice import LatticeMass, lattice_mass, mixture
from loadsum.demand.normal import berry_esseen_bound, normal_comparison
from loadsum.demand.normalreach import NormalReach, customers_until_normal

EXCEEDED_WITH = (0.01, 0.001)
STEPS_IN_A_DEVIATION = 24  # of one customer: lattice on which numbers of customers are tried


@dataclass(frozen=True, slots=True, kw_only=True)
class NormalAtRating:
    """Probabilities at one rating, in the demand interval that adds most to its expected hours.

    Parameters
    ----------
    rating_kva, level_kw : float
        Rating, and the demand that reaches the loading judged. [kVA, kW]
    season, day_type : str
        Class of days.
    interval : int
        Demand interval of the day. [-]
    adopted, floor : float
        By the adopted model, and the smallest that the record supports. [-]
    normal_independent, normal_covariance : float
        By the normal law with the customers' variances added, and with the variance of the model. [-]
    cumulant_corrected : float
        With the third and fourth cumulant of the model; can be negative. [-]
    saddlepoint : float
        By the lattice form of the saddlepoint formula; NaN where it says nothing. [-]
    times_too_small : float
        How many times the adopted probability is that of the normal law with covariance. [-]
    largest_distance : float
        Berry-Esseen bound on the distance of a normal law from the sum of the model's independent parts. [-]
    """

    rating_kva: float
    level_kw: float
    season: str
    day_type: str
    interval: int
    adopted: float
    floor: float
    normal_independent: float
    normal_covariance: float
    cumulant_corrected: float
    saddlepoint: float
    times_too_small: float
    largest_distance: float


@dataclass(frozen=True, slots=True, kw_only=True)
class NormalFamily:
    """The normal family beside the adopted model.

    Parameters
    ----------
    by_rating : tuple of NormalAtRating
        One for each rating; ratings that are never reached are left out.
    season, day_type : str
        Class of days in which numbers of customers were tried.
    interval : int
        Demand interval of the day in which they were. [-]
    customers : int
        Customers of the group. [-]
    independent, together : tuple of NormalReach
        From how many customers like these the normal law with the right variance would do, at each probability, if
        they were independent, and as they are, with what they share. [-]
    """

    by_rating: tuple[NormalAtRating, ...]
    season: str
    day_type: str
    interval: int
    customers: int
    independent: tuple[NormalReach, ...]
    together: tuple[NormalReach, ...]


def normal_family(demand: GroupDemand, levels_kva: Mapping[float, NDArray[np.float64]]) -> NormalFamily | None:
    """The normal family at every rating, and the numbers of customers from which it would do.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    levels_kva : mapping of float to (B,) float64
        Level judged in each class of days, by rating. [kVA -> kVA]
    """
    hours = demand.hours_in_year()
    present = [(b, hour, hours[b, i]) for b, row in enumerate(demand.hours) for i, hour in enumerate(row) if hour]
    if not present:
        return None
    ratings = list(levels_kva)
    level_kva = np.array([levels_kva[rating] for rating in ratings]).reshape(len(ratings), len(demand.blocks))
    added = np.array([length * hour.exceedances_kva(level_kva[:, b]).value for b, hour, length in present])
    rows = []
    for n, (rating, most) in enumerate(zip(ratings, added.argmax(axis=0).tolist(), strict=True)):
        if added[most, n] > 0.0:
            b, hour, _ = present[most]
            rows.append(_at_rating(rating, float(level_kva[n, b]), hour))
    b, busiest, _ = max(present, key=lambda entry: entry[1].quantile_kw(EXCEEDED_WITH[0]))
    customer, shared = _one_customer(busiest, demand.blocks[b].temperature_c)
    count = sum(busiest.still.up.counts[: busiest.own_terms])
    return NormalFamily(
        by_rating=tuple(rows),
        season=busiest.season,
        day_type=busiest.day_type,
        interval=busiest.interval,
        customers=count,
        independent=_reaches(customer, None),
        together=_reaches(customer, shared),
    )


def _at_rating(rating_kva: float, level_kva: float, hour: HourDemand) -> NormalAtRating:
    level_kw = level_kva * hour.power_factor
    found = normal_comparison(hour.total.up, np.array([level_kw]), hour.independent.central_moment(2))
    adopted = hour.exceedance(level_kw).value
    normal = float(found.normal_covariance[0])
    return NormalAtRating(
        rating_kva=rating_kva,
        level_kw=level_kw,
        season=hour.season,
        day_type=hour.day_type,
        interval=hour.interval,
        adopted=adopted,
        floor=hour.floor,
        normal_independent=float(found.normal_independent[0]),
        normal_covariance=normal,
        cumulant_corrected=float(found.cumulant_corrected[0]),
        saddlepoint=float(found.saddlepoint[0]),
        times_too_small=adopted / normal if normal > 0.0 else float("inf"),
        largest_distance=berry_esseen_bound(hour.still.up),
    )


def _one_customer(
    hour: HourDemand, temperature_c: NDArray[np.float64] | None
) -> tuple[LatticeMass, LatticeMass | None]:
    """A customer drawn from the group, and what all share per customer, on a lattice coarse enough to try many."""
    terms, counts = hour.still.up.terms[: hour.own_terms], hour.still.up.counts[: hour.own_terms]
    own = mixture(terms, [float(n) for n in counts])
    step = max(own.central_moment(2) ** 0.5 / STEPS_IN_A_DEVIATION, own.step_kw)
    shared = []
    if hour.shared is not None:
        shared.append(_on_step(hour.shared.points_kw / sum(counts), hour.shared.mass, step))
    if hour.response is not None and temperature_c is not None:
        shift = hour.response.shift_kw(temperature_c[np.isfinite(temperature_c)])
        shared.append(_on_step((shift - shift.mean()) / sum(counts), np.full(shift.size, 1.0 / shift.size), step))
    return _on_step(own.points_kw, own.mass, step), sum_distribution(shared) if shared else None


def _on_step(kw: NDArray[np.float64], mass: NDArray[np.float64], step_kw: float) -> LatticeMass:
    kept = mass > 0.0
    return lattice_mass(np.rint(kw[kept] / step_kw) * step_kw, step_kw, "exact", mass[kept])


def _reaches(customer: LatticeMass, shared: LatticeMass | None) -> tuple[NormalReach, ...]:
    if customer.central_moment(2) == 0.0:
        return ()
    return tuple(customers_until_normal(customer, p, common=shared) for p in EXCEEDED_WITH)
