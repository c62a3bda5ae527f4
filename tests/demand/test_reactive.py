"""Metered reactive demand decides the power factor where everyone served has it."""

from dataclasses import replace

import numpy as np
import pytest

from loadsum.demand.group import Group, all_served, group_demand
from loadsum.demand.planned import Planned
from loadsum.demand.reactive import metered_power_factors, power_factor_when_high, power_factors
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock
from loadsum.peak.exceedance import exceedance_hours

PLAIN = ModelSettings(
    temperature=False, common_component=False, shrinkage=False, mean_uncertainty=False, lattice_kw=0.05, resamples=0
)


def readings(rng, customers=5, days=60, intervals=3):
    kw = np.rint(rng.gamma(2.0, 0.6, (customers, days, intervals)) * 20.0) / 20.0
    angle = np.tan(np.arccos(np.array([0.98, 0.9, 0.8])))
    return kw, kw * angle * rng.uniform(0.8, 1.2, kw.shape)


def demand_of(kw, kvar, group=None):
    reactive = None if kvar is None else kvar.copy()
    days = np.arange(kw.shape[1])
    block = DayBlock(season="all", day_type="all days", days_per_year=365.0, day=days, kw=kw.copy(), kvar=reactive)
    return group_demand([block], interval_min=60, power_factor=0.95, settings=PLAIN, group=group)


def test_the_sums_are_put_together_and_not_the_customers_apparent_powers():
    kw, kvar = readings(np.random.default_rng(1))
    kw[0], kvar[0] = 1.0, -1.5  # one customer compensates the others
    found = power_factors(kw.sum(axis=0), kvar.sum(axis=0), 0.95)
    for i in range(3):
        p, q = kw[:, :, i].sum(axis=0), kvar[:, :, i].sum(axis=0)
        assert found[i] == pytest.approx(np.cos(np.arctan((p @ q) / (p @ p))))
        apparent = np.hypot(p, q)
        assert p[p > np.median(p)].sum() / apparent[p > np.median(p)].sum() == pytest.approx(found[i], abs=0.02)


def test_exceedance_agrees_with_the_metered_apparent_power_of_the_same_days():
    kw, kvar = readings(np.random.default_rng(2), customers=1, days=4000)
    level = 2.4
    table = exceedance_hours(demand_of(kw, kvar), {"x": level})["x"]
    truth = (np.hypot(kw.sum(axis=0), kvar.sum(axis=0)) > level).mean(axis=0)
    assert table.probability[0] == pytest.approx(truth, abs=0.02)
    stated = exceedance_hours(demand_of(kw, None), {"x": level})["x"]
    assert table.probability[0, 2] > 1.1 * stated.probability[0, 2]


def test_the_study_says_what_was_metered_and_the_stated_figure_stands_where_nothing_was():
    kw, kvar = readings(np.random.default_rng(3))
    demand = demand_of(kw, kvar)
    low, high = metered_power_factors(demand, 0.95)
    assert low == pytest.approx(0.8, abs=0.02) and high == pytest.approx(0.98, abs=0.02)
    assert low <= power_factor_when_high(demand) <= high
    assert metered_power_factors(demand_of(kw, None), 0.95) is None
    kvar[2] = np.nan  # one of five has no reactive meter
    assert metered_power_factors(demand_of(kw, kvar), 0.95) is None
    few = np.array(readings(np.random.default_rng(3))[1])
    few[:, 9:] = np.nan
    assert metered_power_factors(demand_of(kw, few), 0.95) is None


def test_planned_customers_have_no_reactive_meter_so_the_stated_figure_stands_for_all():
    kw, kvar = readings(np.random.default_rng(4))
    group = Group(
        served=np.ones(5, dtype=bool), classes=("home",) * 5, planned=(Planned(customer_class="home", count=2),)
    )
    assert metered_power_factors(demand_of(kw, kvar, group), 0.95) is None
    elsewhere = replace(all_served(5), served=np.array([True, True, True, False, False]))
    kvar[4] = np.nan  # not served: of no account
    assert metered_power_factors(demand_of(kw, kvar, elsewhere), 0.95) is not None
