"""Makes the readings of an invented feeder of 24 transformers, with the dirt that real exports have.

From the checkout: python -m demo_feeders.mixed_feeder.generate

What is wrong with the readings, on purpose:

- west.csv: two gaps of days, estimated readings, a meter that is stuck for 16 days, an outage of seven hours;
- east.csv: stamps without an offset, and an export that gets both clock changes wrong: a reading of zero for the
  hour that does not exist in spring, the repeated hour of autumn written once with the energy of both; some homes
  export solar power;
- trade.csv: half-hourly readings headed kWh that are kW, twice too large;
- a customer billed and not metered, a meter that no customer has, a transformer that nobody is connected to.
"""

import datetime as dt
from pathlib import Path

import numpy as np

from demo_feeders.invented import (
    Clock,
    business_kw,
    home_kw,
    household,
    outdoor_c,
    pump_kw,
    read_kwh,
    texts,
    write,
    year_of,
)

HERE = Path(__file__).parent
ZONE, YEAR, SEED = "America/Denver", 2030, 20300424
WEST = {f"T-{n:02d}": homes for n, homes in enumerate([6, 9, 4, 7, 11, 5, 8, 6, 10, 3], start=1)}
EAST = {f"T-{n:02d}": homes for n, homes in enumerate([7, 5, 9, 6, 8, 4, 10, 7], start=11)}
TRADE = {"T-19": 4, "T-20": 5, "T-21": 3}
CHARGED, HEATED = (1, 4), (0, 3)  # of five homes: those with a charger, those with electric heating


def names(groups: dict[str, int], letter: str) -> list[tuple[str, str, int]]:
    """Customer, transformer and running number of every customer of some transformers."""
    places = [unit for unit, count in groups.items() for _ in range(count)]
    return [(f"{letter}{n:03d}", unit, n) for n, unit in enumerate(places, start=1)]


def of_home(n: int, solar: bool) -> dict[str, float | bool]:
    """What the home with a running number has."""
    more: dict[str, float | bool] = {"cool_kw_per_c": 0.16 if n % 3 else 0.0}
    if n % 5 in HEATED:
        more["heat_kw_per_c"] = 0.09
    if n % 5 in CHARGED and n % 2:
        more |= {"charger_kw": 7.2, "charges": 0.5, "timer": n % 4 == 3}
    if solar and n % 3 == 0:
        more["solar_kw"] = 4.0
    return more


def homes(group: dict[str, int], letter: str, clock: Clock, outdoor: np.ndarray, rng: np.random.Generator):
    """Hourly energy of every home of a group, by customer, and the transformer of each. [kWh]"""
    mood = rng.normal(0.0, 0.10, clock.days)
    found = {}
    for name, unit, n in names(group, letter):
        of = household(rng, float(rng.choice([0.9, 1.2, 1.6])), **of_home(n, letter == "E"))
        found[name] = (unit, read_kwh(home_kw(of, clock, outdoor, mood, rng), clock.minutes))
    return found


def west(clock: Clock, outdoor: np.ndarray, rng: np.random.Generator) -> dict:
    """One row a reading, stamps with their offset; gaps, estimates, a stuck meter, an outage."""
    found = homes(WEST, "W", clock, outdoor, rng)
    day = clock.day
    flags = {name: np.full(day.size, "A") for name in found}
    for name, first, last in (("W005", 61, 66), ("W023", 200, 212)):
        found[name][1][(day >= first) & (day < last)] = np.nan
        flags[name][(day >= last) & (day < last + 2)] = "E"
    stuck = (day >= 120) & (day < 136)
    found["W031"][1][stuck] = 0.37
    dark = (day == 32) & (clock.hour >= 15) & (clock.hour < 22)  # in a winter storm
    for unit, kwh in found.values():
        if unit == "T-05":
            kwh[dark] = 0.0
    stamps = [t.isoformat(timespec="minutes") for t in clock.local]
    rows = [["meter_no", "interval_start", "kwh_delivered", "quality"]]
    for name, (_, kwh) in found.items():
        lines = zip(stamps, texts(kwh), flags[name].tolist(), strict=True)
        rows += [[name, stamp, value, flag] for stamp, value, flag in lines if value]
    rows += [["W999", stamp, "0.25", "A"] for stamp in stamps[: 24 * 40]]  # a meter that no customer has
    write(HERE / "readings/west.csv.gz", rows)
    return found


