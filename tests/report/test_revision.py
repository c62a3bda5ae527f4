"""What changed between two results, and how much of it each cause accounts for."""

import copy
import dataclasses
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from loadsum.report.energybymonth import energy_by_month
from loadsum.report.results import encode
from loadsum.report.revision import compare, shares
from tests.intake.test_revised import readings, replaced
from tests.report.invented_results import results

HOURS = {"a year": 8760, "and a month": 8760 + 744}


def study(found=None) -> dict:
    made = copy.deepcopy(results())
    made["months"] = encode(energy_by_month(found or readings(("A", "B"), 0, HOURS["a year"])))
    return made


def said(old: dict, new: dict) -> list[str]:
    return [str(change) for change in compare(old, new)]


def test_a_study_does_not_differ_from_itself():
    assert compare(study(), study()) == ()


def test_energy_by_month_adds_up_to_the_readings():
    found = readings(("A", "B"), 0, HOURS["a year"])
    for row, kw in zip(energy_by_month(found), found.kw, strict=True):
        assert row.first_month == "1970-01"
        assert row.readings[:2] == (744, 672)
        assert row.energy_kwh[1] == pytest.approx(kw[744 : 744 + 672].sum())
        assert sum(row.energy_kwh) == pytest.approx(np.nansum(kw))


def test_a_month_added_and_a_meter_replaced_are_named_and_nothing_else():
    new = study(replaced(readings(("A", "B"), 0, HOURS["and a month"]), "B", 2.0))
    changes = [change for change in compare(study(), new) if change.part == "readings"]
    assert [change.what for change in changes] == ["month 1971-01", "customer B, all months"]
    assert changes[0].new == "1488 readings"


def test_late_readings_are_told_by_their_months_and_a_customer_that_came_by_its_name():
    late = readings(("A", "B", "C"), 0, HOURS["a year"])
    kw = late.kw.copy()
    kw[0, 0:744] = np.nan
    old = study(dataclasses.replace(readings(("A", "B"), 0, HOURS["a year"]), kw=kw[:2].copy()))
    assert [change.what for change in compare(old, study(late))] == ["customer C", "customer A, 1970-01"]


def test_a_replaced_input_a_changed_limit_and_a_new_finding_are_named():
    old, new = study(), study()
    new["inputs"][0]["sha256"] = "f" * 64
    row = new["transformers"][0]["selection"]["criteria"][0]
    row["limit"] = row["limit"] / 2
    new["findings"].append(dict(new["findings"][0], rule="stuck value", customer="C-9", message="the same for 9 days"))
    parts = [change.part for change in compare(old, new)]
    assert parts.count("input") == parts.count("criterion") == parts.count("finding") == 1
    assert "finding: stuck value, C-9: added (the same for 9 days)" in said(old, new)


def test_a_changed_verdict_is_told_with_both_sentences():
    new = study()
    new["transformers"][0]["selection"]["sentence"] = "Another rating."
    (change,) = compare(study(), new)
    assert (change.part, change.new) == ("verdict", "Another rating.")


VALUES = {"month": 3.0, "meter": -1.0, "criterion": 5.0}


def test_shares_of_causes_that_do_not_act_on_one_another_are_their_own_effects():
    found = shares(list(VALUES), lambda chosen: 10.0 + sum(VALUES[cause] for cause in chosen))
    assert {share.cause: share.change for share in found} == pytest.approx(VALUES)
    assert sum(share.share for share in found) == pytest.approx(1.0)


def test_what_two_causes_do_only_together_is_halved_between_them():
    found = shares(["a", "b", "c"], lambda chosen: 4.0 if {"a", "b"} <= chosen else 0.0)
    assert [share.change for share in found] == pytest.approx([2.0, 2.0, 0.0])


@given(st.integers(1, 7), st.integers(0, 2**32 - 1))
def test_the_changes_add_up_to_the_whole_and_each_set_is_asked_for_once(count, seed):
    causes = [f"cause {n}" for n in range(count)]
    rng, asked = np.random.default_rng(seed), {}

    def figure(chosen):
        assert chosen not in asked
        asked[chosen] = float(rng.normal())
        return asked[chosen]

    found = shares(causes, figure)
    whole = asked[frozenset(causes)] - asked[frozenset()]
    assert sum(share.change for share in found) == pytest.approx(whole)


def test_no_change_has_no_shares():
    (share,) = shares(["a"], lambda chosen: 1.0)
    assert share.change == 0.0
    assert math.isnan(share.share)
