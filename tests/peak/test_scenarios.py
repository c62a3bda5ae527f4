"""Load to come: additions to the distribution of the same hour, growth, pickup, and room left."""

from dataclasses import replace

import numpy as np
import pytest

from loadsum.demand.group import all_served, group_demand
from loadsum.demand.planned import Planned
from loadsum.peak.additions import AddedLoad, profiled, scaled_demand, switched, with_added
from loadsum.peak.exceedance import exceedance_hours
from loadsum.peak.scenarios import Growth, Pickup, Scenario, compare, scenario_demand
from loadsum.transformer.headroom import headroom
from tests.peak.samples import PLAIN, moody_days, one_block, reference

EVENING = [0.0] * 17 + [0.1, 0.3, 0.3, 0.3, 0.2, 0.1, 0.0]


def nothing(days=40, customers=1):
    kw = np.zeros((customers, days, 24))
    return group_demand([one_block(kw)], interval_min=60, power_factor=1.0, settings=PLAIN)


def homes(days=120, customers=6):
    kw = np.round(moody_days(days, customers, np.random.default_rng(4)).clip(0.0), 2)
    return group_demand([one_block(kw)], interval_min=60, power_factor=1.0, settings=PLAIN)


def chargers(count, synchronised=False):
    return switched("charger", count, 7.2, EVENING, interval_min=60, synchronised=synchronised)


# p = 0.3 at the hour, 7.2 kW, 95 % (computed_from_formula, binomial quantile).
@pytest.mark.parametrize("count", [1, 2, 5, 10, 20, 50, 100])
def test_diversified_chargers_agree_with_the_binomial_quantiles(count):
    published = reference("peak")["ev_binomial"]["expected"][str(count)]
    hour = with_added(nothing(), [chargers(count)]).hours[0][18]
    assert hour.quantile_kw(0.05) == pytest.approx(published["kW95_at_7.2"], abs=0.051)
    assert hour.mean_kw() == pytest.approx(0.3 * 7.2 * count, abs=0.03 * count)


def test_synchronised_chargers_are_one_block_all_on_or_all_off():
    hour = with_added(nothing(), [chargers(20, synchronised=True)]).hours[0][18]
    assert hour.exceedance(143.9).value == pytest.approx(0.3, abs=1e-12)
    assert hour.exceedance(144.1).value == pytest.approx(0.0, abs=1e-12)
    assert hour.exceedance(0.1).value == pytest.approx(0.3, abs=1e-12)


def test_an_addition_keeps_the_mean_and_variance_of_both_parts():
    base = homes()
    both = with_added(base, [chargers(20)])
    for i in (3, 18):
        old, new = base.hours[0][i], both.hours[0][i]
        p = EVENING[i]
        assert new.mean_kw() == pytest.approx(old.mean_kw() + 20 * p * 7.2, abs=0.5)
        assert new.variance_kw2() == pytest.approx(old.variance_kw2() + 20 * p * (1 - p) * 7.2**2, rel=0.01)
    assert both.hours[0][3].exceedance(4.0).value == pytest.approx(base.hours[0][3].exceedance(4.0).value, rel=1e-9)


def test_generation_reverses_the_flow_and_keeps_gross_demand_apart():
    sun = np.zeros((3, 24))
    sun[:, 10:15] = [[-1.0], [-3.0], [-5.0]]
    base = homes()
    net = with_added(base, [profiled("PV", 6, sun, synchronised=True)])
    hour = net.hours[0][12]
    assert not base.hours[0][12].can_export
    assert hour.can_export
    assert hour.mean_kw() == pytest.approx(base.hours[0][12].mean_kw() - 18.0, abs=0.2)
    assert hour.exceedance_kva(5.0, "exported").value > 0.25
    assert net.hours[0][19].exceedance(8.0) == base.hours[0][19].exceedance(8.0)


