"""Copula, tables and weather of one group, and what stands in where the group's own sums are few."""

import numpy as np
import pytest

from loadsum.demand.group import group_demand
from loadsum.peak.dayandyear import day_and_year
from tests.peak.samples import PLAIN, home_blocks, moody_days, one_block, quarters


def whole(demand, **more):
    return day_and_year(demand, calendar=quarters(), calendar_years_metered=[2017], **more)


def homes(gaps=0.0, parity=0):
    rng = np.random.default_rng(0)
    blocks = []
    for block in home_blocks(parity, slice(0, 4)):
        kw = block.kw.copy()
        kw[rng.random(kw.shape) < gaps] = np.nan
        blocks.append(type(block)(**{n: getattr(block, n) for n in block.__slots__} | {"kw": kw}))
    return group_demand(blocks, interval_min=60, power_factor=0.95, settings=PLAIN)


def test_a_group_with_whole_days_uses_its_own_sums():
    found = whole(homes())
    assert found.copula.source == "normal scores of the observed sums"
    assert max(found.copula_scores, key=found.copula_scores.__getitem__) == found.copula.degrees_of_freedom
    level = np.full(8, 15.0)
    asked = found.peaks({"15 kVA": 15.0}, np.random.default_rng(0))
    year = found.year_probability(level, 3, "delivered")
    assert asked.levels[0].year_at_least <= year <= asked.levels[0].year_at_most
    assert year == pytest.approx(asked.levels[0].year, abs=0.03)
    assert found.paths(1, np.random.default_rng(0)).kw.shape == (365, 24)


def test_where_some_meter_is_missing_every_day_the_mean_of_those_present_stands_in_and_says_so():
    found = whole(homes(gaps=0.05))
    assert "customers present" in found.copula.source
    near = [found.copula.correlation[0, i, i + 1] for i in range(23)]
    assert min(near) > 0.0


def test_without_any_whole_day_intervals_count_as_independent_and_say_so():
    kw = np.random.default_rng(0).random((2, 30, 24))
    kw[:, :, :] = np.where(np.arange(30)[:, None] % 5 == np.arange(24) % 5, np.nan, kw)
    dates = quarters()
    blocks = [one_block(kw)] + [one_block(np.full((2, 0, 24), np.nan), 0.0)] * (len(dates.season_names) * 2 - 1)
    demand = group_demand(blocks, interval_min=60, power_factor=1.0, settings=PLAIN)
    found = whole(demand)
    assert "only the bounds" in found.copula.source
    assert np.array_equal(found.copula.correlation[0], np.eye(24))
    lent = whole(demand, reference=[one_block(moody_days(60, 3, np.random.default_rng(1)))] * 8)
    assert "lend their class" in lent.copula.source
