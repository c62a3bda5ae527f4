"""Customers held against readings."""

import dataclasses

import numpy as np
import pytest

from loadsum.intake.customers import customer_findings
from loadsum.intake.readings import Readings
from loadsum.study.load import study_from
from loadsum.study.tables import Study

HOURS = 8760


def readings(**mean_kw: float) -> Readings:
    kw = np.array([np.full(HOURS, value) for value in mean_kw.values()])
    hour = np.arange(HOURS, dtype=np.int64)
    return Readings(
        customers=tuple(mean_kw),
        start_utc=hour * 3600,
        interval_min=60,
        local_day=hour // 24,
        interval_of_day=hour % 24,
        kw=kw,
        kvar=None,
        estimated=np.zeros(kw.shape, dtype=bool),
        resolution_kw=np.zeros(len(mean_kw)),
        findings=(),
        rows_in=kw.size,
    )


def study(*customers: dict, units: tuple[str, ...] = ("T-1",)) -> Study:
    tree = {
        "study": {"title": "test", "time_zone": "+00:00", "demand_interval_min": 60},
        "readings": {"files": "x.csv", "unit": "kWh", "stamp": "start"},
        "transformer": [{"id": unit, "ratings_kva": [25], "power_factor": 0.9} for unit in units],
        "customer": list(customers),
    }
    return study_from(tree, "study.toml")


def rules(found: tuple) -> list[tuple[str, str]]:
    return [(finding.rule, finding.customer or finding.place) for finding in found]


def test_customers_without_readings_readings_without_customer_and_idle_transformers_are_found():
    asked = study(
        {"id": "A", "transformer": "T-1"},
        {"id": "B", "transformer": "T-1", "annual_kwh": 4000},
        {"id": "C", "role": "planned", "transformer": "T-1"},
        {"id": "D"},
        units=("T-1", "T-2"),
    )
    found = customer_findings(asked, readings(A=0.5, D=0.5, X=0.5))
    assert rules(found) == [
        ("customer without readings", "B"),
        ("readings without customer", "X"),
        ("customer without transformer", "D"),
        ("transformer without customers", "T-2"),
    ]
    assert found[0].effect == "it takes the distribution of class all, scaled to its bills"


def test_a_study_that_lists_no_customer_serves_all_and_finds_nothing():
    assert customer_findings(study(), readings(A=0.5)) == ()


@pytest.mark.parametrize(
    ("billed", "words"),
    [
        (4383.0, None),
        (2191.5, "30-min power"),
        (1095.75, "15-min power"),
        (8766.0, "30-min power"),
        (1600.0, "check the unit,"),
    ],
)
def test_energy_that_is_twice_or_four_times_the_bills_points_at_power_taken_for_energy(billed, words):
    found = customer_findings(study({"id": "A", "annual_kwh": billed}), readings(A=0.5))
    if words is None:
        assert found == ()
    else:
        assert rules(found) == [("energy against bills", "A")]
        assert words in found[0].message


def test_monthly_bills_are_summed():
    asked = study({"id": "A", "monthly_kwh": [100.0] * 12})
    assert "1200 kWh billed" in customer_findings(asked, readings(A=0.5))[0].message


def test_a_study_of_one_transformer_says_that_the_customers_of_others_are_not_served():
    asked = study({"id": "A", "transformer": "T-1"}, {"id": "B", "transformer": "T-2"})
    (found,) = customer_findings(asked, readings(A=0.5, B=0.5))
    assert (found.rule, found.count) == ("customers of other transformers", 1)


def test_the_head_of_a_feeder_is_no_transformer_without_customers():
    asked = study({"id": "A", "transformer": "T-1"}, units=("T-1", "head"))
    assert rules(customer_findings(asked, readings(A=0.5))) == [("transformer without customers", "head")]
    head = dataclasses.replace(asked.transformer[1], feeder_head=True)
    asked = dataclasses.replace(asked, transformer=(asked.transformer[0], head))
    assert customer_findings(asked, readings(A=0.5)) == ()
