"""Scenarios and headroom of a study, by the criteria of the choice of rating."""

import numpy as np
import pytest

from loadsum.demand.group import all_served, group_demand
from loadsum.errors import InputError
from loadsum.peak.additions import with_added
from loadsum.peak.asked import added_load
from loadsum.study.load import study_from
from loadsum.transformer.loadtocome import load_to_come
from loadsum.transformer.selection import evaluate
from tests.peak.samples import PLAIN, moody_days, one_block

RATINGS = (37.5, 50.0, 75.0, 100.0)
EVENING = [0.0] * 17 + [0.1, 0.3, 0.3, 0.3, 0.2, 0.1, 0.0]
ASKED = {
    "study": {"title": "t", "time_zone": "UTC", "demand_interval_min": 60},
    "readings": [{"files": "x.csv", "unit": "kWh", "stamp": "start"}],
    "transformer": [{"ratings_kva": list(RATINGS), "power_factor": 1.0}],
    "criterion": [{"quantity": "exceedance hours per year", "limit": 20.0, "of": "nameplate", "source": "this test"}],
    "scenario": [{"name": "diversified"}, {"name": "one tariff start"}, {"name": "more homes"}],
    "addition": [
        {"name": "charger", "scenario": "diversified", "count": 10, "kw": 7.2, "share_by_hour": EVENING},
        {
            "name": "charger",
            "scenario": "one tariff start",
            "count": 10,
            "kw": 7.2,
            "share_by_hour": EVENING,
            "synchronised": True,
        },
        {"name": "home", "scenario": "more homes", "kind": "customers", "customer_class": "all", "count": 5},
        {"name": "charger 7.2 kW", "kw": 7.2, "share_by_hour": EVENING},
        {"name": "home", "kind": "customers", "customer_class": "all"},
        {"name": "1 kW always on", "kind": "block", "kw": 1.0},
    ],
}


@pytest.fixture(scope="module")
def found():
    study = study_from(ASKED, "study.toml")
    block = one_block(np.round(moody_days(80, 6, np.random.default_rng(4)).clip(0.0), 2))

    def model(planned):
        group = all_served(6)
        group = type(group)(served=group.served, classes=group.classes, planned=tuple(planned))
        return group_demand([block], interval_min=60, power_factor=1.0, settings=PLAIN, group=group)

    demand = model(())
    scenarios, rooms = load_to_come(
        study, demand, RATINGS, profiles={}, customers={"all": 6}, rebuild=lambda planned, factors: model(planned)
    )
    return study, demand, scenarios, rooms


def test_scenarios_are_judged_by_the_criteria_of_the_choice(found):
    study, demand, scenarios, _ = found
    assert [one.name for one in scenarios] == ["load as it is", "diversified", "one tariff start", "more homes"]
    load = added_load(study.addition[0], 60, {})
    changed = with_added(demand, [load])
    chosen = evaluate(changed, RATINGS, study.criterion, study.allowed_loading)
    assert [row.meets for row in scenarios[1].by_rating] == [row.meets for row in chosen.criteria[0].by_rating]
    assert [row.hours_per_year for row in scenarios[1].by_rating] == pytest.approx(
        [row.value for row in chosen.criteria[0].by_rating]
    )
    first_met = [next((n for n, row in enumerate(one.by_rating) if row.meets), 99) for one in scenarios]
    assert first_met[0] < first_met[1] < first_met[2]
    assert scenarios[3].mean_kw == pytest.approx(scenarios[0].mean_kw * 11 / 6, rel=0.02)


def test_headroom_counts_chargers_customers_and_kw(found):
    _, _, _, rooms = found
    for name in ("charger 7.2 kW", "home", "1 kW always on"):
        counts = [-1 if row.count is None else row.count for row in rooms if row.what == name]
        print(name, counts)
        assert len(counts) == len(RATINGS)
        assert counts == sorted(counts)
        assert counts[-1] > counts[0]
    assert {row.limited_by for row in rooms} == {"exceedance hours per year"}
    block = [row for row in rooms if row.what == "1 kW always on"]
    assert [row.kw for row in block] == [row.count for row in block]


def test_headroom_in_generation_is_a_fault_of_the_study(found):
    _, demand, _, _ = found
    asked = {**ASKED, "scenario": [], "addition": [{"name": "PV", "kw": -3.0}]}
    with pytest.raises(InputError, match="generates"):
        load_to_come(
            study_from(asked, "study.toml"),
            demand,
            RATINGS,
            profiles={},
            customers={"all": 6},
            rebuild=lambda planned, factors: demand,
        )
