"""The invented faults do what they say, and the page takes its section in the right place."""

import numpy as np
import pytest

from loadsum.evidence.scored import SHARES
from tests.benchmarks.calibration import blocks_by_season, synthetic
from tests.benchmarks.hardcases import (
    ALL_YEAR,
    CASES,
    THREE_HOURS,
    away,
    by_weeks,
    coarse,
    growth,
    held_out,
    month_missing,
)
from tests.benchmarks.validation import HARD, KNOWN, with_section


def test_four_weeks_are_missing_at_every_fifth_meter_and_nowhere_else() -> None:
    rng = np.random.default_rng(1)
    missing = np.isnan(month_missing(synthetic(10, 182, rng), rng)).all(axis=2).sum(axis=1)
    assert missing.tolist() == [28, 0, 0, 0, 0, 28, 0, 0, 0, 0]


def test_registers_of_whole_kwh_lose_no_energy_but_the_last_part_of_a_kwh() -> None:
    rng = np.random.default_rng(2)
    kw = synthetic(3, 20, rng)
    read = coarse(kw, rng)
    assert np.array_equal(read, np.rint(read))
    lost = kw.sum(axis=(1, 2)) - read.sum(axis=(1, 2))
    assert (lost >= -1e-6).all() and (lost < 1.0).all()


def test_absence_lowers_two_weeks_of_everyone_and_growth_ends_a_fifth_higher() -> None:
    rng = np.random.default_rng(3)
    kw = synthetic(4, 100, rng) + 0.1
    low = away(kw, rng) / kw
    assert (low < 0.5).all(axis=2).sum(axis=1).tolist() == [14, 14, 14, 14]
    assert growth(kw, rng)[:, -1] / kw[:, -1] == pytest.approx(np.full((4, 24), 1.198))


@pytest.mark.parametrize("name", CASES)
def test_hard_cases_do_not_break_the_far_levels_and_beat_the_independent_sum(name: str) -> None:
    rng = np.random.default_rng(4)
    tests = []
    for _ in range(8):
        kw = CASES[name](synthetic(10, 182, rng), rng)
        test = held_out(blocks_by_season(kw, 18263, ALL_YEAR, THREE_HOURS))
        assert test is not None
        tests.append(test)
    rows = {row.model: row for row in by_weeks(name, tests, rng)}
    far = SHARES.index(0.001)
    assert rows["adopted"].low[far] <= 0.0035
    assert rows["adopted"].pinball_kw < rows["normal"].pinball_kw
    assert rows["adopted"].shares[far] < rows["independent"].shares[far] < rows["normal_independent"].shares[far]


def test_the_interval_by_weeks_is_wider_than_by_intervals_where_weeks_differ() -> None:
    rng = np.random.default_rng(5)
    kw = synthetic(5, 182, rng) * np.repeat(rng.gamma(8.0, 1 / 8.0, 26), 7)[None, :, None]
    test = held_out(blocks_by_season(kw, 18263, ALL_YEAR, THREE_HOURS))
    assert test is not None
    row = next(row for row in by_weeks("", [test], rng) if row.model == "adopted")
    tenth = SHARES.index(0.1)
    independent = 2 * 1.96 * np.sqrt(0.1 * 0.9 / test.day.size)
    assert row.high[tenth] - row.low[tenth] > 1.5 * independent


def test_a_section_replaces_its_former_self_before_the_known_weaknesses() -> None:
    page = "# Page\n" + KNOWN
    once = with_section(page, HARD + "one\n")
    assert once == "# Page\n" + HARD + "one\n" + KNOWN
    assert with_section(once, HARD + "two\n") == "# Page\n" + HARD + "two\n" + KNOWN
