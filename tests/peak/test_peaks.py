"""Daily and annual peaks, run lengths and demand paths, on real homes and on invented truth."""

import datetime as dt
import time
from dataclasses import replace

import numpy as np
import pytest

from loadsum.demand.group import group_demand
from loadsum.intake.hourclass import EPOCH, lagged_daily_mean
from loadsum.intake.readings import TemperatureRecord
from loadsum.peak.chronology import draw_paths
from loadsum.peak.copula import DayCopula, choose_copula, fit_copula, weather_free_sums
from loadsum.peak.exceedance import exceedance_hours
from loadsum.peak.margins import margins
from loadsum.peak.peaks import peaks
from loadsum.peak.runlengths import score_runs
from loadsum.peak.weather import YearsOfDays, calendar_years, record_years
from tests.datasets import real_homes_temperature
from tests.peak.samples import (
    COARSE,
    PLAIN,
    home_blocks,
    home_days,
    homes_demand,
    moody_days,
    one_block,
    quarters,
    reference,
)

LEVELS = (20.0, 30.0, 37.5, 45.0)


@pytest.fixture(scope="module")
def homes():
    demand = homes_demand()
    copula, _ = choose_copula(demand.sums_kw, [block.day // 7 for block in demand.blocks])
    return demand, copula, margins(demand, copula), calendar_years(quarters(), [2017])


@pytest.fixture(scope="module")
def paths(homes):
    demand, copula, tables, years = homes
    rng = np.random.default_rng(11)
    return draw_paths(demand, copula=copula, margins=tables, years=years, count=400, rng=rng)


def test_expected_hours_equal_the_mean_over_demand_paths(homes, paths):
    table = exceedance_hours(homes[0], {f"{level}": level for level in LEVELS})
    for level in LEVELS:
        hours = (paths.kva() > level).reshape(400, -1).sum(axis=1)
        error = hours.std(ddof=1) / np.sqrt(400)
        assert abs(hours.mean() - table[f"{level}"].year.expected_h) < 4.0 * error


def test_daily_and_annual_levels_agree_with_brute_force_over_demand_paths(homes, paths):
    _, copula, tables, years = homes
    found = peaks(tables, copula, years, levels_kva={"45": 45.0}, record_days=364, rng=np.random.default_rng(1))
    day_peak = paths.kva().max(axis=1)
    year_peak = paths.kva().reshape(400, -1).max(axis=1)
    for level in found.daily:
        share = (day_peak > level.level_kva).mean()
        assert (
            abs(share - level.probability) < 4.0 * np.sqrt(level.probability / day_peak.size) + 0.01 * level.probability
        )
        assert level.lowest_kva <= np.quantile(day_peak, 1 - level.probability) <= level.highest_kva
    for level in found.annual:
        share = (year_peak > level.level_kva).mean()
        assert abs(share - level.probability) < 4.0 * np.sqrt(level.probability * (1 - level.probability) / 400)
        assert level.lowest_kva <= np.quantile(year_peak, 1 - level.probability) <= level.highest_kva
    (asked,) = found.levels
    assert asked.days_per_year == pytest.approx((day_peak > 45.0).mean() * 365, rel=0.05)
    assert asked.year_at_least <= (year_peak > 45.0).mean() <= asked.year_at_most
    top = np.bincount(paths.kw[paths.block == 0].argmax(axis=1), minlength=24) / (paths.block == 0).sum()
    assert found.time_of_peak[0] == pytest.approx(top, abs=0.04)


def test_one_metered_year_supports_no_claim_about_one_year_in_five(homes):
    _, copula, tables, years = homes
    found = peaks(tables, copula, years, levels_kva={}, record_days=365, rng=np.random.default_rng(1))
    assert [level.supported for level in found.annual] == [True, False, False, False]


# A model may be off by a factor 1.5 in how often its 10 % and 5 % levels are passed on days it has not seen.
# Weeks are halved by parity and each half is judged by the other: 364 held-out days of 17 real homes.
def held_out_shares(make_levels):
    passed, days = np.zeros(2), 0
    for parity in (0, 1):
        demand = homes_demand(parity)
        levels = make_levels(demand)
        for block in home_blocks(1 - parity):
            day_peak = block.kw.sum(axis=0).max(axis=1) / 0.95
            passed += [(day_peak > level).sum() for level in levels]
            days += block.day.size
    return passed / days


def by_copula(copula_of):
    def levels(demand):
        copula = copula_of(demand)
        years = calendar_years(quarters(), [2017])
        rng = np.random.default_rng(3)
        found = peaks(margins(demand, copula), copula, years, levels_kva={}, record_days=182, rng=rng)
        return [level.level_kva for level in found.daily[1:3]]

    return levels


def chosen(demand):
    return choose_copula(demand.sums_kw, [block.day // 7 for block in demand.blocks])[0]


def independent_hours(demand):
    blocks = len(demand.blocks)
    return DayCopula(
        correlation=np.repeat(np.eye(24)[None], blocks, axis=0),
        degrees_of_freedom=np.inf,
        days=np.zeros(blocks, dtype=np.int64),
    )


def independent_customer_days(demand):
    rng = np.random.default_rng(4)
    peak, weight = [], []
    for block in demand.blocks:
        drawn = [customer[rng.integers(block.day.size, size=2000)] for customer in block.kw]
        peak.append(np.sum(drawn, axis=0).max(axis=1) / 0.95)
        weight.append(np.full(2000, block.days_per_year))
    kva, share = np.concatenate(peak), np.concatenate(weight)
    order = np.argsort(kva)
    above = 1.0 - np.cumsum(share[order]) / share.sum()
    return [kva[order][np.argmax(above <= p)] for p in (0.10, 0.05)]


def test_daily_peaks_of_real_homes_are_passed_on_held_out_days_as_often_as_meant():
    shares = held_out_shares(by_copula(chosen))
    print(f"levels meant for 10 % and 5 % of days were passed on {shares} of held-out days")
    assert np.all(np.abs(np.log(shares / [0.10, 0.05])) < np.log(1.5))


def test_independent_hours_and_independent_customer_days_both_fail_on_the_same_days():
    hours = held_out_shares(by_copula(independent_hours))
    customer_days = held_out_shares(independent_customer_days)
    print(f"independent hours {hours}, independent customer-days {customer_days}")
    assert hours[1] < 0.05 / 1.5  # levels too high: the same risk is counted in hour after hour
    assert customer_days[1] > 0.05 * 1.5  # levels too low: what moves homes together is lost


def test_daily_peaks_of_an_invented_truth_are_passed_as_often_as_meant_down_to_one_day_in_a_hundred():
    rng = np.random.default_rng(8)
    kw = moody_days(600, 12, rng)
    demand = group_demand([one_block(kw)], interval_min=60, power_factor=1.0, settings=COARSE)
    copula = fit_copula(demand.sums_kw)
    dates = quarters()
    years = calendar_years(dates, [2017])
    one_class = type(years)(year=years.year, block=np.zeros_like(years.block), daily_c=None, by_interval_c=None)
    found = peaks(
        margins(demand, copula), copula, one_class, levels_kva={}, record_days=600, rng=np.random.default_rng(1)
    )
    truth = moody_days(40_000, 12, rng).sum(axis=0).max(axis=1)
    for level in found.daily:
        share = (truth > level.level_kva).mean()
        print(f"level meant for {level.probability:.0%} of days is passed on {share:.2%}")
        assert abs(np.log(share / level.probability)) < np.log(1.5)
        assert level.lowest_kva <= np.quantile(truth, 1 - level.probability) <= level.highest_kva


def test_runs_of_two_hours_and_more_on_held_out_days_lie_within_their_error():
    """17 homes; levels passed on one day in 2, 5 and 10; runs of 2, 3, 4 hours and more.

    The number of all runs, single hours included, is overstated by a fifth to a third: it is printed and documented.
    """
    expected, observed, variance = np.zeros((3, 4)), np.zeros((3, 4)), np.zeros((3, 4))
    for parity in (0, 1):
        demand = homes_demand(parity)
        copula = chosen(demand)
        tables = margins(demand, copula)
        years = calendar_years(quarters(), [2017])
        shares = (0.5, 0.2, 0.1)
        rng = np.random.default_rng(3)
        found = peaks(tables, copula, years, levels_kva={}, record_days=182, rng=rng, shares=shares)
        held_out = [block.kw.sum(axis=0) for block in home_blocks(1 - parity)]
        for k, rare in enumerate(found.daily):
            level = np.full(8, rare.level_kva)
            score = score_runs(tables, copula, held_out, level, np.random.default_rng(4))
            expected[k] += score.expected
            observed[k] += score.observed
            variance[k] += np.square(score.standard_error)
    for k in range(3):
        print(f"runs of 1, 2, 3, 4 hours: expected {expected[k].round(1)}, observed {observed[k]}")
    assert np.all(np.abs(observed - expected)[:, 1:] < 2.0 * np.sqrt(variance)[:, 1:])


def test_runs_of_independent_hours_are_far_too_short():
    demand = homes_demand(0)
    copula = independent_hours(demand)
    held_out = [block.kw.sum(axis=0) for block in home_blocks(1)]
    score = score_runs(margins(demand, copula), copula, held_out, np.full(8, 40.0), np.random.default_rng(4))
    assert score.ratio(4) > 2.0


def test_paths_over_a_temperature_record_keep_the_expected_hours_and_their_own_weather():
    temperature = real_homes_temperature()[1:]
    day, _ = home_days()
    by_interval = temperature[: day.size * 24].reshape(-1, 24)
    record = TemperatureRecord(day=day, daily_mean_c=by_interval.mean(axis=1), by_interval_c=by_interval)
    warmth = lagged_daily_mean(record)
    blocks = [
        replace(block, temperature_c=np.array([warmth.get(d, np.nan) for d in block.day.tolist()]))
        for block in home_blocks()[:2]
    ]
    demand = group_demand(blocks, interval_min=60, power_factor=0.95, settings=COARSE)
    assert any(hour.response is not None for row in demand.hours for hour in row)
    copula = fit_copula(weather_free_sums(demand))
    winter = np.concatenate([np.full(block.day.size, b) for b, block in enumerate(demand.blocks)])
    days = np.concatenate([block.day for block in demand.blocks])
    pick = np.random.default_rng(0).integers(winter.size, size=(3, 365))
    cold = np.array([warmth.get(d, np.nan) for d in days.tolist()])
    pick = np.where(np.isnan(cold[pick]), 5, pick)
    fine = dict(zip(day.tolist(), by_interval, strict=True))
    years = YearsOfDays(
        year=np.arange(3),
        block=winter[pick],
        daily_c=cold[pick],
        by_interval_c=np.array([[fine[d] for d in row] for row in days[pick].tolist()]),
    )
    tables = margins(demand, copula, years=years)
    assert tables.temperature_c is not None
    drawn = draw_paths(demand, copula=copula, margins=tables, years=years, count=200, rng=np.random.default_rng(2))
    assert drawn.ambient_c.shape == drawn.kw.shape
    for b in (0, 1):
        own = drawn.block == b
        for i in (8, 18):
            hour = demand.hours[b][i]
            assert drawn.kw[own, i].mean() == pytest.approx(hour.mean_kw(), rel=0.03)
            level = hour.quantile_kw(0.1)
            assert (drawn.kw[own, i] > level).mean() == pytest.approx(hour.exceedance(level).value, abs=0.02)
        slope = np.polyfit(drawn.ambient_c[own].mean(axis=1), drawn.kw[own, 8], 1)[0]
        response = demand.hours[b][8].response
        assert slope < 0.0 or response is None or response.explained < 0.05
    found = peaks(
        tables,
        copula,
        years,
        levels_kva={"40": 40.0},
        record_days=90,
        rng=np.random.default_rng(1),
        metered_years=years,
    )
    assert found.weather_years == 3
    assert [level.shift_kva for level in found.annual] == [0.0] * 4
    share = (drawn.kva().max(axis=1) > 40.0).mean()
    assert found.levels[0].days_per_year / 365.0 == pytest.approx(share, abs=0.02)


def test_a_thousand_years_cost_at_most_twenty_times_their_normals(homes):
    demand, copula, tables, years = homes
    rng = np.random.default_rng(0)
    start = time.perf_counter()
    rng.standard_normal((365_000, 24))
    normals = time.perf_counter() - start
    start = time.perf_counter()
    paths = draw_paths(demand, copula=copula, margins=tables, years=years, count=1000, rng=rng)
    ratio = (time.perf_counter() - start) / normals
    print(f"1000 years hourly took {ratio:.1f} times as long as their normals")
    assert paths.kw.shape == (365_000, 24)
    assert ratio < 20.0


def test_the_same_seed_draws_the_same_paths(homes):
    demand, copula, tables, years = homes
    two = [
        draw_paths(demand, copula=copula, margins=tables, years=years, count=2, rng=np.random.default_rng(9)).kw
        for _ in range(2)
    ]
    assert np.array_equal(two[0], two[1])


def test_intervals_without_readings_stay_unknown_in_the_paths():
    kw = np.ones((2, 30, 24))
    kw[:, :, 4] = np.nan
    demand = group_demand([one_block(kw)], interval_min=60, power_factor=1.0, settings=PLAIN)
    copula = fit_copula(demand.sums_kw)
    years = calendar_years(quarters(), [2017])
    one_class = type(years)(year=years.year, block=np.zeros_like(years.block), daily_c=None, by_interval_c=None)
    drawn = draw_paths(
        demand,
        copula=copula,
        margins=margins(demand, copula),
        years=one_class,
        count=1,
        rng=np.random.default_rng(0),
    )
    assert np.isnan(drawn.kw[:, 4]).all()
    assert np.isnan(drawn.kvar[:, 4]).all()
    assert np.isfinite(np.delete(drawn.kw, 4, axis=1)).all()


# p = 1e-4 in each of 8760 independent hours: some hour of the year with 0.58357 (computed_from_formula).
def test_a_year_of_independent_hours_agrees_with_the_published_probability():
    published = reference("peak")["annual"]["expected"]
    kw = np.zeros((1, 10_000, 24))
    kw[0, 0] = 5.0
    demand = group_demand([one_block(kw)], interval_min=60, power_factor=1.0, settings=PLAIN)
    copula = independent_hours(demand)
    years = calendar_years(quarters(), [2017])
    one_class = type(years)(year=years.year, block=np.zeros_like(years.block), daily_c=None, by_interval_c=None)
    found = peaks(
        margins(demand, copula),
        copula,
        one_class,
        levels_kva={"L": 2.5},
        record_days=365,
        rng=np.random.default_rng(0),
        shares=(0.5,),
        one_year_in=(2,),
    )
    # The quantile jumps from 0 to 5 kW inside one cell of the tables, which spread it: at most 2 % of a probability.
    assert found.levels[0].year == pytest.approx(float(published["indep_any"]), rel=0.02)
    assert exceedance_hours(demand, {"L": 2.5})["L"].year.expected_h == pytest.approx(published["E_hours"])
    assert found.levels[0].year_at_most == pytest.approx(0.876, rel=0.02)


def test_a_record_from_july_to_july_is_one_year_in_calendar_order():
    first = (dt.date(2030, 7, 1) - EPOCH).days
    day = np.arange(first, first + 367)
    record = TemperatureRecord(day=day, daily_mean_c=day.astype(float), by_interval_c=np.tile(day[:, None], 24) * 1.0)
    years = record_years(quarters(), record)
    assert years.year.size == 1
    dates = years.by_interval_c[0, :, 0]
    assert dates[0] == (dt.date(2031, 1, 1) - EPOCH).days
    assert dates[-1] == (dt.date(2030, 12, 31) - EPOCH).days
    assert years.daily_c[0, 0] == pytest.approx(0.7 * dates[0] + 0.3 * (dates[0] - 1))


def test_years_of_a_record_with_many_missing_days_are_left_out_and_named_and_few_are_counted():
    first = (dt.date(2030, 1, 1) - EPOCH).days
    whole = np.arange(first, first + 3 * 365 + 1)
    few = np.delete(whole, 400)  # one day gone, and the lagged mean of the next with it
    years = record_years(quarters(), TemperatureRecord(day=few, daily_mean_c=few.astype(float)))
    assert (years.year.tolist(), years.left_out, years.stand_ins) == ([2030, 2031, 2032], (), 2)
    assert years.daily_c[1, 35] == pytest.approx(whole[399] - 0.3)
    many = np.delete(whole, np.arange(400, 411))
    years = record_years(quarters(), TemperatureRecord(day=many, daily_mean_c=np.zeros(many.size)))
    assert (years.year.tolist(), years.left_out) == ([2030, 2032], (2031,))
    assert record_years(quarters(), TemperatureRecord(day=whole[:90], daily_mean_c=np.zeros(90))) is None
