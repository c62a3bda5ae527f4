"""Expected exceedance hours: linear in the probabilities, limited to covered hours, never silent about the rest."""

import datetime as dt

import numpy as np
import pytest

from loadsum.demand.group import group_demand
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock, calendar
from loadsum.peak.exceedance import days_by_month, exceedance_hours
from loadsum.study.tables import DayTypes, Season
from tests.peak.samples import reference

PLAIN = ModelSettings(
    temperature=False, common_component=False, shrinkage=False, mean_uncertainty=False, lattice_kw=0.05
)


def block(season, days_per_year, kw):
    kw = np.asarray(kw, dtype=float)
    return DayBlock(
        season=season,
        day_type="all days",
        days_per_year=days_per_year,
        day=np.arange(kw.shape[1]),
        kw=kw,
    )


def two_seasons():
    winter = np.ones((2, 50, 24))
    winter[:, :1, 18] = 6.0  # each customer on 1 day of 50: independent, both at once 1 in 2500
    summer = np.ones((2, 40, 24))
    summer[:, :, 3] = np.nan
    blocks = [block("winter", 150.0, winter), block("summer", 215.0, summer)]
    return group_demand(blocks, interval_min=60, power_factor=1.0, settings=PLAIN)


def test_expected_hours_are_probability_times_length_summed():
    table = exceedance_hours(two_seasons(), {"10 kVA": 10.0, "5 kVA": 5.0})
    assert table["10 kVA"].year.expected_h == pytest.approx(150.0 / 2500.0, rel=1e-9)
    assert table["5 kVA"].year.expected_h == pytest.approx(150.0 * (1 - 0.98**2), rel=1e-9)
    assert table["5 kVA"].largest_probability.value == pytest.approx(1 - 0.98**2)
    assert (table["5 kVA"].largest_season, table["5 kVA"].largest_interval) == ("winter", 18)


# METHODS of expectation: 65 h at 0.02 and 60 h at 0.005 make 1.6 h (computed_from_formula, linearity of expectation).
def test_hours_of_two_classes_add_to_the_published_sum():
    def hourly(share):
        kw = np.zeros((1, 200, 24))
        kw[0, : round(200 * share), 0] = 9.0
        return kw

    demand = group_demand(
        [block("winter peak", 65.0, hourly(0.02)), block("summer peak", 60.0, hourly(0.005))],
        interval_min=60,
        power_factor=1.0,
        settings=PLAIN,
    )
    assert exceedance_hours(demand, {"limit": 5.0})["limit"].year.expected_h == pytest.approx(
        reference("peak")["class_hours"]["expected"]["expected_hours"], abs=1e-9
    )


def test_hours_without_readings_are_named_and_count_in_no_total():
    table = exceedance_hours(two_seasons(), {"0.5 kVA": 0.5})
    assert table.uncovered == ("summer, all days: 03:00 to 04:00",)
    assert table.hours_in_year == pytest.approx(8760.0)
    assert table.covered_h == pytest.approx(8760.0 - 215.0)
    assert table["0.5 kVA"].year.expected_h == pytest.approx(8760.0 - 215.0)
    assert np.isnan(table["0.5 kVA"].probability[1, 3])
    assert [part.covered_h for part in table["0.5 kVA"].by_season] == pytest.approx([3600.0, 215.0 * 23])


def test_a_limit_may_differ_by_class_of_days():
    table = exceedance_hours(two_seasons(), {"by season": np.array([20.0, 1.5])})
    assert [part.expected_h for part in table["by season"].by_season] == pytest.approx([0.0, 215.0 * 23], abs=1e-9)
    with pytest.raises(ValueError, match="one figure or 2"):
        exceedance_hours(two_seasons(), {"wrong": np.ones(3)})


def test_expected_hours_never_rise_with_the_level():
    levels = {f"{level}": level for level in (0.5, 1.9, 2.0, 6.9, 7.0, 11.9, 12.0)}
    hours = [level.year.expected_h for level in exceedance_hours(two_seasons(), levels).levels]
    assert hours == sorted(hours, reverse=True)
    assert hours[-1] == pytest.approx(0.0, abs=1e-9)


def test_months_share_the_hours_of_their_season_by_days():
    dates = calendar(
        [Season(name="winter", months=(1, 2, 11, 12)), Season(name="summer", months=tuple(range(3, 11)))],
        DayTypes(split="all days alike"),
        [2031],
    )
    month_days = days_by_month(dates, [2031])
    assert month_days.sum() == 365.0
    assert month_days[1].tolist() == [28.0, 0.0]
    assert month_days.sum(axis=0).tolist() == dates.days_per_year([2031])[:, 0].tolist()
    blocks = [block("winter", month_days[:, 0].sum(), np.full((1, 20, 24), 9.0))]
    blocks.append(block("summer", month_days[:, 1].sum(), np.zeros((1, 20, 24))))
    demand = group_demand(blocks, interval_min=60, power_factor=1.0, settings=PLAIN)
    level = exceedance_hours(demand, {"x": 5.0}, month_days=month_days)["x"]
    assert level.by_month[1].expected_h == pytest.approx(28 * 24)
    assert level.by_month[6].expected_h == pytest.approx(0.0, abs=1e-9)
    assert sum(part.expected_h for part in level.by_month) == pytest.approx(level.year.expected_h)


def test_holidays_move_days_between_classes_in_their_month():
    plain = calendar([], DayTypes(), [2031])
    with_holiday = calendar([], DayTypes(holidays=(dt.date(2031, 3, 3).isoformat(),)), [2031])
    change = days_by_month(with_holiday, [2031]) - days_by_month(plain, [2031])
    assert change[2].tolist() == [-1.0, 1.0]
    assert np.count_nonzero(change) == 2


def test_hours_far_out_in_the_tail_are_summed_from_tails_of_their_own():
    rng = np.random.default_rng(4)
    kw = np.rint(rng.gamma(2.0, 8.0, (8, 60, 24))) / 20.0
    demand = group_demand([block("year", 365.0, kw)], interval_min=60, power_factor=1.0, settings=PLAIN)
    top = max(hour.whole_up.points_kw[-1] for hour in demand.hours[0])
    level = exceedance_hours(demand, {"far": 0.9 * top})["far"]
    exact = [hour.total.up.tail(0.9 * top).probability for hour in demand.hours[0]]
    assert level.year.expected_h < 1e-6
    assert level.probability[0] == pytest.approx(exact, rel=1e-9, abs=1e-14)
