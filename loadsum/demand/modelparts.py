"""How much each part of the demand model moves the answer: the model with and without it."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from loadsum.demand.hourly import GroupDemand
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock

MOST_HOURS = 32  # demand intervals of all classes of days that the comparison is made on
COARSE_KW = 0.02  # lattice of the comparison
NONE_H = 1e-4  # hours a year below which a comparison says nothing

PARTS = {
    "temperature": "temperature's effect on demand",
    "common_component": "common component",
    "shrinkage": "borrowing from the customer class",
    "mean_uncertainty": "uncertainty of mean and variance",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class PartEffect:
    """One part of the model, and what it does to the expected exceedance hours of a rating.

    Parameters
    ----------
    part : str
        Setting that switches it.
    rating_kva : float
        Rating. [kVA]
    with_h, without_h : float
        Expected exceedance hours per year with the part, and without it. [h]
    """

    part: str
    rating_kva: float
    with_h: float
    without_h: float

    def words(self) -> str:
        """The effect in words."""
        if max(self.with_h, self.without_h) < NONE_H:
            return f"hardly any exceedance of {self.rating_kva:g} kVA with or without it"
        return (
            f"expected exceedance of {self.rating_kva:g} kVA about {self.with_h:.2g} h a year with it, "
            f"{self.without_h:.2g} h without (quick comparison)"
        )


def part_effects(
    blocks: Sequence[DayBlock],
    fit: Callable[[Sequence[DayBlock], ModelSettings], GroupDemand],
    settings: ModelSettings,
    rating_kva: float,
) -> tuple[PartEffect, ...]:
    """Every part that is on, switched off in turn.

    Parameters
    ----------
    blocks : sequence of DayBlock
        Readings of every metered customer.
    fit : callable
        Makes the demand model.
    settings : ModelSettings
        Settings of the study.
    rating_kva : float
        Rating whose exceedance is compared. [kVA]

    Notes
    -----
    Made on some intervals of the day and a coarse lattice: it serves to tell large effects from small ones.
    """
    every = max(-(-len(blocks) * blocks[0].kw.shape[2] // MOST_HOURS), 1)
    some = [
        replace(
            block,
            kw=block.kw[:, :, ::every].copy(),
            kvar=None if block.kvar is None else block.kvar[:, :, ::every].copy(),
        )
        for block in blocks
        if block.day.size
    ]
    quick = replace(settings, resamples=0, lattice_kw=max(settings.lattice_kw, COARSE_KW))
    warmth = any(block.temperature_c is not None for block in some)
    on = [part for part in PARTS if getattr(settings, part) and (warmth or part != "temperature")]
    if not some or not on:
        return ()
    whole = every * _hours(fit(some, quick), rating_kva)
    return tuple(
        PartEffect(
            part=part,
            rating_kva=rating_kva,
            with_h=whole,
            without_h=every * _hours(fit(some, replace(quick, **{part: False})), rating_kva),
        )
        for part in on
    )


def _hours(demand: GroupDemand, rating_kva: float) -> float:
    hours = demand.hours_in_year()
    return float(
        np.sum(
            [
                hours[b, i] * float(hour.exceedances_kva(np.array([rating_kva])).value[0])
                for b, row in enumerate(demand.hours)
                for i, hour in enumerate(row)
                if hour is not None
            ]
        )
    )
