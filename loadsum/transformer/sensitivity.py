"""How far demand, power factor and ambient temperature may move before the choice of rating does."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand
from loadsum.study.unittables import AllowedLoading, Criterion
from loadsum.transformer.selection import Selection, evaluate

JUDGED = ("exceedance hours per year", "exceedance probability in any interval")
MOST = 3.0  # demand is looked at up to three times as high, and down to a third
GRID = 17  # factors looked at in one pass: two passes find a turning point to 0.5 % of demand


@dataclass(frozen=True, slots=True, kw_only=True)
class Sensitivity:
    """Where the choice of rating turns.

    Parameters
    ----------
    rating_kva : float
        Rating chosen. [kVA]
    holds_to_pu : float or None
        Demand over that of the study up to which the rating chosen meets the exceedance criteria; None where it still
        does at the largest looked at. [-]
    smaller_kva : float or None
        Next smaller rating compared; None where there is none. [kVA]
    smaller_from_pu : float or None
        Demand over that of the study at which the smaller rating would meet them; None where not even at the smallest
        looked at. [-]
    power_factor_to : float or None
        Power factor down to which the choice holds, the demand in kW being the same; None where no fall was found. [-]
    ambient_k : float or None
        How much warmer the ambient may be until a hot-spot or top-oil criterion is no longer met; None without one. [K]
    judged : tuple of str
        Quantities of the criteria that the figures on demand go by.
    """

    rating_kva: float
    holds_to_pu: float | None
    smaller_kva: float | None
    smaller_from_pu: float | None
    power_factor_to: float | None
    ambient_k: float | None
    judged: tuple[str, ...]


def sensitivity(
    demand: GroupDemand,
    ratings_kva: Sequence[float],
    selection: Selection,
    criteria: Sequence[Criterion],
    allowed: Sequence[AllowedLoading],
    *,
    power_factor: float,
) -> Sensitivity | None:
    """Where the choice of rating turns; None where no rating was chosen or no criterion is on exceedance.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    ratings_kva : sequence of float
        Ratings compared, increasing. [kVA]
    selection : Selection
        The choice.
    criteria : sequence of Criterion
        Criteria of the user's utility; those on exceedance are judged anew.
    allowed : sequence of AllowedLoading
        Loading allowed by season.
    power_factor : float
        Power factor of the study. [-]

    Notes
    -----
    Demand that is everywhere higher by a factor passes a level as often as demand that is not passes the level divided
    by it, so that nothing is convolved again. A power factor lower by a factor is the same in kVA. Temperatures rise
    with the ambient kelvin by kelvin in both guides. Criteria on whole years and on ageing are not judged anew.
    """
    asked = [criterion for criterion in criteria if criterion.quantity in JUDGED]
    chosen = selection.rating_kva
    if chosen is None or not asked:
        return None

    def good(rating_kva: float, factors: NDArray[np.float64]) -> NDArray[np.bool_]:
        found = evaluate(demand, (rating_kva / factors[::-1]).tolist(), asked, allowed, far=False)
        met = [[one.meets is True for one in result.by_rating] for result in found.criteria]
        return np.asarray(np.all(met, axis=0)[::-1])

    at = list(ratings_kva).index(chosen)
    smaller = ratings_kva[at - 1] if at > 0 else None
    holds_to = _turning(partial(good, chosen), 1.0, MOST)
    smaller_from = None if smaller is None else _turning(partial(good, smaller), 1.0 / MOST, 1.0)
    if smaller_from is not None and smaller_from <= 1.0 / MOST:
        smaller_from = None
    return Sensitivity(
        rating_kva=chosen,
        holds_to_pu=holds_to,
        smaller_kva=smaller,
        smaller_from_pu=smaller_from,
        power_factor_to=None if holds_to is None else power_factor / holds_to,
        ambient_k=_ambient_room(selection, at),
        judged=tuple(dict.fromkeys(criterion.quantity for criterion in asked)),
    )


def _ambient_room(selection: Selection, at: int) -> float | None:
    margins = [
        margin
        for result in selection.criteria
        if result.quantity in ("hot-spot temperature", "top-oil temperature")
        and (margin := result.by_rating[at].margin) is not None
    ]
    return min(margins) if margins else None


def _turning(good: Callable[[NDArray[np.float64]], NDArray[np.bool_]], low: float, high: float) -> float | None:
    """Largest factor of a fine row below which all are good; the lowest where it is not, None where all are."""
    for _ in range(2):
        factors = np.geomspace(low, high, GRID)
        bad = np.flatnonzero(~good(factors))
        if bad.size == 0:
            return None
        if bad[0] == 0:
            return low
        low, high = float(factors[bad[0] - 1]), float(factors[bad[0]])
    return low


def demand_effect(found: Sensitivity | None) -> str:
    """What the choice does when demand moves, in words; empty where that was not computed."""
    if found is None:
        return ""
    if found.holds_to_pu is None:
        words = f"{found.rating_kva:g} kVA holds with demand up to {MOST:g} times as high"
    else:
        words = f"{found.rating_kva:g} kVA holds until demand is {100.0 * (found.holds_to_pu - 1.0):.1f} % higher"
    if found.smaller_from_pu is not None and found.smaller_from_pu < 1.0:
        words += (
            f"; {found.smaller_kva:g} kVA would serve if it were {100.0 * (1.0 - found.smaller_from_pu):.1f} % lower"
        )
    return words + " (exceedance criteria)"


def power_factor_effect(found: Sensitivity | None) -> str:
    """What the choice does when the power factor falls, in words; empty where that was not computed."""
    if found is None or found.power_factor_to is None:
        return ""
    return f"{found.rating_kva:g} kVA holds down to {found.power_factor_to:.3f} (exceedance criteria)"


def ambient_effect(found: Sensitivity | None) -> str:
    """What the choice does when the ambient is warmer, in words; empty where that was not computed."""
    if found is None or found.ambient_k is None:
        return ""
    return (
        f"{found.rating_kva:g} kVA meets the temperature criteria until the ambient is {found.ambient_k:.1f} K warmer"
    )
