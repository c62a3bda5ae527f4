"""The normal family at each rating of a group, and from how many customers on the normal law would do."""

import numpy as np
import pytest
from scipy.stats import norm

from loadsum.demand.group import group_demand
from loadsum.demand.normalfamily import normal_family
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock

OWN_READINGS = ModelSettings(
    temperature=False, common_component=False, shrinkage=False, mean_uncertainty=False, lattice_kw=0.1, resamples=0
)


def demand_of(kw, settings):
    block = DayBlock(season="all", day_type="all days", days_per_year=365.0, day=np.arange(kw.shape[1]), kw=kw)
    return group_demand([block], interval_min=60, power_factor=0.9, settings=settings)


def skewed(mood=0.0):
    rng = np.random.default_rng(11)
    kw = rng.gamma(0.6, 1.5, (12, 80, 3)) + mood * rng.gamma(0.5, 1.0, (80, 3))
    kw[:, :, 2] *= 2.0
    return np.rint(kw * 10.0) / 10.0


def test_every_rating_is_looked_at_where_it_is_exceeded_most_and_against_the_exact_sum():
    demand = demand_of(skewed(), OWN_READINGS)
    found = normal_family(demand, {20.0: np.array([20.0]), 45.0: np.array([40.5])})
    assert [row.rating_kva for row in found.by_rating] == [20.0, 45.0]
    for row, level_kw in zip(found.by_rating, (18.0, 36.45), strict=True):
        hour = demand.hours[0][2]
        assert (row.interval, row.level_kw) == (2, pytest.approx(level_kw))
        assert row.adopted == pytest.approx(hour.independent.above(level_kw), rel=1e-6)
        mean, variance = hour.independent.mean_kw(), hour.independent.central_moment(2)
        assert row.normal_independent == pytest.approx(norm.sf(level_kw, mean, variance**0.5), rel=1e-6)
        assert row.times_too_small == pytest.approx(row.adopted / row.normal_covariance)
        assert row.saddlepoint == pytest.approx(row.adopted, rel=0.1)
        assert abs(row.adopted - row.normal_covariance) <= row.largest_distance
    assert found.by_rating[1].times_too_small > 1.5


def test_independent_customers_come_near_the_normal_law_and_those_who_share_a_skewed_mood_never_do():
    alone = normal_family(demand_of(skewed(), OWN_READINGS), {})
    assert alone.customers == 12
    assert [reach.answer for reach in alone.together] == [reach.answer for reach in alone.independent]
    one, rare = (reach.customers or 10_000 for reach in alone.independent)
    assert 12 < one < rare
    moody = ModelSettings(temperature=False, mean_uncertainty=False, shrinkage=False, lattice_kw=0.1, resamples=0)
    together = normal_family(demand_of(skewed(0.8), moody), {}).together
    assert [reach.answer for reach in together] == ["never, because of shared weather"] * 2


def test_a_rating_out_of_reach_has_no_row_and_nobody_no_comparison():
    demand = demand_of(skewed(), OWN_READINGS)
    assert normal_family(demand, {900.0: np.array([900.0])}).by_rating == ()
    assert normal_family(demand_of(np.full((2, 10, 3), np.nan), OWN_READINGS), {}) is None