def east(clock: Clock, outdoor: np.ndarray, rng: np.random.Generator) -> dict:
    """One column a customer, stamps without offset, both clock changes wrong."""
    found = homes(EAST, "E", clock, outdoor, rng)
    table = np.array([kwh for _, kwh in found.values()])
    rows: list[list[str]] = [["Local Time", *found]]
    for n, t in enumerate(clock.local):
        if n and clock.local[n - 1].utcoffset() != t.utcoffset():
            if t.utcoffset() > clock.local[n - 1].utcoffset():  # spring: a row for the hour that does not exist
                rows.append([t.replace(hour=t.hour - 1).strftime("%Y-%m-%d %H:%M"), *texts(np.zeros(len(found)))])
            else:  # autumn: the repeated hour was already written with the energy of both
                continue
        values = table[:, n]
        if n + 1 < len(clock.local) and clock.local[n + 1].utcoffset() < t.utcoffset():
            values = values + table[:, n + 1]
        rows.append([t.strftime("%Y-%m-%d %H:%M"), *texts(values)])
    write(HERE / "readings/east.csv.gz", rows)
    return found


def trade(outdoor: np.ndarray, rng: np.random.Generator) -> dict:
    """Half-hourly readings of shops, headed kWh, that are kW."""
    clock = year_of(YEAR, ZONE, 30)
    fine = np.repeat(outdoor, 2)
    found = {}
    for name, unit, n in names(TRADE, "S"):
        peak, sunday = rng.uniform(9.0, 28.0), () if n % 2 else (6,)
        kw = business_kw(peak, 7.5 + n % 3, 18.0 + n % 4, (0, 1, 2, 3, 4, 5, *sunday), clock, fine, rng)
        found[name] = (unit, read_kwh(kw, 30))
    stamps = [t.isoformat(timespec="minutes") for t in clock.local]
    rows = [["account", "period_end", "kWh"]]
    ends = [*stamps[1:], f"{YEAR + 1}-01-01T00:00-07:00"]
    for name, (_, kwh) in found.items():
        rows += [[name, stamp, value] for stamp, value in zip(ends, texts(2.0 * kwh), strict=True)]
    write(HERE / "readings/trade.csv.gz", rows)
    return found


def large(outdoor: np.ndarray, rng: np.random.Generator) -> dict:
    """Quarter-hourly average power of a school and a pump station, UTC."""
    clock = year_of(YEAR, ZONE, 15)
    fine = np.repeat(outdoor, 4)
    holidays = [range(7), range(150, 228), range(356, 365), range(84, 91)]
    school = business_kw(118.0, 7.0, 16.5, (0, 1, 2, 3, 4), clock, fine, rng, closed=holidays, cooling=0.02)
    found = {"SCHOOL": ("T-22", school / 4), "PUMPS": ("T-23", pump_kw(66.0, clock, rng) / 4)}
    rows = [["utc_start", *found]]
    stamps = [t.astimezone(dt.UTC).strftime("%Y-%m-%dT%H:%MZ") for t in clock.local]
    rows += [[s, *v] for s, *v in zip(stamps, *(texts(4 * kwh) for _, kwh in found.values()), strict=True)]
    write(HERE / "readings/large.csv.gz", rows)
    return found


def customers(groups: list[tuple[str, dict]]) -> None:
    """The customer table: what the planner's own records say."""
    rows = [["id", "customer_class", "role", "transformer", "annual_kwh", "devices", "export"]]
    for kind, found in groups:
        for name, (unit, kwh) in found.items():
            devices, export = "", ""
            if kind == "home":
                has = of_home(int(name[1:]), name.startswith("E"))
                words = {"charger_kw": "EV charger", "heat_kw_per_c": "electric heating", "solar_kw": "solar"}
                devices = "; ".join(word for key, word in words.items() if has.get(key))
                export = "yes" if has.get("solar_kw") else ""
            billed = "" if np.isnan(kwh).any() else f"{float(kwh[kwh > 0.0].sum()):.0f}"  # what is delivered is billed
            class_name = {"SCHOOL": "school", "PUMPS": "pump station"}.get(name, kind)
            role = "leaving" if name == "W040" else "existing"
            rows.append([name, class_name, role, unit, billed, devices, export])
    rows.append(["B001", "home", "existing", "T-03", "8300", "", ""])  # billed monthly, no interval meter
    rows.append(["B002", "home", "existing", "T-10", "6900", "", ""])
    rows.append(["lot 17", "home", "planned", "T-08", "9000", "", ""])
    write(HERE / "customers.csv", rows)


def main() -> None:
    """Write readings/ and customers.csv beside this file."""
    rng = np.random.default_rng(SEED)
    clock = year_of(YEAR, ZONE, 60)
    outdoor = outdoor_c(clock, 9.5, 12.0, rng)
    found = [("home", west(clock, outdoor, rng) | east(clock, outdoor, rng)), ("shop", trade(outdoor, rng))]
    found.append(("large", large(outdoor, rng)))
    customers(found)
    rows = [["local", "outdoor_f"]]
    rows += [
        [t.isoformat(timespec="minutes"), f"{c * 1.8 + 32.0:.1f}"] for t, c in zip(clock.local, outdoor, strict=True)
    ]
    write(HERE / "readings/outdoor.csv.gz", rows)
    print(f"{sum(len(group) for _, group in found)} customers of 24 transformers, written to {HERE / 'readings'}")


if __name__ == "__main__":
    main()
