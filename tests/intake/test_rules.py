"""Each rule fires on the fault planted for it, and none on sound readings."""

import dataclasses

import numpy as np
import pytest

from loadsum.intake.findings import Finding
from loadsum.intake.grouprules import RULES, judged
from loadsum.intake.vee import Held
from loadsum.study.tables import FindingLimits

HOURS = 24 * 90
SHAPE = 1.0 + 0.8 * np.sin(np.arange(HOURS) * 2.0 * np.pi / 24.0)


def sound() -> np.ndarray:
    rng = np.random.default_rng(3)
    together = rng.gamma(4.0, 0.25, HOURS)
    return np.round(SHAPE * together * rng.gamma(3.0, 1.0 / 3.0, (6, HOURS)) + 0.05, 3)


def held(kw: np.ndarray, **changes: object) -> Held:
    hour = np.arange(HOURS, dtype=np.int64)
    whole = Held(
        customers=tuple("ABCDEF"),
        kw=kw,
        estimated=np.zeros(kw.shape, bool),
        start_utc=hour * 3600,
        local_day=hour // 24,
        interval_of_day=hour % 24,
        interval_min=60,
        may_export=frozenset(),
        service_kw={},
        limits=FindingLimits(),
    )
    return dataclasses.replace(whole, **changes)


def findings(kw: np.ndarray, **changes: object) -> dict[tuple[str, str], Finding]:
    _, found = judged(held(kw, **changes), np.ones(kw.shape, np.int16))
    return {(f.rule, f.customer): f for f in found}


def planted(change) -> dict[tuple[str, str], Finding]:
    kw = sound()
    change(kw)
    return findings(kw)


def test_sound_readings_give_no_finding():
    assert not findings(sound())


def test_a_gap_names_its_length_and_the_hour_it_most_often_takes():
    found = planted(lambda kw: kw.__setitem__((0, slice(30, 42)), np.nan))
    assert found["gap", "A"].count == 12
    assert "in 1 gap(s), the longest 12" in found["gap", "A"].message
    assert found["short day", "A"].count == 1
    assert set(found) == {("gap", "A"), ("short day", "A")}


def test_a_spike_is_found_even_where_a_few_of_them_stand():
    found = planted(lambda kw: kw.__setitem__((1, [100, 900]), 400.0))
    assert found["spike", "B"].count == 2


def test_stuck_values_and_zeros_like_a_gap_are_told_apart():
    def change(kw):
        kw[0, 100:150] = 0.7
        kw[1, 200:300] = 0.0

    found = planted(change)
    assert found["stuck value", "A"].count == 50
    assert found["zeros like a gap", "B"].count == 100


def test_an_outage_tells_the_demand_that_comes_back():
    def change(kw):
        kw[:, 500:503] = 0.0
        kw[:, 503] *= 3.0

    found = planted(change)
    assert found["outage", ""].count == 18
    assert "3 interval(s)" in found["outage", ""].message and "times what is usual then" in found["outage", ""].message


def test_export_is_doubted_only_where_nobody_said_it():
    kw = sound()
    kw[2, 10:20] = -1.0
    assert findings(kw)["negative demand", "C"].count == 10
    assert not findings(kw, may_export=frozenset("C"))


def test_demand_above_the_service_is_found():
    kw = sound()
    kw[3, 7] = 12.0
    assert findings(kw, service_kw={"D": 11.5})["above service rating", "D"].count == 1


def test_a_unit_taken_wrong_by_a_thousand_is_doubted():
    assert ("unit in doubt", "A") in planted(lambda kw: kw.__setitem__(0, kw[0] * 1000.0))


def test_a_customer_that_moves_out_is_found():
    found = planted(lambda kw: kw.__setitem__((4, slice(24 * 50, None)), 0.01 * kw[4, 24 * 50 :]))
    assert found["moved in or out", "E"].count == 40


def test_a_short_record_is_found():
    assert ("short record", "F") in planted(lambda kw: kw.__setitem__((5, slice(24 * 20, None)), np.nan))


def test_a_clock_that_moves_by_an_hour_is_found():
    def change(kw):
        kw[0, 24 * 60 :] = np.roll(kw[0], 1)[24 * 60 :]

    found = planted(change)
    assert "by +0 min early in its record and by -60 min late" in found["clock drift", "A"].message
    assert not any(rule == "clock drift" and who != "A" for rule, who in found)


def test_estimated_readings_are_counted():
    estimated = np.zeros((6, HOURS), bool)
    estimated[0, 5:9] = True
    assert findings(sound(), estimated=estimated)["flagged estimated", "A"].count == 4


def test_a_rule_that_the_user_excludes_by_leaves_its_readings_out_once():
    kw = sound()
    kw[0, 100:150] = 0.0
    kw[:, 120:123] = 0.0
    limits = FindingLimits(exclude=("zeros like a gap", "outage"))
    behind = np.full(kw.shape, 4, np.int16)
    left, found = judged(held(kw, limits=limits), behind)
    assert np.isnan(left).sum() * 4 == sum(f.excluded for f in found)
    assert np.isnan(left[0, 100:150]).all() and np.isnan(left[:, 120:123]).all()
    assert not np.isnan(kw).any()


@pytest.mark.parametrize("rule", RULES)
def test_every_rule_bears_readings_that_are_all_missing(rule):
    assert not [doubt for doubt in rule(held(np.full((6, HOURS), np.nan))) if doubt.slots.size]
