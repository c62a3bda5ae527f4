"""The full main job on 17 real homes, against values computed independently here."""

import csv
import datetime as dt
import itertools
import json
from pathlib import Path

import jsonschema
import numpy as np
import pytest
from numpy.typing import NDArray

from loadsum.cli import main
from loadsum.report.schema import results_schema
from tests.datasets import FIRST_STAMP, real_homes

STUDY = """\
[study]
title = "Seventeen homes on one transformer"
reference = "TEST-17"
date = "2031-05-04"
place = "a test"
time_zone = "-08:00"
demand_interval_min = 60

[[readings]]
files = "homes.csv"
quantity = "energy"
unit = "kWh"
stamp = "start"

[[season]]
name = "summer half"
months = [5, 6, 7, 8, 9, 10]

[[season]]
name = "winter half"
months = [11, 12, 1, 2, 3, 4]

[model]
resamples = 20

[transformer]
ratings_kva = [25, 37.5, 50, 75]
power_factor = 0.95
power_factor_source = "stated for this test"

[[criterion]]
quantity = "exceedance hours per year"
of = "nameplate"
limit = 10
source = "stated for this test"
"""


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("homes")
    names, kw = real_homes()
    stamps = [(FIRST_STAMP + dt.timedelta(hours=h)).isoformat() for h in range(kw.shape[1])]
    with (folder / "homes.csv").open("w", newline="", encoding="utf-8") as file:
        out = csv.writer(file)
        out.writerow(["customer", "time", "value"])
        for name, row in zip(names, kw, strict=True):
            out.writerows(zip(itertools.repeat(name), stamps, (repr(float(x)) for x in row), strict=False))
    (folder / "study.toml").write_text(STUDY, encoding="utf-8")
    assert main(["study", str(folder / "study.toml"), "--out", str(folder / "out"), "--quiet"]) == 0
    return folder


@pytest.fixture(scope="module")
def results(folder: Path) -> dict:
    return json.loads((folder / "out" / "results.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def classes() -> dict[tuple[str, str, int], NDArray[np.float64]]:
    """Readings by season, day type and hour, sorted here without the program: (17, days) each. [kW]"""
    _, kw = real_homes()
    found: dict[tuple[str, str, int], list[NDArray[np.float64]]] = {}
    for hour in range(kw.shape[1]):
        when = FIRST_STAMP + dt.timedelta(hours=hour)
        season = "summer half" if 5 <= when.month <= 10 else "winter half"
        kind = "workday" if when.weekday() < 5 else "weekend or holiday"
        found.setdefault((season, kind, when.hour), []).append(kw[:, hour])
    return {key: np.array(columns).T for key, columns in found.items()}


def test_all_outputs_are_there(folder: Path) -> None:
    names = {str(p.relative_to(folder / "out")) for p in (folder / "out").rglob("*") if p.is_file()}
    assert {"report.pdf", "results.json", "hours.csv"} <= names
    assert any(name.startswith("figures/") and name.endswith(".svg") for name in names)
    assert any(name.startswith("figures/") and name.endswith(".png") for name in names)


def test_the_results_are_what_their_schema_says(results: dict) -> None:
    errors = list(jsonschema.Draft202012Validator(results_schema()).iter_errors(results))
    assert not errors, [(list(error.path), error.message) for error in errors[:3]]


def test_held_out_weeks_pass_the_99_percent_level_about_as_often_as_meant(results: dict) -> None:
    (unit,) = results["transformers"]
    (level,) = [r for r in unit["evidence"]["levels"] if r["model"] == "adopted" and r["expected_share"] == 0.01]
    share, scored = level["observed_share"], unit["evidence"]["intervals"]
    print(f"held-out demand above the 99 % level: {share:.2%} of {scored} intervals")
    assert 0.003 < share < 0.03


def test_independent_sums_agree_with_a_brute_force_convolution(results: dict, classes: dict) -> None:
    (unit,) = results["transformers"]
    levels = np.array(unit["curve"]["levels_kw"])
    step = 0.05
    mean = {"down": np.zeros(levels.size), "up": np.zeros(levels.size)}
    hours = 0.0
    for columns in classes.values():
        hours += columns.shape[1]
        for way, rounded in (("down", np.floor), ("up", np.ceil)):
            law = np.ones(1)
            for customer in columns:
                law = np.convolve(law, np.bincount(rounded(customer / step).astype(int)) / customer.size)
            points = np.arange(law.size) * step
            mean[way] += columns.shape[1] * np.array([law[points > level + 1e-9].sum() for level in levels])
    found = np.array(unit["curve"]["independent"])
    assert np.all(found >= mean["down"] / hours - 2e-3)
    assert np.all(found <= mean["up"] / hours + 2e-3)


def test_every_reading_is_used_and_the_whole_year_is_covered(results: dict) -> None:
    (unit,) = results["transformers"]
    assert unit["coverage"]["covered_hours"] == pytest.approx(unit["coverage"]["hours_in_year"])
    assert sum(row["readings"] for row in unit["customers"]) == 17 * 8760


def test_means_and_maxima_of_customers_are_those_of_the_file(results: dict) -> None:
    _, kw = real_homes()
    (unit,) = results["transformers"]
    assert [row["mean_kw"] for row in unit["customers"]] == pytest.approx(kw.mean(axis=1), rel=1e-12)
    assert [row["max_kw"] for row in unit["customers"]] == pytest.approx(kw.max(axis=1), rel=1e-12)


def test_the_mean_of_each_hour_is_the_mean_of_the_observed_sum(results: dict, classes: dict) -> None:
    (unit,) = results["transformers"]
    assert len(unit["hours"]) == 2 * 2 * 24
    for row in unit["hours"]:
        observed = classes[row["season"], row["day_type"], row["interval"]].sum(axis=0)
        assert row["mean_kw"] == pytest.approx(observed.mean(), rel=0.02)


def test_variances_over_the_year_agree_with_the_observed_sums(results: dict, classes: dict) -> None:
    (unit,) = results["transformers"]
    model = np.array([row["sd_kw"] ** 2 for row in unit["hours"]])
    observed = np.array(
        [classes[r["season"], r["day_type"], r["interval"]].sum(axis=0).var(ddof=1) for r in unit["hours"]]
    )
    assert model.mean() / observed.mean() == pytest.approx(1.0, abs=0.10)


def test_expected_hours_lie_near_the_hours_observed_at_a_level_often_passed(results: dict, classes: dict) -> None:
    (unit,) = results["transformers"]
    limit_kw = 25 * 0.95
    observed = sum(float((columns.sum(axis=0) > limit_kw).sum()) for columns in classes.values())
    row = next(r for r in unit["exceedance"] if r["rating_kva"] == 25 and r["of"] == "nameplate")
    assert row["hours_per_year"] == pytest.approx(observed, rel=0.25)
