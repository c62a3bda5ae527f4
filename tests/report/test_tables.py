"""The smallest share of all intervals that a record supports."""

from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from loadsum.report.tables import pooled_floor


def record(high_days: Any, at_once: int) -> Any:
    """A year of 24 intervals a day with demand 1 and, on some days, 2 in the first intervals."""
    sums = np.ones((364, 24))
    sums[np.asarray(high_days), :at_once] = 2.0
    # day 4 after 1970-01-01 is a Monday, so that weeks are days 0-6, 7-13, ...
    return SimpleNamespace(sums_kw=(sums,), blocks=(SimpleNamespace(day=np.arange(364) + 4),), hours=())


def test_high_demand_that_comes_alone_leaves_one_interval_in_all_as_the_floor() -> None:
    assert pooled_floor(record(range(0, 364, 14), 1)) == pytest.approx(1.0 / (364 * 24 + 1))


def test_high_demand_that_comes_in_clusters_raises_the_floor_by_their_size() -> None:
    # two days of each seventh week, three intervals each: clusters of six
    days = [7 * week + day for week in range(0, 52, 7) for day in (1, 2)]
    assert pooled_floor(record(days, 3)) == pytest.approx(1.0 / (364 * 24 / 6 + 1))


def test_where_nobody_was_metered_together_the_mean_floor_of_the_hours_stands() -> None:
    hours = ((SimpleNamespace(floor=0.1), None), (SimpleNamespace(floor=0.04), SimpleNamespace(floor=0.04)))
    demand: Any = SimpleNamespace(
        sums_kw=(np.full((3, 2), np.nan),) * 2,
        blocks=(),
        hours=hours,
        hours_in_year=lambda: np.array([[100.0, 100.0], [50.0, 50.0]]),
    )
    assert pooled_floor(demand) == pytest.approx(0.07)
