"""Held-out demand against the laws of models that have not seen it."""

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

from loadsum.demand.hourly import GroupDemand, HourDemand
from loadsum.demand.lattice import LatticeMass
from loadsum.evidence.scores import crps_lattice, crps_normal, crps_sample, pinball, randomised_pit
from loadsum.intake.hourclass import DayBlock
from loadsum.intake.readings import read_only

SHARES = (0.5, 0.1, 0.01, 0.001)
MODELS = ("adopted", "normal_independent", "normal", "independent", "observed_sum")
PINBALL_SHARE = 0.99

Fit = Callable[[Sequence[DayBlock]], GroupDemand]
HeldOut = Callable[[NDArray[np.int64]], NDArray[np.bool_]]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Fold:
    """A model and the readings it has not seen.

    Parameters
    ----------
    demand : GroupDemand
        Model fitted on the other days.
    blocks : tuple of DayBlock
        Held-out days, in the order of the model's classes. [kW]
    sums_kw : tuple of (D, I) float64
        Held-out sums; NaN where a customer is missing. [kW]
    """

    demand: GroupDemand
    blocks: tuple[DayBlock, ...]
    sums_kw: tuple[NDArray[np.float64], ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Scored:
    """Held-out demand intervals, one entry each, against every model.

    Parameters
    ----------
    day : (n,) int64
        Local calendar day. [d]
    block, interval : (n,) int64
        Class of days, by its place among those given, and interval of the day. [-]
    passes : mapping of str to (n, 4) bool
        Whether demand passed the level meant to be passed by 50, 10, 1 and 0.1 %, by model.
    losses, crps : mapping of str to (n,) float64
        Loss at the 99 % level and continuous ranked probability score, by model. [kW]
    pit : (n,) float64
        Probability integral transform of the adopted model, jumps spread at random. [-]
    """

    day: NDArray[np.int64]
    block: NDArray[np.int64]
    interval: NDArray[np.int64]
    passes: Mapping[str, NDArray[np.bool_]]
    losses: Mapping[str, NDArray[np.float64]]
    crps: Mapping[str, NDArray[np.float64]]
    pit: NDArray[np.float64]

    def __post_init__(self) -> None:
        for array in (self.day, self.block, self.interval, self.pit):
            read_only(array)

    @property
    def week(self) -> NDArray[np.int64]:
        """Week of each entry. [-]"""
        return week_of(self.day)

    def part(self, rows: NDArray[np.bool_]) -> "Scored":
        """Some entries."""
        return Scored(
            day=self.day[rows].copy(),
            block=self.block[rows].copy(),
            interval=self.interval[rows].copy(),
            passes={name: array[rows] for name, array in self.passes.items()},
            losses={name: array[rows] for name, array in self.losses.items()},
            crps={name: array[rows] for name, array in self.crps.items()},
            pit=self.pit[rows].copy(),
        )


def week_of(day: NDArray[np.int64]) -> NDArray[np.int64]:
    """Week of a day, Monday first. [-]"""
    return (day + 3) // 7


def part_of(block: DayBlock, rows: NDArray[np.bool_]) -> DayBlock:
    """Some days of a block."""
    return replace(
        block,
        day=block.day[rows].copy(),
        kw=block.kw[:, rows].copy(),
        kvar=None if block.kvar is None else block.kvar[:, rows].copy(),
        temperature_c=None if block.temperature_c is None else block.temperature_c[rows].copy(),
    )


def alternate_weeks() -> tuple[HeldOut, ...]:
    """Whole weeks in turn, then the others."""
    return (lambda day: week_of(day) % 2 != 0, lambda day: week_of(day) % 2 == 0)


def sums_of(blocks: Sequence[DayBlock], served: NDArray[np.bool_] | None) -> list[NDArray[np.float64]]:
    """Sum of the customers served on each day, NaN where one is missing, (D, I) float64 each. [kW]"""
    return [block.kw.sum(axis=0) if served is None else block.kw[served].sum(axis=0) for block in blocks]


def folds(
    blocks: Sequence[DayBlock], served: NDArray[np.bool_] | None, fit: Fit, held_out: Sequence[HeldOut]
) -> Iterator[Fold]:
    """Each choice of held-out days with the model fitted on the others; classes it could not fit are left out."""
    for chosen in held_out:
        fitting = [part_of(block, ~chosen(block.day)) for block in blocks]
        demand = fit([block for block in fitting if block.day.size])
        tested = {(b.season, b.day_type): part_of(b, chosen(b.day)) for b in blocks}
        of_model = tuple(tested[(b.season, b.day_type)] for b in demand.blocks)
        yield Fold(demand=demand, blocks=of_model, sums_kw=tuple(sums_of(of_model, served)))


def scored(all_folds: Sequence[Fold], blocks: Sequence[DayBlock], rng: np.random.Generator) -> Scored | None:
    """Every held-out interval against every model; None where there is none.

    Parameters
    ----------
    all_folds : sequence of Fold
        Models with the days they have not seen.
    blocks : sequence of DayBlock
        Classes of days, by whose place entries are named.
    rng : numpy.random.Generator
        Source of the randomness that spreads jumps.
    """
    place = {(b.season, b.day_type): n for n, b in enumerate(blocks)}
    parts = []
    for fold in all_folds:
        for n, (block, sums) in enumerate(zip(fold.blocks, fold.sums_kw, strict=True)):
            for i, hour in enumerate(fold.demand.hours[n]):
                if hour is None:
                    continue
                fitted = fold.demand.sums_kw[n][:, i]
                fitted = fitted[np.isfinite(fitted)]
                for rows, warmth in _days(sums[:, i], block, hour):
                    if rows.any():
                        where = (place[(block.season, block.day_type)], i)
                        parts.append(_scored(hour, sums[rows, i], block.day[rows], where, warmth, fitted, rng))
    if not parts:
        return None
    return Scored(
        day=np.concatenate([part.day for part in parts]),
        block=np.concatenate([part.block for part in parts]),
        interval=np.concatenate([part.interval for part in parts]),
        passes={name: np.concatenate([part.passes[name] for part in parts]) for name in MODELS},
        losses={name: np.concatenate([part.losses[name] for part in parts]) for name in MODELS},
        crps={name: np.concatenate([part.crps[name] for part in parts]) for name in MODELS},
        pit=np.concatenate([part.pit for part in parts]),
    )


def _days(
    sums: NDArray[np.float64], block: DayBlock, hour: HourDemand
) -> list[tuple[NDArray[np.bool_], NDArray[np.float64] | None]]:
    """Days whose law is known given their temperature, and the others, which are held against that of any day."""
    there = np.isfinite(sums)
    if hour.response is None or block.temperature_c is None:
        return [(there, None)]
    known = there & np.isfinite(block.temperature_c)
    return [(known, block.temperature_c[known]), (there & ~known, None)]


def _scored(
    hour: HourDemand,
    observed: NDArray[np.float64],
    day: NDArray[np.int64],
    where: tuple[int, int],
    warmth: NDArray[np.float64] | None,
    fitted: NDArray[np.float64],
    rng: np.random.Generator,
) -> Scored:
    """The held-out demand of one interval of a class of days."""
    shares = np.array(SHARES)
    mean = hour.independent.mean_kw()
    spreads = {
        "normal_independent": np.sqrt(hour.independent.central_moment(2)),
        "normal": np.sqrt(hour.covariance_variance_kw2),
    }
    level = {name: mean - ndtri(shares) * spread for name, spread in spreads.items()}
    above = np.append(np.cumsum(hour.independent.mass[::-1])[::-1][1:], 0.0)
    place = np.minimum(np.searchsorted(-above, -shares), above.size - 1)
    level["independent"] = hour.independent.points_kw[place]
    level["observed_sum"] = np.quantile(fitted, 1.0 - shares) if fitted.size else np.full(shares.size, np.nan)
    moved = None if warmth is None else _moved(hour, warmth)
    levels = {name: np.broadcast_to(row, (observed.size, shares.size)) for name, row in level.items()}
    levels["adopted"] = (
        np.broadcast_to(hour.quantiles_kw(shares), (observed.size, shares.size))
        if moved is None
        else moved.quantiles_kw(shares)
    )
    law, back = (hour.whole_up, observed) if moved is None else (moved.law, moved.back(observed))
    crps = {name: crps_normal(np.array(mean), np.array(max(s, 1e-9)), observed) for name, s in spreads.items()}
    crps["adopted"] = (1.0 if moved is None else moved.stretch) * crps_lattice(law, back)
    crps["independent"] = crps_lattice(hour.independent, observed)
    crps["observed_sum"] = crps_sample(fitted, observed) if fitted.size else np.full(observed.size, np.nan)
    return Scored(
        day=day.copy(),
        block=np.full(day.size, where[0], dtype=np.int64),
        interval=np.full(day.size, where[1], dtype=np.int64),
        passes={name: observed[:, None] > levels[name] for name in MODELS},
        losses={name: pinball(levels[name][:, SHARES.index(0.01)], observed, PINBALL_SHARE) for name in MODELS},
        crps=crps,
        pit=randomised_pit(law, back, rng),
    )


@dataclass(frozen=True, slots=True)
class _Moved:
    """An interval's law given the temperature of each held-out day: one law, shifted and stretched."""

    hour: HourDemand
    shift_kw: NDArray[np.float64]
    stretch: NDArray[np.float64]

    @property
    def law(self) -> LatticeMass:
        """The law of a day of no shift."""
        return self.hour.whole_up

    def quantiles_kw(self, shares: NDArray[np.float64]) -> NDArray[np.float64]:
        mean = self.hour.mean_kw()
        away = self.hour.quantiles_kw(shares) - mean
        return np.asarray(mean + self.shift_kw[:, None] + self.stretch[:, None] * away, dtype=np.float64)

    def back(self, observed: NDArray[np.float64]) -> NDArray[np.float64]:
        """Where demand would stand in the law of a day of no shift. [kW]"""
        mean = self.hour.mean_kw()
        return np.asarray(mean + (observed - mean - self.shift_kw) / self.stretch, dtype=np.float64)


def _moved(hour: HourDemand, warmth: NDArray[np.float64]) -> _Moved:
    assert hour.response is not None
    spread = float(np.sqrt(hour.response.shift_variance_kw2(warmth).mean())) if warmth.size else 0.0
    return _Moved(hour.without_temperature(spread), hour.response.shift_kw(warmth), hour.response.stretch(warmth))
