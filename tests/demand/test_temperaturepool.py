"""Slopes over all classes of days, and a class that departs from them only as far as its own days show."""

import numpy as np
import pytest

from loadsum.demand.degrees import degrees
from loadsum.demand.temperature import take_out_temperature
from loadsum.demand.temperaturepool import pooled_response


def season(rng, days, middle_c, level_kw, slope_kw_per_k):
    temperature = rng.normal(middle_c, 5.0, days)
    need = degrees(temperature)
    kw = level_kw + need @ np.array(slope_kw_per_k) / 4.0 + rng.gamma(4.0, 0.1, (4, days))
    return kw, temperature


def test_the_slopes_of_all_seasons_are_found_whatever_the_level_of_each():
    rng = np.random.default_rng(1)
    seasons = [season(rng, 60, c, level, (0.8, 1.2)) for c, level in ((2.0, 1.0), (12.0, 3.0), (24.0, 0.5))]
    found = pooled_response([kw for kw, _ in seasons], [t for _, t in seasons], np.ones(4))
    error = np.sqrt(np.diag(found.covariance))
    assert np.all(np.abs(found.group_kw_per_k - [0.8, 1.2]) < 3.0 * error)
    assert np.all(error < 0.05)
    assert found.customer_kw_per_k.sum(axis=0) == pytest.approx(found.group_kw_per_k, rel=0.01)


def test_a_season_with_two_hot_days_borrows_the_slope_of_summer():
    rng = np.random.default_rng(2)
    summer = season(rng, 60, 25.0, 1.0, (0.0, 1.0))
    autumn_c = np.concatenate([rng.normal(10.0, 2.0, 38), [26.0, 27.0]])
    autumn = 1.0 + degrees(autumn_c) @ np.array([0.0, 1.0]) / 4.0 + rng.gamma(4.0, 0.1, (4, 40))
    pooled = pooled_response([summer[0], autumn], [summer[1], autumn_c], np.ones(4))
    _, alone = take_out_temperature(autumn, autumn_c, np.ones(4))
    adjusted, found = take_out_temperature(autumn, autumn_c, np.ones(4), pooled)
    hot = np.array([30.0])
    truth = 10.0 - float((degrees(autumn_c)[:, 1]).mean())
    assert alone is None or abs(float(alone.shift_kw(hot)[0]) - truth) > 3.0
    assert float(found.shift_kw(hot)[0]) == pytest.approx(truth, abs=1.0)
    left = adjusted.sum(axis=0)
    assert abs(left[-2:].mean() - left[:-2].mean()) < 3.0 * left[:-2].std()


def test_a_season_that_is_clearly_different_keeps_its_own_slope():
    rng = np.random.default_rng(3)
    one, other = season(rng, 60, 5.0, 1.0, (0.2, 0.0)), season(rng, 60, 5.0, 1.0, (1.6, 0.0))
    pooled = pooled_response([one[0], other[0]], [one[1], other[1]], np.ones(4))
    for (kw, temperature), slope in ((one, 0.2), (other, 1.6)):
        _, found = take_out_temperature(kw, temperature, np.ones(4), pooled)
        assert float(found.slope_kw_per_k[0]) == pytest.approx(slope, abs=0.1)


def test_chance_pools_to_nothing_and_few_days_to_nothing_at_all():
    rng = np.random.default_rng(4)
    kept = []
    for _ in range(30):
        kw = [rng.gamma(2.0, 1.0, (4, 40)) for _ in range(2)]
        kept.append(
            np.abs(pooled_response(kw, [rng.normal(5.0, 5.0, 40) for _ in range(2)], np.ones(4)).group_kw_per_k)
        )
    assert np.median(np.max(kept, axis=1)) < 0.02
    few = pooled_response([rng.gamma(2.0, 1.0, (4, 8))], [rng.normal(5.0, 5.0, 8)], np.ones(4))
    assert not few.group_kw_per_k.any() and not few.customer_kw_per_k.any()


def test_taking_the_response_out_does_not_make_customers_look_steadier_than_they_are():
    rng = np.random.default_rng(5)
    spread = []
    for _ in range(200):
        kw, temperature = season(rng, 14, 5.0, 1.0, (2.0, 0.0))
        adjusted, _ = take_out_temperature(kw, temperature, np.ones(4))
        spread.append(adjusted.var(axis=1, ddof=1).mean())
    assert np.mean(spread) == pytest.approx(0.04, rel=0.05)  # of a gamma law of shape 4 and scale 0.1
