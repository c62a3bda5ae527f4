"""Makes the readings of 30 invented homes metered elsewhere, whose classes stand in for a street not yet built.

From the checkout: python -m demo_feeders.new_street.generate
"""

from pathlib import Path

import numpy as np

from demo_feeders.invented import home_kw, household, outdoor_c, read_kwh, texts, write, year_of

HERE = Path(__file__).parent
SEED = 20300330
GAS_HEATED, HEAT_PUMP = 14, 16


def main() -> None:
    """Write readings/ beside this file."""
    rng = np.random.default_rng(SEED)
    clock = year_of(2030, "Europe/London", 30)
    outdoor = outdoor_c(clock, 10.5, 6.0, rng)
    mood = rng.normal(0.0, 0.08, clock.days)
    stamps = [t.isoformat(timespec="minutes") for t in clock.local]
    rows = [["dwelling", "period_from", "kwh"]]
    for n in range(1, GAS_HEATED + HEAT_PUMP + 1):
        heat = rng.uniform(0.06, 0.12) if n > GAS_HEATED else 0.0
        of = household(rng, float(rng.choice([0.9, 1.2])), heat_kw_per_c=heat)
        name = f"{'HP' if n > GAS_HEATED else 'GH'}{n:02d}"
        kwh = texts(read_kwh(home_kw(of, clock, outdoor, mood, rng), clock.minutes))
        rows += [[name, s, v] for s, v in zip(stamps, kwh, strict=True)]
    write(HERE / "readings/reference_homes.csv.gz", rows)
    hourly = slice(0, None, 2)
    rows = [["from", "outdoor_c"], *([s, f"{c:.1f}"] for s, c in zip(stamps[hourly], outdoor[hourly], strict=True))]
    write(HERE / "readings/outdoor.csv.gz", rows)
    print(f"30 homes, {len(stamps)} intervals, written to {HERE / 'readings'}")


if __name__ == "__main__":
    main()
