import numpy as np

from loadsum.intake.readings import Readings
from loadsum.report.quality import quality_calendar


def test_each_day_of_each_customer_is_full_partly_there_estimated_or_missing() -> None:
    kw = np.ones((2, 96))
    kw[0, 30] = np.nan
    kw[1, 48:72] = np.nan
    estimated = np.zeros((2, 96), dtype=bool)
    estimated[0, 80] = True
    readings = Readings(
        customers=("a", "b"),
        start_utc=np.arange(96, dtype=np.int64) * 3600,
        interval_min=60,
        local_day=np.repeat(np.arange(10, 14), 24),
        interval_of_day=np.tile(np.arange(24), 4),
        kw=kw,
        kvar=None,
        estimated=estimated,
        resolution_kw=np.zeros(2),
        findings=(),
        rows_in=192,
    )
    calendar = quality_calendar(readings)
    assert (calendar.first_day, calendar.days) == (10, 4)
    assert dict(calendar.customers) == {
        "a": ((1, "f"), (1, "p"), (1, "f"), (1, "e")),
        "b": ((2, "f"), (1, "-"), (1, "f")),
    }