def test_load_comes_in_its_seasons_and_hours_only():
    transferred = profiled("feeder 7", 1, np.full((1, 24), 9.0), synchronised=True, hours=[18, 19])
    elsewhere = AddedLoad(
        name="summer", count=1, kw=transferred.kw, weight=transferred.weight, synchronised=True, seasons=("summer",)
    )
    base = nothing()
    assert with_added(base, [transferred]).hours[0][18].mean_kw() == pytest.approx(9.0, abs=0.03)
    assert with_added(base, [transferred]).hours[0][17].mean_kw() == 0.0
    assert with_added(base, [elsewhere]).hours[0][18].mean_kw() == 0.0


def test_intervals_without_readings_gain_none_from_an_addition():
    kw = np.zeros((1, 30, 24))
    kw[:, :, 18] = np.nan
    demand = group_demand([one_block(kw)], interval_min=60, power_factor=1.0, settings=PLAIN)
    assert with_added(demand, [chargers(3)]).hours[0][18] is None


def test_growth_of_every_reading_is_exact():
    base = homes()
    grown = scaled_demand(base, 1.5)
    for level in (4.0, 8.0, 12.0):
        a, b = base.hours[0][19].exceedance(level), grown.hours[0][19].exceedance(1.5 * level)
        assert b.value == pytest.approx(a.value, rel=1e-9)
    assert grown.hours[0][19].variance_kw2() == pytest.approx(2.25 * base.hours[0][19].variance_kw2())
    assert np.allclose(grown.sums_kw[0], 1.5 * base.sums_kw[0])


def meets(limit_h):
    return lambda demand, rating: exceedance_hours(demand, {"x": rating})["x"].year.expected_h <= limit_h


def test_the_first_year_of_failure_agrees_with_trying_every_year():
    base = homes()
    scenario = Scenario(name="growth", growth=Growth(pct_per_year=4.0), first_year=2031, horizon_years=20)
    ratings = [8.0, 31.0, 35.0, 50.0, 200.0]
    (found,) = compare(base, [scenario], ratings, share=[1.0], meets=meets(20.0))
    for row in found.by_rating:
        failing = [
            year
            for year in range(21)
            if not meets(20.0)(scenario_demand(base, scenario, rebuild=None, year=year), row.rating_kva)
        ]
        assert row.first_year == (2031 + failing[0] if failing else None)
    years = [row.first_year for row in found.by_rating]
    assert years[0] == 2031 and years[-1] is None and 2031 < years[2] <= 2051


def test_growth_in_number_and_of_a_class_ask_for_a_new_model():
    asked = []

    def rebuild(planned, factors):
        asked.append((tuple(planned), dict(factors)))
        return homes()

    number = Growth(pct_per_year=10.0, of="number of customers", customer_class="all", customers=6)
    kind = Growth(pct_per_year=10.0, of="customer class", customer_class="heated")
    scenario_demand(homes(), Scenario(name="a", growth=number), rebuild=rebuild, year=5)
    scenario_demand(homes(), Scenario(name="b", growth=kind), rebuild=rebuild, year=2)
    assert asked[0] == ((Planned(customer_class="all", count=4),), {})  # 6 x 1.1^5 = 9.66
    assert asked[1][1] == pytest.approx({"heated": 1.21})
    with pytest.raises(ValueError, match="rebuild"):
        scenario_demand(homes(), Scenario(name="b", growth=kind), rebuild=None, year=2)


def test_pickup_multiplies_demand_for_its_duration_only():
    base = homes()
    scenario = Scenario(name="pickup", pickup=Pickup(factor=2.0, duration_h=3.0, outages_per_year=0.5))
    (found,) = compare(base, [scenario], [20.0], share=[1.0], meets=meets(1.0))
    (row,) = found.by_rating
    expected = exceedance_hours(base, {"x": 10.0})["x"].year.expected_h / 8760.0
    assert row.pickup_hours_per_outage == pytest.approx(3.0 * expected)
    assert row.pickup_hours_per_year == pytest.approx(1.5 * expected)
    assert row.hours_per_year is None and row.meets is None


