import numpy as np
import pytest

from loadsum.demand.samplingerror import resample_weeks

DAY = np.arange(18263, 18263 + 91)


def test_resampled_means_spread_as_the_mean_of_independent_days_does():
    rng = np.random.default_rng(1)
    spreads = []
    for _ in range(20):
        sums = rng.gamma(4.0, 1.0, (91, 1))
        spreads.append(resample_weeks(sums, DAY, 200, rng)[0].shift_kw.std())
    assert np.mean(spreads) == pytest.approx(2.0 / 91**0.5, rel=0.12)


def test_weeks_that_differ_make_the_interval_wider():
    rng = np.random.default_rng(2)
    sums = rng.standard_normal((91, 1))
    weekly = rng.standard_normal(20)[(DAY + 3) // 7 - (DAY[0] + 3) // 7][:, None]
    alone = resample_weeks(sums, DAY, 300, np.random.default_rng(0))[0]
    shared = resample_weeks(sums + weekly, DAY, 300, np.random.default_rng(0))[0]
    assert shared.shift_kw.std() > 1.5 * alone.shift_kw.std()


def test_the_same_seed_draws_the_same_weeks_and_gaps_do_not_count():
    rng = np.random.default_rng(3)
    sums = rng.standard_normal((91, 2))
    sums[40:50, 0] = np.nan
    first, again = (resample_weeks(sums, DAY, 50, np.random.default_rng(9)) for _ in range(2))
    assert np.array_equal(first[0].shift_kw, again[0].shift_kw)
    assert np.isfinite(first[0].shift_kw).all()


def test_too_few_weeks_or_no_movement_make_no_interval():
    rng = np.random.default_rng(4)
    assert resample_weeks(rng.standard_normal((14, 1)), DAY[:14], 50, rng) == (None,)
    assert resample_weeks(np.ones((91, 1)), DAY, 50, rng) == (None,)
    assert resample_weeks(rng.standard_normal((91, 1)), DAY, 0, rng) == (None,)


def test_a_level_moves_with_the_resampled_mean_and_spread():
    rng = np.random.default_rng(5)
    drawn = resample_weeks(rng.standard_normal((91, 1)), DAY, 50, rng)[0]
    levels = drawn.levels_kw(np.array([3.0, 1.0]), 1.0, 1.0)
    assert levels[0] == pytest.approx(1.0 + (2.0 - drawn.shift_kw) / drawn.stretch)
    assert levels[1] == pytest.approx(1.0 - drawn.shift_kw / drawn.stretch)
