"""How often the hold-out test accepts the true law, and how often it rejects false ones, over many records."""

import numpy as np
import pytest

from loadsum.evidence.holdout import HoldOut, LevelScore, hold_out
from loadsum.evidence.scored import SHARES
from loadsum.intake.hourclass import DayBlock
from tests.benchmarks.calibration import blocks_by_season, fit, synthetic

MONDAY = 4  # 5 January 1970
RECORDS, DAYS, LONG = 60, 84, 1820
ALL_YEAR = (tuple(range(1, 13)),)
HOURS = slice(7, 24, 12)  # 07 and 19 h


@pytest.fixture(scope="module", params=[0.0, 0.2], ids=["independent customers", "shared weather"])
def records(request: pytest.FixtureRequest) -> tuple[float, list[HoldOut]]:
    """The law of a long record stands for the truth and is held against further records of 12 weeks."""
    kw = synthetic(10, LONG + RECORDS * DAYS, np.random.default_rng(7), correlation=request.param)

    def part(start: int, days: int) -> tuple[DayBlock, ...]:
        return blocks_by_season(kw[:, start : start + days], MONDAY + start, ALL_YEAR, HOURS)

    truth = fit(part(0, LONG))
    tests = [hold_out(part(LONG + n * DAYS, DAYS), fit=lambda _: truth) for n in range(RECORDS)]
    return request.param, [test for test in tests if test is not None]


def _rows(tests: list[HoldOut], model: str, share: float) -> list[LevelScore]:
    return [row for test in tests for row in test.levels if row.model == model and row.expected_share == share]


@pytest.mark.parametrize("share", SHARES)
def test_the_true_law_lies_within_chance_at_its_nominal_rate(
    records: tuple[float, list[HoldOut]], share: float
) -> None:
    # 95 of 100 are meant; three standard errors of 60 records are 8 of 100
    rows = _rows(records[1], "adopted", share)
    assert len(rows) == RECORDS
    assert np.mean([row.chance_low <= row.observed_share <= row.chance_high for row in rows]) >= 0.87


def test_the_test_as_a_whole_lets_the_true_law_pass(records: tuple[float, list[HoldOut]]) -> None:
    assert np.mean([test.passed for test in records[1]]) >= 0.87


def _rejected(tests: list[HoldOut], model: str) -> float:
    far = zip(_rows(tests, model, 0.01), _rows(tests, model, 0.001), strict=True)
    return float(np.mean([any(row.observed_share > row.chance_high for row in pair) for pair in far]))


def test_the_normal_law_and_the_independent_sum_are_rejected_far_more_often(
    records: tuple[float, list[HoldOut]],
) -> None:
    correlation, tests = records
    # twelve weeks of two intervals a day are little: the normal law fails in one record of four or more
    assert _rejected(tests, "normal") > 0.15
    if correlation:
        assert _rejected(tests, "independent") > 0.8
        assert _rejected(tests, "normal_independent") > 0.8
    else:
        assert _rejected(tests, "independent") < 0.1  # it is the truth here
