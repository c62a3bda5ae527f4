"""Makes the readings of an invented street of 64 flats: 15 min, one year, electric cooking, nine cars that charge.

From the checkout: python -m demo_feeders.street_of_flats.generate
"""

from pathlib import Path

import numpy as np

from demo_feeders.invented import home_kw, household, outdoor_c, read_kwh, texts, write, year_of

HERE = Path(__file__).parent
SEED = 20300264
FLATS = 64
CHARGERS = {5: 3.7, 11: 7.4, 18: 7.4, 23: 11.0, 30: 7.4, 37: 3.7, 44: 7.4, 52: 11.0, 61: 7.4}


def main() -> None:
    """Write readings/ beside this file."""
    rng = np.random.default_rng(SEED)
    clock = year_of(2030, "Europe/Oslo", 15)
    outdoor = outdoor_c(clock, 6.5, 10.5, rng)
    mood = rng.normal(0.0, 0.10, clock.days)
    names, columns = [], []
    for n in range(1, FLATS + 1):
        charger = {"charger_kw": CHARGERS.get(n, 0.0), "charges": rng.uniform(0.35, 0.75), "timer": n in (18, 44)}
        size = float(rng.choice([0.55, 0.75, 1.0], p=[0.3, 0.45, 0.25]))
        of = household(rng, size, heat_kw_per_c=rng.uniform(0.0, 0.012), **(charger if n in CHARGERS else {}))
        kwh = read_kwh(home_kw(of, clock, outdoor, mood, rng), clock.minutes)
        if n == 27:  # let from April on
            kwh[: int(clock.first[100])] = np.nan
        names.append(f"F{n:03d}")
        columns.append(texts(kwh))
    stamps = [t.isoformat(timespec="minutes") for t in clock.local]
    for block in range(4):
        part = slice(16 * block, 16 * block + 16)
        rows = [["from", *names[part]], *([s, *v] for s, *v in zip(stamps, *columns[part], strict=True))]
        write(HERE / f"readings/staircase_{block + 1}.csv.gz", rows)
    hourly = slice(0, None, 4)
    rows = [["from", "outdoor_c"], *([s, f"{c:.1f}"] for s, c in zip(stamps[hourly], outdoor[hourly], strict=True))]
    write(HERE / "readings/outdoor.csv.gz", rows)
    print(f"64 flats, {len(stamps)} intervals, written to {HERE / 'readings'}")


if __name__ == "__main__":
    main()
