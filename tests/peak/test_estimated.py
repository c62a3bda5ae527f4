"""Exceedance hours without estimated readings and with them: what the study prints beside one another."""

import json
from pathlib import Path

import numpy as np
import pytest

from loadsum.cli import main
from loadsum.report.document import compose

STUDY = """\
[study]
title = "Ten days substituted"
date = "2031-05-04"
time_zone = "+01:00"
demand_interval_min = 60

[[readings]]
files = "meters.csv"
unit = "kWh"
stamp = "start"
flag_column = "quality"
estimated_flags = ["S"]

[model]
resamples = 0

[transformer]
ratings_kva = [5, 8]
power_factor = 1.0
"""
DAYS = 40
LEVEL = 6.0  # of the substituted readings, above every observed one


def made(folder: Path, flag: str) -> dict:
    rng = np.random.default_rng(5)
    stamps = (np.datetime64("2031-01-01T00") + np.arange(24 * DAYS)).astype(str)
    kw = np.round(rng.uniform(0.2, 1.0, (4, stamps.size)), 2)
    kw[0, : 24 * 10] = LEVEL
    rows = ["meter,time,kwh,quality"]
    for c in range(4):
        for n, stamp in enumerate(stamps):
            rows.append(f"M{c},{stamp}:00,{kw[c, n]},{flag if c == 0 and n < 240 else 'A'}")
    (folder / "meters.csv").write_text("\n".join(rows), encoding="utf-8")
    (folder / "study.toml").write_text(STUDY, encoding="utf-8")
    assert main(["study", str(folder / "study.toml"), "--out", str(folder / "out"), "--quiet"]) == 0
    return json.loads((folder / "out" / "results.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def with_substitutes(tmp_path_factory: pytest.TempPathFactory) -> dict:
    return made(tmp_path_factory.mktemp("substituted"), "S")


@pytest.fixture(scope="module")
def all_observed(tmp_path_factory: pytest.TempPathFactory) -> dict:
    return made(tmp_path_factory.mktemp("observed"), "A")


def test_both_figures_stand_beside_one_another(with_substitutes: dict, all_observed: dict) -> None:
    unit, plain = with_substitutes["transformers"][0], all_observed["transformers"][0]
    found = unit["estimated"]
    assert (found["customers"], found["readings"]) == (1, 240)
    assert found["share"] == pytest.approx(240 / (4 * 24 * DAYS))
    adopted = [row["hours_per_year"] for row in unit["exceedance"]]
    assert [row["left_out_h"] for row in found["rows"]] == adopted
    # Taken in, the figures are those of the same file in which nothing is marked.
    counted = [row["hours_per_year"] for row in plain["exceedance"]]
    assert [row["taken_in_h"] for row in found["rows"]] == pytest.approx(counted, rel=1e-9)
    assert found["rows"][0]["taken_in_h"] > 1000.0 > 1.0 > found["rows"][0]["left_out_h"]


def test_a_study_without_estimated_readings_says_nothing_of_them(all_observed: dict) -> None:
    assert all_observed["transformers"][0]["estimated"] is None
    assert "Left out, adopted" not in compose(all_observed).html


def test_the_report_prints_both(with_substitutes: dict) -> None:
    html = compose(with_substitutes).html
    assert "Left out, adopted" in html and "marks 240 demand intervals" in html.replace("\u00a0", " ")


def test_a_customers_maximum_is_an_observed_one(with_substitutes: dict) -> None:
    row = with_substitutes["transformers"][0]["customers"][0]
    assert row["max_kw"] <= 1.0 and row["readings"] == 24 * (DAYS - 10)
