"""The sum of the customers against the meter of the group."""

import numpy as np
import pytest

from loadsum.intake.findings import Finding
from loadsum.intake.load import load_readings
from loadsum.intake.reconcile import Clock, Compared, Reconciliation, groups_of, reconciled
from tests.intake.studies import study
from tests.intake.test_rules import HOURS, sound

HOUR = np.arange(HOURS, dtype=np.int64)
CLOCK = Clock(
    interval_min=60,
    interval_of_day=HOUR % 24,
    day_class=(HOUR // 24 % 7 >= 5).astype(np.int64),
    names=(("all year", "workday"), ("all year", "weekend or holiday")),
)
LAMP = np.where(HOUR % 24 < 6, 2.0, 0.0)


def compared(
    kw: np.ndarray, measured: np.ndarray, customers: list[int] | None = None, unit: str = ""
) -> tuple[Reconciliation, list[Finding]]:
    metered = Compared(names=tuple("ABCDEF"), start_utc=HOUR * 3600, kw=kw)
    head = Compared(names=("head",), start_utc=HOUR * 3600, kw=measured[None, :])
    rows = list(range(6)) if customers is None else customers
    results, found = reconciled(metered, head, {unit: ([0], rows)}, CLOCK)
    return results[0], list(found)


def test_the_unaccounted_part_is_told_by_hour_and_class_of_days():
    kw = sound()
    result, found = compared(kw, kw.sum(axis=0) + LAMP)
    np.testing.assert_allclose(result.unaccounted_kw, np.where(np.arange(24) < 6, 2.0, 0.0), atol=1e-9)
    assert result.unaccounted_share == pytest.approx(LAMP.sum() / (kw.sum() + LAMP.sum()))
    assert sum(part.intervals for part in result.by_class) == result.intervals == HOURS
    for part in result.by_class:
        mine = CLOCK.day_class == [name for _, name in CLOCK.names].index(part.day_type)
        expected = [kw.sum(axis=0)[mine & (h == HOUR % 24)].mean() for h in range(24)]
        np.testing.assert_allclose(part.summed_kw, expected)
        np.testing.assert_allclose(part.unaccounted_kw, np.where(np.arange(24) < 6, 2.0, 0.0), atol=1e-9)
    assert [f.rule for f in found] == ["reconciliation", "unmetered load"]


def test_unmetered_load_is_told_apart_from_losses_by_its_hours():
    kw = sound()
    result, found = compared(kw, 1.03 * kw.sum(axis=0) + LAMP)
    assert result.every_hour_share == pytest.approx(0.03 / 1.03, rel=1e-6)
    (lamp,) = [f for f in found if f.rule == "unmetered load"]
    assert "00:00 to 06:00" in lamp.message and lamp.count == 6 * 90
    _, alone = compared(kw, 1.03 * kw.sum(axis=0))
    assert [f.rule for f in alone] == ["reconciliation"] and alone[0].severity == "note"


def test_a_customer_of_another_transformer_is_suspected_by_name():
    kw = sound()
    _, found = compared(kw, 1.03 * kw[1:].sum(axis=0))
    assert [f.customer for f in found if f.rule == "suspected wrong link"] == ["A"]
    assert found[0].severity == "caution"


def test_a_customer_linked_elsewhere_that_is_behind_this_meter_is_suspected_by_name():
    kw = sound()
    _, found = compared(kw, kw[:4].sum(axis=0), [0, 1, 2], "T-1")
    (link,) = [f for f in found if f.rule == "suspected wrong link"]
    assert (link.customer, link.place) == ("D", "T-1") and "+1 means that it is behind" in link.message


def test_a_meter_named_as_a_transformer_is_held_against_its_customers_alone():
    asked = study(
        transformer=[
            {"id": name, "ratings_kva": [25], "power_factor": 0.9, "feeder_head": head}
            for name, head in (("T1", False), ("T2", False), ("H", True))
        ],
        customer=[
            {"id": "A", "transformer": "T1"},
            {"id": "B", "transformer": "T2"},
            {"id": "C", "transformer": "T2", "role": "reference only"},
        ],
    )
    groups = groups_of(asked, ("A", "B", "C", "X"), ("H", "T1", "T2", "somewhere"))
    assert groups == {"H": ([0], [0, 1]), "T1": ([1], [0]), "T2": ([2], [1]), "": ([3], [0, 1])}


def test_estimated_readings_are_in_neither_sum(tmp_path):
    stamps = (np.datetime64("2031-01-01T00") + np.arange(240)).astype(str)
    own = [
        "time,meter,kwh,flag",
        *(f"{t}:00,A,{1 if n >= 48 else 50},{'E' if n < 48 else 'A'}" for n, t in enumerate(stamps)),
    ]
    (tmp_path / "a.csv").write_text("\n".join(own))
    (tmp_path / "head.csv").write_text("\n".join(["time,meter,kwh", *(f"{t}:00,head,1" for t in stamps)]))
    asked = study(
        {"files": "a.csv", "flag_column": "flag", "estimated_flags": ["E"]}, {"files": "head.csv", "meters": "group"}
    )
    (result,) = load_readings(asked, tmp_path).reconciliation
    assert result.intervals == 192
    assert result.measured_kwh == result.summed_kwh == pytest.approx(192.0)
