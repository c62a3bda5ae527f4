"""The full hold-out test on a population whose truth is known."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from loadsum.demand.group import all_served, group_demand
from loadsum.demand.hourly import GroupDemand
from loadsum.evidence.fullholdout import FullHoldOut, PartScore, full_hold_out, months_of
from loadsum.intake.hourclass import DayBlock
from tests.benchmarks.calibration import SETTINGS, blocks_by_season, synthetic

FIRST = 18262  # 1 January 2020
EVERY_THIRD = slice(1, 24, 3)


def fit(blocks: Sequence[DayBlock], served: NDArray[np.bool_]) -> GroupDemand:
    group = replace(all_served(served.size), served=served)
    return group_demand(blocks, interval_min=60, power_factor=1.0, settings=SETTINGS, group=group)


@pytest.fixture(scope="module")
def year() -> FullHoldOut:
    """Twelve customers moved by the same weather over a year."""
    kw = synthetic(12, 366, np.random.default_rng(4), correlation=0.1)
    blocks = blocks_by_season(kw, FIRST, [range(1, 7), range(7, 13)], EVERY_THIRD)
    found = full_hold_out(blocks, np.ones(12, dtype=bool), fit, rng=np.random.default_rng(1))
    assert found is not None
    return found


def parts(found: FullHoldOut, by: str) -> list[PartScore]:
    return [part for part in found.parts if part.by == by]


@pytest.mark.parametrize("by", ["season", "day type", "part of the day", "month"])
def test_every_held_out_interval_is_in_one_part_of_each_kind(year: FullHoldOut, by: str) -> None:
    assert sum(part.intervals for part in parts(year, by)) == year.whole.intervals == 366 * 8
    passed = sum(level.observed_count for part in parts(year, by) for level in part.levels if level.model == "adopted")
    assert passed == sum(level.observed_count for level in year.whole.levels if level.model == "adopted")


def test_each_month_is_left_out_once_and_judged_by_the_others(year: FullHoldOut) -> None:
    assert [part.name for part in parts(year, "month left out")] == [f"{month:02d}" for month in range(1, 13)]
    assert year.months_left_out is not None
    assert year.months_left_out.intervals == sum(part.intervals for part in parts(year, "month left out"))
    row = next(r for r in year.months_left_out.levels if r.model == "adopted" and r.expected_share == 0.1)
    assert row.chance_low <= row.observed_share <= row.chance_high


def test_groups_drawn_at_random_show_the_independent_sum_failing_as_they_grow(year: FullHoldOut) -> None:
    assert [part.name for part in parts(year, "customers")] == ["2", "5", "10"]
    shares = [
        next(r.observed_share for r in part.levels if r.model == "independent" and r.expected_share == 0.01)
        for part in parts(year, "customers")
    ]
    assert shares[2] > 1.5 * 0.01
    adopted = parts(year, "customers")[2].levels[2]
    assert (adopted.model, adopted.expected_share) == ("adopted", 0.01)
    assert adopted.observed_share < 0.7 * shares[2]


def test_daily_peaks_of_held_out_days_are_passed_about_as_often_as_meant(year: FullHoldOut) -> None:
    ten, five, one = year.daily_peaks
    assert (ten.expected_share, five.expected_share, one.expected_share) == (0.10, 0.05, 0.01)
    assert ten.days == 366 and ten.observed_days == round(ten.observed_share * 366)
    assert 0.10 / 1.6 < ten.observed_share < 0.10 * 1.6
    assert ten.observed_days > five.observed_days >= one.observed_days
    # a day above the level has at least one run above it
    assert year.runs[0].observed >= ten.observed_days
    assert [run.at_least_intervals for run in year.runs] == [1, 2, 3, 4]
    expected = [run.expected for run in year.runs]
    assert expected == sorted(expected, reverse=True)


def test_the_same_seed_gives_the_same_test_and_nothing_less_than_eight_weeks_any() -> None:
    kw = synthetic(6, 70, np.random.default_rng(2))
    blocks = blocks_by_season(kw, FIRST, [range(1, 13)], EVERY_THIRD)
    one, again = (full_hold_out(blocks, np.ones(6, dtype=bool), fit, rng=np.random.default_rng(3)) for _ in range(2))
    assert one == again
    assert one is not None and one.months_left_out is None
    assert any("months were not left out" in note for note in one.notes)
    short = blocks_by_season(kw[:, :42], FIRST, [range(1, 13)], EVERY_THIRD)
    assert full_hold_out(short, np.ones(6, dtype=bool), fit, rng=np.random.default_rng(3)) is None


def test_months_are_those_of_the_calendar() -> None:
    days = np.array([0, 30, 31, 58, 59, 364, FIRST + 59, FIRST + 60])
    assert months_of(days).tolist() == [1, 1, 2, 2, 3, 12, 2, 3]
