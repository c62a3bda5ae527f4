"""The hold-out test on populations whose truth is known: it lets the true model pass and stops the false ones."""

import numpy as np
import pytest
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand
from loadsum.evidence.holdout import FEWEST_WEEKS, NOT_TESTED, HoldOut, LevelScore, hold_out
from loadsum.evidence.scored import part_of
from loadsum.intake.hourclass import DayBlock
from tests.benchmarks.calibration import blocks_by_season, fit, synthetic

MONDAY = 4  # 5 January 1970
ALL_YEAR = (tuple(range(1, 13)),)
HOURS = slice(7, 24, 12)  # 07 and 19 h


def _blocks(kw: NDArray[np.float64], first_day: int = MONDAY) -> tuple[DayBlock, ...]:
    return blocks_by_season(kw, first_day, ALL_YEAR, HOURS)


def _level(test: HoldOut, model: str, share: float) -> LevelScore:
    return next(row for row in test.levels if row.model == model and row.expected_share == share)


@pytest.fixture(scope="module")
def shared_weather() -> HoldOut:
    """Forty customers moved by the same weather, 52 weeks, fitted and tested on alternate weeks."""
    kw = synthetic(40, 364, np.random.default_rng(11), correlation=0.2)
    test = hold_out(_blocks(kw), fit=fit)
    assert test is not None
    return test


def test_the_true_law_is_accepted_about_as_often_as_it_should_be() -> None:
    # the law of a record of 1 820 days stands for the truth; forty further records of 12 weeks are held against it
    kw = synthetic(10, 1820 + 40 * 84, np.random.default_rng(7), correlation=0.0)
    truth = fit(_blocks(kw[:, :1820]))
    accepted = np.zeros(40, dtype=bool)
    for n in range(40):
        start = 1820 + 84 * n
        test = hold_out(_blocks(kw[:, start : start + 84], MONDAY + start), fit=lambda _: truth)
        assert test is not None
        row = _level(test, "adopted", 0.1)
        accepted[n] = row.chance_low <= row.observed_share <= row.chance_high
    # a floor, not the rate: 95 of 100 are meant, 12 weeks gave 90 to 99 of 100 (three seeds, 100 records each)
    assert accepted.mean() >= 0.85


def test_the_adopted_model_passes_where_all_share_the_weather(shared_weather: HoldOut) -> None:
    assert shared_weather.passed
    assert "understated" not in shared_weather.sentence


@pytest.mark.parametrize("model", ["normal_independent", "independent"])
def test_independent_sums_are_rejected_where_all_share_the_weather(shared_weather: HoldOut, model: str) -> None:
    row = _level(shared_weather, model, 0.01)
    assert row.observed_share > row.chance_high
    assert row.kupiec_p < 0.001


def test_the_normal_law_is_rejected_for_a_few_skewed_customers() -> None:
    kw = synthetic(4, 728, np.random.default_rng(5), correlation=0.0)
    test = hold_out(_blocks(kw), fit=fit)
    assert test is not None
    for model in ("normal", "normal_independent"):
        row = _level(test, model, 0.001)
        assert row.observed_share > row.chance_high
    mine = _level(test, "adopted", 0.001)
    assert mine.observed_share <= mine.chance_high


def test_the_adopted_model_scores_better_than_the_independent_sum(shared_weather: HoldOut) -> None:
    score = {row.model: row for row in shared_weather.models}
    assert score["adopted"].pinball_kw < score["independent"].pinball_kw
    assert score["adopted"].crps_kw < score["independent"].crps_kw


def test_every_held_out_interval_is_scored_once(shared_weather: HoldOut) -> None:
    assert shared_weather.intervals == 364 * 2 == sum(shared_weather.pit_counts)
    row = _level(shared_weather, "adopted", 0.01)
    assert row.observed_count == pytest.approx(row.observed_share * shared_weather.intervals)
    assert row.expected_count == pytest.approx(0.01 * shared_weather.intervals)


def test_a_week_is_never_fitted_and_tested_at_once() -> None:
    kw = synthetic(5, 84, np.random.default_rng(3), correlation=0.0)
    fitted: list[set[int]] = []

    def watched(blocks: tuple[DayBlock, ...]) -> GroupDemand:
        fitted.append({int(week) for block in blocks for week in (block.day + 3) // 7})
        return fit(blocks)

    hold_out(_blocks(kw), fit=watched)
    assert len(fitted) == 2
    assert fitted[0].isdisjoint(fitted[1])
    assert len(fitted[0] | fitted[1]) == 12


def test_too_few_weeks_are_not_tested() -> None:
    kw = synthetic(3, 7 * (FEWEST_WEEKS - 1), np.random.default_rng(1))
    assert hold_out(_blocks(kw), fit=fit) is None


def test_a_model_that_is_too_low_says_so_in_plain_words() -> None:
    # fitted on what later is three times as much
    kw = synthetic(8, 112, np.random.default_rng(9), correlation=0.0)
    low = fit(_blocks(kw / 3.0))
    test = hold_out(_blocks(kw), fit=lambda _: low)
    assert test is not None
    assert not test.passed
    assert "treat exceedance below 1 % as understated" in test.sentence
    assert test.not_tested == NOT_TESTED


def test_a_month_without_one_customer_is_left_out_of_the_test() -> None:
    kw = synthetic(6, 140, np.random.default_rng(13), correlation=0.05)
    kw[0, 28:56] = np.nan
    test = hold_out(_blocks(kw), fit=fit)
    assert test is not None
    assert test.intervals == (140 - 28) * 2
    assert test.weeks == 16


def test_a_part_of_a_block_keeps_the_days_asked_for() -> None:
    block = _blocks(synthetic(2, 21, np.random.default_rng(2)))[0]
    rows = block.day >= MONDAY + 7
    part = part_of(block, rows)
    np.testing.assert_array_equal(part.day, block.day[rows])
    np.testing.assert_array_equal(part.kw, block.kw[:, rows])
