"""Loading that the utility allows, by season, as a level for each class of days."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand
from loadsum.study.unittables import AllowedLoading

NAMEPLATE = "nameplate"
NORMAL = "allowed loading, normal"
EMERGENCY = "allowed loading, emergency"


def allowed_pu(demand: GroupDemand, of: str, allowed: Sequence[AllowedLoading]) -> NDArray[np.float64]:
    """Allowed loading in each class of days, (B,) float64. [pu of nameplate]

    A season's own entry comes before one for all seasons. A season without either is held to nameplate, which the
    caller lists as an assumption; an emergency loading that is not stated is no loading at all, NaN.
    """
    found = []
    for block in demand.blocks:
        if of == NAMEPLATE:
            found.append(1.0)
            continue
        row = next((a for name in (block.season, "all") for a in allowed if a.season == name), None)
        if of == NORMAL:
            found.append(row.normal_pu if row is not None else 1.0)
        else:
            found.append(row.emergency_pu if row is not None and row.emergency_pu > 0.0 else float("nan"))
    return np.array(found)


def seasons_without_allowance(demand: GroupDemand, allowed: Sequence[AllowedLoading]) -> tuple[str, ...]:
    """Seasons for which the study file states no allowed loading."""
    stated = {row.season for row in allowed}
    if "all" in stated:
        return ()
    return tuple(dict.fromkeys(block.season for block in demand.blocks if block.season not in stated))


def loadings(demand: GroupDemand, allowed: Sequence[AllowedLoading]) -> dict[str, NDArray[np.float64]]:
    """Every loading that each rating is shown against: nameplate, and what the study file allows. [pu of nameplate]"""
    shown = {NAMEPLATE: allowed_pu(demand, NAMEPLATE, allowed)}
    if allowed:
        shown[NORMAL] = allowed_pu(demand, NORMAL, allowed)
        emergency = allowed_pu(demand, EMERGENCY, allowed)
        if not np.isnan(emergency).any():
            shown[EMERGENCY] = emergency
    return shown