def test_scenarios_stand_side_by_side_and_synchronised_chargers_weigh_more():
    """20 chargers on six homes: diversified against synchronised."""
    asked = [
        Scenario(name="as metered"),
        Scenario(name="20 chargers, diversified", loads=(chargers(20),)),
        Scenario(name="20 chargers, one tariff start", loads=(chargers(20, synchronised=True),)),
    ]
    found = compare(homes(), asked, [50.0, 75.0, 100.0, 200.0], share=[1.0], meets=meets(50.0))
    hours = np.array([[row.hours_per_year for row in one.by_rating] for one in found])
    for one in found:
        print(one.name, [round(row.hours_per_year, 2) for row in one.by_rating], [row.meets for row in one.by_rating])
    assert np.all(np.diff(hours, axis=1) <= 0.0)
    assert np.all(hours[0] <= hours[1] + 1e-9)
    assert hours[2, 2] > 100.0 * hours[1, 2]
    assert [row.meets for row in found[1].by_rating] == [False, False, True, True]
    assert [row.meets for row in found[2].by_rating] == [False, False, False, True]
    assert found[1].mean_kw == pytest.approx(found[2].mean_kw, abs=0.5)


@pytest.mark.parametrize("synchronised", [False, True])
def test_headroom_agrees_with_brute_force_and_never_falls_with_the_rating(synchronised):
    base = homes()
    ratings = [8.0, 32.0, 50.0, 75.0, 100.0]
    made = {n: with_added(base, [chargers(n, synchronised)]) for n in range(61)}
    rows = headroom(ratings, "charger", made.__getitem__, meets(20.0), kw_each=2.16, most=59)
    for row in rows:
        good = [n for n in range(61) if meets(20.0)(made[n], row.rating_kva)]
        assert row.count == (good[-1] if good else None)
    counts = [-1 if row.count is None else row.count for row in rows]
    print(f"chargers by rating: {dict(zip(ratings, counts, strict=True))}")
    assert counts == sorted(counts)
    assert counts[-1] > 5


def test_headroom_says_what_limits_it_and_when_the_search_ended_first():
    base = nothing()
    rows = headroom(
        [10.0],
        "block of 1 kW",
        lambda n: with_added(base, [profiled("block", n, np.ones((1, 24)), synchronised=True)]),
        meets(1e-6),
        kw_each=1.0,
        limited_by=lambda demand, rating: "exceedance hours per year",
    )
    assert (rows[0].count, rows[0].kw, rows[0].limited_by) == (10, 10.0, "exceedance hours per year")
    (none,) = headroom([1.0], "x", lambda n: base, lambda demand, rating: None, kw_each=1.0)
    assert none.count is None
    (much,) = headroom([1.0], "x", lambda n: base, lambda demand, rating: True, kw_each=1.0, most=100)
    assert (much.count, much.at_least) == (100, True)
    with pytest.raises(ValueError, match="generates"):
        headroom([1.0], "PV", lambda n: base, lambda demand, rating: True, kw_each=-1.0)


def test_more_customers_of_a_class_go_through_the_model_and_its_common_component():
    kw = np.round(moody_days(60, 5, np.random.default_rng(4)).clip(0.0), 2)
    block = one_block(kw)

    def with_more(count):
        group = all_served(5)
        if count:
            group = replace(group, planned=(Planned(customer_class="all", count=count),))
        return group_demand([block], interval_min=60, power_factor=1.0, settings=PLAIN, group=group)

    rows = headroom([31.0, 50.0], "home", with_more, meets(20.0), kw_each=2.0)
    counts = [row.count for row in rows]
    brute = [max(n for n in range(20) if meets(20.0)(with_more(n), rating)) for rating in (50.0,)]
    assert counts[1] == brute[0]
    assert (counts[0] or 0) <= counts[1]


def test_an_addition_of_another_interval_is_refused():
    with pytest.raises(ValueError, match="48 intervals"):
        with_added(nothing(), [profiled("x", 1, np.ones((1, 48)), synchronised=False)])
    with pytest.raises(ValueError, match="24 probabilities"):
        switched("x", 1, 1.0, [0.5], interval_min=60, synchronised=False)
