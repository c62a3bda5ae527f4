"""Makes the readings of an invented pole transformer with nine homes: hourly, one year, one weather for all.

Run it again and the same bytes come out. Nothing here is a measurement.
"""

import csv
import datetime as dt
import gzip
import io
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np

HERE = Path(__file__).parent
SEED = 20300101
ZONE = ZoneInfo("America/Chicago")
START = dt.datetime(2030, 1, 1, tzinfo=ZONE)
END = dt.datetime(2031, 1, 1, tzinfo=ZONE)
STEP_KWH = 0.01  # what the invented meters resolve

# home: annual base [kW], electric heating [kW per degree below 14 °C], cooling [kW per degree above 22 °C],
# morning and evening habit [kW], hour of the evening peak, washing days
HOMES = {
    "0101": (0.22, 0.00, 0.10, 0.6, 1.5, 18, (5, 6)),
    "0102": (0.30, 0.11, 0.13, 0.9, 1.9, 18, (0, 3, 5)),
    "0103": (0.18, 0.00, 0.00, 0.3, 1.0, 20, (6,)),
    "0104": (0.45, 0.14, 0.16, 1.1, 2.3, 17, (1, 5, 6)),
    "0105": (0.25, 0.00, 0.12, 0.5, 1.6, 19, (2, 6)),
    "0106": (0.35, 0.12, 0.11, 0.8, 2.0, 18, (0, 4, 6)),
    "0107": (0.20, 0.08, 0.00, 0.2, 1.2, 21, (5,)),
    "0108": (0.28, 0.00, 0.14, 0.9, 1.8, 18, (1, 6)),
    "0109": (0.40, 0.13, 0.15, 1.0, 2.1, 19, (2, 4, 5)),
}


def temperature(hours: int, rng: np.random.Generator) -> np.ndarray:
    """Hourly outdoor temperature: season, time of day, and fronts that last some days. [°C]"""
    hour = np.arange(hours)
    season = 9.5 - 13.5 * np.cos(2 * np.pi * (hour / 24 - 18) / 365.0)
    daily = 4.2 * np.cos(2 * np.pi * (hour % 24 - 16) / 24)
    fronts, shocks = np.zeros(hours // 24 + 3), rng.normal(0.0, 2.9, hours // 24 + 3)
    for day in range(1, fronts.size):
        fronts[day] = 0.72 * fronts[day - 1] + shocks[day]
    return season + daily + np.interp(hour / 24, np.arange(fronts.size), fronts)


def home(
    name: str, local: list[dt.datetime], outdoor: np.ndarray, mood: np.ndarray, rng: np.random.Generator
) -> np.ndarray:
    """Hourly energy of one home. [kWh]"""
    base, heating, cooling, morning, evening, peak, washing = HOMES[name]
    hours = len(local)
    clock = np.array([t.hour for t in local])
    weekday = np.array([t.weekday() for t in local])
    day = np.array([(t.date() - START.date()).days for t in local])
    late = np.where(weekday >= 5, 2.0, 0.0)
    felt = np.convolve(np.pad(outdoor, (11, 0), mode="edge"), np.full(12, 1 / 12), mode="valid")

    kwh = base * rng.gamma(6.0, 1 / 6.0, hours)
    # habits: some days busy, some idle, the same whim for a whole day and partly shared by the street
    whim = np.exp(rng.normal(0.0, 0.35, day.max() + 1) + mood[: day.max() + 1])[day]
    kwh += morning * whim * np.exp(-0.5 * ((clock - 7 - late) / 1.1) ** 2) * rng.gamma(1.6, 1 / 1.6, hours)
    kwh += evening * whim * np.exp(-0.5 * ((clock - peak) / 1.7) ** 2) * rng.gamma(1.8, 1 / 1.8, hours)
    # heat and cold: the thermostat cycles, and works less at night
    night = np.where((clock < 6) | (clock > 22), 0.75, 1.0)
    kwh += heating * np.maximum(14.0 - felt, 0.0) * night * rng.gamma(5.0, 0.2, hours)
    kwh += cooling * np.maximum(felt - 22.0, 0.0) * rng.gamma(4.0, 0.25, hours)
    # washing, drying, baking: rare and large
    for date in range(day.max() + 1):
        of_day = np.flatnonzero(day == date)
        if weekday[of_day[0]] in washing and rng.random() < 0.8:
            first = of_day[min(int(rng.integers(9, 20)), of_day.size - 3)]
            kwh[first : first + 2] += rng.uniform(1.2, 2.6, 2)
    # away: a week or two a year at base load only
    for _ in range(int(rng.integers(1, 3))):
        first = int(rng.integers(0, day.max() - 12))
        gone = (day >= first) & (day < first + int(rng.integers(4, 11)))
        kwh[gone] = base * rng.uniform(0.5, 0.8, int(gone.sum()))
    return np.round(kwh / STEP_KWH) * STEP_KWH


def gzipped(rows: list[list[str]]) -> bytes:
    """Rows as gzipped delimited text whose bytes do not depend on the time of day."""
    text = io.StringIO()
    csv.writer(text, lineterminator="\n").writerows(rows)
    return gzip.compress(text.getvalue().encode("utf-8"), 9, mtime=0)


def main() -> None:
    """Write the files beside this one."""
    rng = np.random.default_rng(SEED)
    utc = [START.astimezone(dt.UTC) + dt.timedelta(hours=h) for h in range(int((END - START).total_seconds() // 3600))]
    local = [t.astimezone(ZONE) for t in utc]
    outdoor = temperature(len(utc), rng)
    mood = rng.normal(0.0, 0.12, 400)
    kwh = {name: home(name, local, outdoor, mood, rng) for name in HOMES}
    stamps = [t.strftime("%Y-%m-%dT%H:%M:%S%z") for t in local]

    wide = [name for name in HOMES if name != "0107"]
    rows = [["stamp", *wide]]
    rows += [[stamps[h], *(f"{kwh[name][h]:.2f}" for name in wide)] for h in range(len(utc))]
    (HERE / "meters.csv.gz").write_bytes(gzipped(rows))

    # The ninth meter is read by another system: one row a reading, a gap in March, estimates after it.
    rows = [["meter", "read_at", "kwh", "flag"]]
    for h, t in enumerate(local):
        if dt.date(2030, 3, 12) <= t.date() < dt.date(2030, 3, 15):
            continue
        flag = "E" if dt.date(2030, 3, 15) <= t.date() < dt.date(2030, 3, 17) else "A"
        rows.append(["0107", stamps[h], f"{kwh['0107'][h]:.2f}", flag])
    (HERE / "meter_0107.csv.gz").write_bytes(gzipped(rows))

    rows = [["stamp", "outdoor_c"]]
    rows += [[stamps[h], f"{outdoor[h]:.1f}"] for h in range(len(utc))]
    (HERE / "temperature.csv.gz").write_bytes(gzipped(rows))


if __name__ == "__main__":
    main()
