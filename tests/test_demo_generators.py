"""The invented customers of the demos: the same each time, and believable."""

import numpy as np
import pytest
from scipy.stats import skew

from demo_feeders.invented import Clock, home_kw, household, outdoor_c, read_kwh, use, year_of


@pytest.fixture(scope="module")
def clock() -> Clock:
    return year_of(2030, "America/Denver", 60)


def home(clock: Clock, seed: int) -> np.ndarray:
    rng = np.random.default_rng(seed)
    outdoor = outdoor_c(clock, 10.0, 11.0, rng)
    of = household(rng, 1.2, heat_kw_per_c=0.08)
    return home_kw(of, clock, outdoor, rng.normal(0.0, 0.1, clock.days), rng)


def test_a_year_has_all_its_hours_and_one_short_and_one_long_day(clock):
    assert len(clock.local) == 8760
    assert sorted(np.unique(np.bincount(clock.day)).tolist()) == [23, 24, 25]


def test_the_same_seed_gives_the_same_home(clock):
    assert np.array_equal(home(clock, 5), home(clock, 5))
    assert not np.array_equal(home(clock, 5), home(clock, 6))


def test_homes_peak_in_the_evening_use_more_in_the_cold_and_have_skewed_readings(clock):
    kw = np.mean([home(clock, seed) for seed in range(8)], axis=0)
    by_hour = np.array([kw[clock.hour == hour].mean() for hour in range(24)])
    assert 17 <= by_hour.argmax() <= 21
    assert kw[clock.day < 59].mean() > 1.3 * kw[(clock.day > 150) & (clock.day < 240)].mean()
    assert skew(home(clock, 5)) > 1.0
    assert (kw >= 0.0).all()


def test_a_meter_shows_whole_steps_and_loses_nothing(clock):
    kw = home(clock, 5)
    kwh = read_kwh(kw, 60)
    assert np.abs(kwh / 0.01 - np.rint(kwh / 0.01)).max() < 1e-6
    assert kwh.sum() == pytest.approx(kw.sum(), abs=0.01)


def test_an_appliance_runs_for_its_hours_to_the_fraction_of_an_interval(clock):
    kw = np.zeros(8760)
    use(kw, clock, 10, 18.5, 1.25, 2.0)
    assert kw.sum() == pytest.approx(2.5)
    first = int(clock.first[10])
    assert kw[first + 18 : first + 20].tolist() == pytest.approx([1.0, 1.5])
