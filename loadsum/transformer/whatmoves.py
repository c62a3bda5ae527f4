"""What moves the expected exceedance hours of one rating, and how far."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from loadsum.demand.hourly import GroupDemand
from loadsum.demand.modelparts import PartEffect
from loadsum.peak.exceedance import exceedance_hours
from loadsum.study.unittables import AllowedLoading
from loadsum.transformer.loading import loadings

DEMAND_PU = (0.9, 1.1)
POWER_FACTOR = 0.05  # by how much it is moved either way


@dataclass(frozen=True, slots=True, kw_only=True)
class Move:
    """Expected hours when one thing is moved.

    Parameters
    ----------
    what : str
        "demand", "power factor", or the setting of a part of the demand model that is switched off.
    low, high : float or None
        What it is moved to: a factor on demand, a power factor; None where a part is switched off. [-]
    low_h, high_h : float
        Expected hours a year then; both the same where a part is switched off. [h]
    """

    what: str
    low: float | None
    high: float | None
    low_h: float
    high_h: float


@dataclass(frozen=True, slots=True, kw_only=True)
class WhatMoves:
    """What moves the expected exceedance hours of one rating.

    Parameters
    ----------
    rating_kva : float
        Rating. [kVA]
    of : str
        Loading whose exceedance it is.
    base_h : float
        Expected hours a year as the study stands. [h]
    moves : tuple of Move
        One for each thing moved, the strongest first.
    """

    rating_kva: float
    of: str
    base_h: float
    moves: tuple[Move, ...]


def what_moves(
    demand: GroupDemand,
    rating_kva: float,
    allowed: Sequence[AllowedLoading],
    parts: Sequence[PartEffect],
    *,
    power_factor: float,
) -> WhatMoves | None:
    """Expected hours of a rating when demand, power factor or a part of the model is moved; None if it has none.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    rating_kva : float
        Rating, chosen or in service. [kVA]
    allowed : sequence of AllowedLoading
        Loading allowed by season; the last of those stated is judged.
    parts : sequence of PartEffect
        What each part of the demand model does to the hours of this rating, by a quick comparison.
    power_factor : float
        Power factor of the study. [-]

    Notes
    -----
    Demand everywhere higher by a factor passes a level as often as the demand of the study passes the level divided by
    it, and a power factor lower by a factor acts the same way. A part's effect is its share in the quick comparison.
    """
    of, share = list(loadings(demand, allowed).items())[-1]
    factors = [
        1.0,
        *DEMAND_PU,
        power_factor / min(power_factor + POWER_FACTOR, 1.0),
        power_factor / (power_factor - POWER_FACTOR),
    ]
    table = exceedance_hours(demand, {str(n): rating_kva * share / f for n, f in enumerate(factors)}, far=False)
    base, less, more, better, worse = (level.year.expected_h for level in table.levels)
    if not base > 0.0:
        return None
    moves = [
        Move(what="demand", low=DEMAND_PU[0], high=DEMAND_PU[1], low_h=less, high_h=more),
        Move(
            what="power factor",
            low=min(power_factor + POWER_FACTOR, 1.0),
            high=power_factor - POWER_FACTOR,
            low_h=better,
            high_h=worse,
        ),
    ]
    for part in parts:
        if part.with_h > 0.0 and part.rating_kva == rating_kva:
            hours = base * part.without_h / part.with_h
            moves.append(Move(what=part.part, low=None, high=None, low_h=hours, high_h=hours))

    def reach(move: Move) -> float:
        ends = np.maximum([base, move.low_h, move.high_h], 1e-12)
        return float(np.ptp(np.log(ends)))

    return WhatMoves(rating_kva=rating_kva, of=of, base_h=base, moves=tuple(sorted(moves, key=reach, reverse=True)))
