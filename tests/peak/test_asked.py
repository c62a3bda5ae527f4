"""Scenarios as the study file asks for them."""

import numpy as np
import pytest

from loadsum.errors import InputError
from loadsum.intake.profile import read_profile
from loadsum.peak.asked import headroom_asked, scenarios_asked
from loadsum.peak.scenarios import Growth, Pickup
from loadsum.study.load import study_from

GOOD = {
    "study": {"title": "t", "time_zone": "UTC", "demand_interval_min": 60},
    "readings": [{"files": "x.csv", "unit": "kWh", "stamp": "start"}],
    "transformer": [{"ratings_kva": [25.0], "power_factor": 0.95}],
    "season": [
        {"name": "winter", "months": [10, 11, 12, 1, 2, 3]},
        {"name": "summer", "months": [4, 5, 6, 7, 8, 9]},
    ],
    "customer": [{"id": "a", "customer_class": "home"}, {"id": "b", "customer_class": "shop"}],
    "scenario": [
        {"name": "chargers"},
        {
            "name": "growth",
            "growth_pct_per_year": 2.0,
            "growth_of": "number of customers",
            "growth_class": "home",
            "first_year": 2031,
            "horizon_years": 10,
        },
        {"name": "outage", "pickup_factor": 1.8, "pickup_h": 2.0},
    ],
    "addition": [
        {"name": "charger", "scenario": "chargers", "count": 20, "kw": 7.2, "share_by_hour": [0.1] * 24},
        {"name": "PV", "scenario": "chargers", "count": 3, "profile": "pv.csv", "synchronised": True},
        {"name": "homes", "scenario": "chargers", "kind": "customers", "customer_class": "home", "count": 4},
        {"name": "block of 1 kW", "kind": "block", "kw": 1.0, "seasons": ["winter"], "hours": [17, 18]},
    ],
}


def test_scenarios_are_made_from_their_tables_with_the_load_as_it_is_first():
    study = study_from(GOOD, "study.toml")
    profiles = {"pv.csv": np.zeros((2, 24))}
    first, chargers, growth, outage = scenarios_asked(
        study, interval_min=60, profiles=profiles, customers={"home": 6, "shop": 1}
    )
    assert (first.loads, first.customers) == ((), ())
    assert [(load.name, load.count, load.synchronised) for load in chargers.loads] == [
        ("charger", 20, False),
        ("PV", 3, True),
    ]
    assert chargers.customers[0].count == 4
    assert growth.growth == Growth(pct_per_year=2.0, of="number of customers", customer_class="home", customers=6)
    assert outage.pickup == Pickup(factor=1.8, duration_h=2.0, outages_per_year=0.0)
    (block,) = headroom_asked(study)
    assert block.name == "block of 1 kW"


def test_faults_of_scenarios_are_reported_together_with_what_to_do():
    spoilt = {
        **GOOD,
        "scenario": [
            {"name": "a", "growth_pct_per_year": 2.0, "growth_of": "customer class"},
            {"name": "a", "pickup_factor": 2.0},
        ],
        "addition": [
            {"name": "x", "scenario": "b", "kw": 1.0, "share_by_hour": [0.5]},
            {"name": "y", "seasons": ["autumn"]},
            {"name": "z", "kind": "customers", "customer_class": "farm"},
        ],
        "diversity_table": [
            {"name": "t", "customers": [1, 5], "factor": [1.0], "kind": "diversity factor"},
        ],
    }
    with pytest.raises(InputError) as caught:
        study_from(spoilt, "study.toml")
    assert [str(fault) for fault in caught.value.faults] == [
        "scenario[1].growth_pct_per_year: needs first_year and horizon_years beside it",
        "scenario[1].growth_class: missing; name the customer class that grows",
        'scenario[2].name: two scenarios are called "a"',
        "scenario[2].pickup_factor: needs pickup_h beside it, and pickup_h needs it",
        'addition[1].scenario: no scenario is called "b"',
        "addition[1].share_by_hour: must be 24 shares beside kw, got 1; none for a profile",
        'addition[2].seasons: no season is called "autumn"',
        "addition[2].kw: give either kw, with share_by_hour where it is not always on, or a profile",
        'addition[3].customer_class: no customer is of class "farm"',
        "diversity_table.factor: needs 2 factors, one a row, got 1",
    ]


def test_a_profile_is_averaged_up_to_the_demand_interval(tmp_path):
    path = tmp_path / "heat.csv"
    header = "day," + ",".join(f"{n}" for n in range(48))
    rows = ["mon," + ",".join(f"{n % 2 * 2.0}" for n in range(48)), "tue," + ",".join(["3"] * 48)]
    path.write_text("\n".join([header, *rows]) + "\n", encoding="utf-8")
    assert read_profile(path, 60).tolist() == [[1.0] * 24, [3.0] * 24]
    assert read_profile(path, 30).shape == (2, 48)


def test_faults_of_a_profile_name_every_line(tmp_path):
    path = tmp_path / "heat.csv"
    good = ",".join(["1"] * 24)
    path.write_text(f"day,{good}\na,{good}\nb,1,2\nc,{good[:-1]}x\nd,{good[:-1]}nan\n", encoding="utf-8")
    with pytest.raises(InputError) as caught:
        read_profile(path, 60)
    assert [fault.where for fault in caught.value.faults] == ["heat.csv:3", "heat.csv:4", "heat.csv:5"]
    with pytest.raises(InputError, match="the study needs 96"):
        read_profile(path, 15)
