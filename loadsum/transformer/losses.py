"""Losses, and what they cost."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from loadsum.demand.hourly import GroupDemand


@dataclass(frozen=True, slots=True, kw_only=True)
class LossesAtRating:
    """Losses of one rating over the covered hours of a year.

    Parameters
    ----------
    rating_kva : float
        Nameplate rating. [kVA]
    no_load_kwh, load_kwh : float
        Energy lost. [kWh]
    present_worth : float or None
        Worth of the losses by the user's factors. [currency]
    owning_cost : float or None
        Price and worth of losses together. [currency]
    """

    rating_kva: float
    no_load_kwh: float
    load_kwh: float
    present_worth: float | None
    owning_cost: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Losses:
    """Losses of every rating whose test figures the study file gives."""

    currency: str
    by_rating: tuple[LossesAtRating, ...]


def mean_square_pu_hours(demand: GroupDemand, rating_kva: float) -> float:
    """Hours of rated load losses that a year's load losses are worth: the sum of hours times mean squared loading. [h]

    Exact from the distributions: no loss-factor formula, and no assumption about dependence between intervals.
    """
    hours = demand.hours_in_year()
    total = 0.0
    for b, row in enumerate(demand.hours):
        for i, hour in enumerate(row):
            if hour is not None:
                total += float(hours[b, i]) * hour.mean_square_kva2()
    return total / rating_kva**2


def owning_cost(price: float, a_per_w: float, no_load_w: float, b_per_w: float, load_w: float) -> float:
    """Price, and the worth of losses by the A and B factors. [currency]

    References
    ----------
    .. [1] IEEE C57.120, total owning cost (abstract read).
    """
    return price + a_per_w * no_load_w + b_per_w * load_w


def annuity(rate_pct: float, years: int) -> float:
    """Present worth of 1 paid at the end of each of so many years. [%, a -> -]"""
    rate = rate_pct / 100.0
    return float(years) if rate == 0.0 else (1.0 - (1.0 + rate) ** -years) / rate


def losses(
    demand: GroupDemand,
    ratings_kva: Sequence[float],
    no_load_w: Sequence[float],
    load_w: Sequence[float],
    *,
    a_per_w: float = 0.0,
    b_per_w: float = 0.0,
    energy_price_per_kwh: float = 0.0,
    discount_rate_pct: float = 0.0,
    worth_years: int = 0,
    prices: Sequence[float] = (),
    currency: str = "",
) -> Losses | None:
    """Losses of every rating; None where the study file gives no test figures.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    ratings_kva : sequence of float
        Ratings. [kVA]
    no_load_w, load_w : sequence of float
        No-load losses, and load losses at rated load, in the order of the ratings. [W]
    a_per_w, b_per_w : float
        Worth of a watt of no-load and of rated load losses; 0 where not given. [currency/W]
    energy_price_per_kwh : float
        Price of lost energy, used where the worth of a watt is not given; 0 where none. [currency/kWh]
    discount_rate_pct : float
        Rate at which the price of each year's energy is discounted. [% per year]
    worth_years : int
        Years over which lost energy is counted. [a]
    prices : sequence of float
        Prices in the order of the ratings. [currency]
    currency : str
        Unit of money.
    """
    if not no_load_w or not load_w:
        return None
    if not len(ratings_kva) == len(no_load_w) == len(load_w):
        raise ValueError(f"{len(ratings_kva)} ratings, {len(no_load_w)} no-load and {len(load_w)} load losses")
    year_h = float(np.sum(demand.hours_in_year()[demand.covered()]))
    rows = []
    for n, rating in enumerate(ratings_kva):
        no_load_kwh = no_load_w[n] * year_h / 1000.0
        load_kwh = load_w[n] * mean_square_pu_hours(demand, rating) / 1000.0
        worth = None
        if a_per_w > 0.0 and b_per_w > 0.0:
            worth = owning_cost(0.0, a_per_w, no_load_w[n], b_per_w, load_w[n])
        elif energy_price_per_kwh > 0.0 and worth_years > 0:
            worth = energy_price_per_kwh * (no_load_kwh + load_kwh) * annuity(discount_rate_pct, worth_years)
        rows.append(
            LossesAtRating(
                rating_kva=rating,
                no_load_kwh=no_load_kwh,
                load_kwh=load_kwh,
                present_worth=worth,
                owning_cost=prices[n] + worth if worth is not None and prices else None,
            )
        )
    return Losses(currency=currency, by_rating=tuple(rows))
