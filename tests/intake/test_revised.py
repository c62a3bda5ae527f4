"""Readings of a revision, one cause at a time."""

import dataclasses

import numpy as np
import pytest

from loadsum.intake.readings import Readings
from loadsum.intake.revised import reading_changes, with_changes


def readings(names: tuple[str, ...], first_hour: int, hours: int, seed: int = 1) -> Readings:
    """Readings that depend on the customer and the hour alone, so that two records of an hour agree."""
    start = np.arange(first_hour, first_hour + hours, dtype=np.int64)
    kw = np.array([[(ord(name) * 31 + hour * 7 * seed) % 97 / 10 for hour in start.tolist()] for name in names])
    return Readings(
        customers=names,
        start_utc=start * 3600,
        interval_min=60,
        local_day=start // 24,
        interval_of_day=start % 24,
        kw=kw,
        kvar=None,
        estimated=kw > 9.0,
        resolution_kw=np.array([0.1] * len(names)),
        findings=(),
        rows_in=kw.size,
    )


def replaced(old: Readings, name: str, factor: float) -> Readings:
    kw = old.kw.copy()
    kw[old.customers.index(name)] *= factor
    return dataclasses.replace(old, kw=kw)


def same(a: Readings, b: Readings) -> bool:
    arrays = ("start_utc", "local_day", "interval_of_day", "kw", "estimated", "resolution_kw")
    return a.customers == b.customers and all(
        np.array_equal(getattr(a, name), getattr(b, name), equal_nan=name == "kw") for name in arrays
    )


OLD = readings(("A", "B", "C"), 0, 240)
NEW = replaced(readings(("A", "B", "D"), 24, 300), "B", 1.5)


def test_every_cause_is_named_once():
    assert [change.cause for change in reading_changes(OLD, NEW)] == [
        "readings of 1970-01-11 to 1970-01-14 added",
        "readings of 1970-01-01 to 1970-01-01 gone",
        "customer D added",
        "customer C gone",
        "readings of customer B replaced",
    ]
    assert reading_changes(OLD, OLD) == ()


def test_no_cause_gives_the_old_readings_and_all_causes_the_new_ones():
    assert same(with_changes(OLD, NEW, ()), OLD)
    assert same(with_changes(OLD, NEW, reading_changes(OLD, NEW)), NEW)


def test_one_cause_changes_nothing_else():
    changes = {change.kind: change for change in reading_changes(OLD, NEW)}
    only = with_changes(OLD, NEW, [changes["readings replaced"]])
    assert only.customers == OLD.customers
    assert np.array_equal(only.start_utc, OLD.start_utc)
    assert np.array_equal(only.kw[[0, 2]], OLD.kw[[0, 2]])
    assert only.kw[1, 24:] == pytest.approx(1.5 * OLD.kw[1, 24:])
    longer = with_changes(OLD, NEW, [changes["period added"]])
    assert np.array_equal(longer.kw[:, :240], OLD.kw)
    assert np.isfinite(longer.kw[:2, 240:]).all()
    assert np.isnan(longer.kw[2, 240:]).all()


def test_readings_of_two_demand_intervals_are_not_compared():
    with pytest.raises(ValueError, match="demand intervals differ"):
        reading_changes(OLD, dataclasses.replace(OLD, interval_min=30))
