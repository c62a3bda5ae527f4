"""Groups that the tests of peaks share: 17 real homes in day blocks, and invented groups with known dependence."""

import datetime as dt
import functools
import json
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.group import group_demand
from loadsum.demand.hourly import GroupDemand
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import EPOCH, Calendar, DayBlock, calendar
from loadsum.study.tables import DayTypes, Season
from tests.datasets import FIRST_STAMP, real_homes

QUARTERS = tuple(
    Season(name=name, months=months)
    for name, months in (
        ("winter", (12, 1, 2)),
        ("spring", (3, 4, 5)),
        ("summer", (6, 7, 8)),
        ("autumn", (9, 10, 11)),
    )
)
COARSE = ModelSettings(lattice_kw=0.05)
PLAIN = ModelSettings(
    temperature=False, common_component=False, shrinkage=False, mean_uncertainty=False, lattice_kw=0.05
)


def reference(topic: str) -> dict[str, dict]:
    """Published values of a topic by id, each with its citation and provenance."""
    path = Path(__file__).parent.parent / "reference" / f"{topic}.json"
    return {value["id"]: value for value in json.loads(path.read_text(encoding="utf-8"))["values"]}


def quarters() -> Calendar:
    return calendar(QUARTERS, DayTypes(), [2017])


def home_days() -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    """Days and demand of the 17 homes from the first whole day on, (D,) and (17, D, 24). [d, kW]"""
    _, kw = real_homes()
    whole = kw[:, 1:]
    days = whole.shape[1] // 24
    first = (FIRST_STAMP.date() + dt.timedelta(days=1) - EPOCH).days
    return first + np.arange(days), whole[:, : days * 24].reshape(kw.shape[0], days, 24)


def home_blocks(parity: int | None = None, homes: slice = slice(None)) -> list[DayBlock]:
    """Day blocks of the homes, of even or odd weeks only where a parity is given."""
    dates = quarters()
    day, kw = home_days()
    kinds = len(dates.day_types)
    place = np.array([dates.place(d)[0] * kinds + dates.place(d)[1] for d in day.tolist()])
    wanted = np.ones(day.size, dtype=bool) if parity is None else (day + 3) // 7 % 2 == parity
    per_year = dates.days_per_year([2017]).ravel()
    return [
        DayBlock(
            season=dates.season_names[b // kinds],
            day_type=dates.day_types[b % kinds],
            days_per_year=float(per_year[b]),
            day=day[(place == b) & wanted],
            kw=kw[homes][:, (place == b) & wanted],
        )
        for b in range(per_year.size)
    ]


@functools.cache
def homes_demand(parity: int | None = None) -> GroupDemand:
    return group_demand(home_blocks(parity), interval_min=60, power_factor=0.95, settings=COARSE)


def moody_days(days: int, customers: int, rng: np.random.Generator, intervals: int = 24) -> NDArray[np.float64]:
    """Invented customers who share a mood that drifts through the day, (C, D, I). [kW]"""
    steps = rng.standard_normal((days, intervals))
    mood = np.empty_like(steps)
    mood[:, 0] = steps[:, 0]
    for i in range(1, intervals):
        mood[:, i] = 0.9 * mood[:, i - 1] + np.sqrt(1 - 0.81) * steps[:, i]
    shape = 1.0 + 0.8 * np.sin(np.arange(intervals) / intervals * 2 * np.pi - 2.0)
    own = rng.gamma(2.0, 0.5, (customers, days, intervals))
    return shape * (own + 0.3 * mood + 1.0)


def one_block(kw: NDArray[np.float64], days_per_year: float = 365.0) -> DayBlock:
    return DayBlock(
        season="all year", day_type="all days", days_per_year=days_per_year, day=np.arange(kw.shape[1]), kw=kw
    )
