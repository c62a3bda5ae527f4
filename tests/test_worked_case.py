"""The heterogeneous worked case through a study file: all digits of the exact rational convolution.

Ten customers at {0.5, 2, 6} kW with {0.6, 0.3, 0.1}, five at {1, 4} kW with {0.7, 0.3}, independent; exact figures in
tests/reference/sums.json, hetero_lattice (provenance: computed_from_formula).
"""

import datetime as dt
import json
from pathlib import Path

import pytest

from loadsum.cli import main

STUDY = """\
[study]
title = "Worked case"
date = "2031-05-04"
time_zone = "UTC"
demand_interval_min = 60

[[readings]]
files = "meters.csv"
layout = "one column a customer"
quantity = "power"
unit = "kW"
stamp = "start"

[day_types]
split = "all days alike"

[model]
temperature = false
common_component = false
shrinkage = false
mean_uncertainty = false
resamples = 0

[transformer]
ratings_kva = [30, 35, 40, 45, 50, 55]
power_factor = 1.0
"""
CASE = next(
    value
    for value in json.loads((Path(__file__).parent / "reference" / "sums.json").read_text("utf-8"))["values"]
    if value["id"] == "hetero_lattice"
)["expected"]


def test_all_digits_of_the_worked_case_through_a_study_file(tmp_path: Path) -> None:
    a, b = [0.5] * 6 + [2.0] * 3 + [6.0], [1.0] * 7 + [4.0] * 3
    names = [f"A{n:02d}" for n in range(10)] + [f"B{n:02d}" for n in range(5)]
    rows = [",".join(["stamp", *names])]
    for day in range(10):
        # every customer goes through its values in an order of its own, one value a day
        values = [a[(day + 3 * n) % 10] for n in range(10)] + [b[(day + 7 * n) % 10] for n in range(5)]
        for hour in range(24):
            stamp = (dt.datetime(2031, 1, 1) + dt.timedelta(days=day, hours=hour)).isoformat()
            rows.append(",".join([stamp, *map(str, values)]))
    (tmp_path / "meters.csv").write_text("\n".join(rows), encoding="utf-8")
    (tmp_path / "study.toml").write_text(STUDY, encoding="utf-8")
    assert main(["study", str(tmp_path / "study.toml"), "--out", str(tmp_path / "out"), "--quiet"]) == 0
    (unit,) = json.loads((tmp_path / "out" / "results.json").read_text(encoding="utf-8"))["transformers"]
    assert [row["mean_kw"] for row in unit["hours"]] == [pytest.approx(CASE["mean_kW"], abs=1e-9)] * 24
    assert unit["hours"][0]["sd_kw"] ** 2 == pytest.approx(CASE["var"], abs=1e-9)
    assert unit["hours"][0]["skewness"] == pytest.approx(CASE["skew"], abs=1e-9)
    for row in unit["exceedance"]:
        exact = float(CASE[f"P(S>{row['rating_kva']:.0f})"]["exact"])
        assert row["highest_probability"] == pytest.approx(exact, abs=5e-15, rel=1e-11)
        assert row["hours_per_year"] == pytest.approx(exact * 8760.0, rel=1e-9)
