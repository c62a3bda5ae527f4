"""A study of three months says what part of the year its hours speak for, wherever it prints hours."""

import json
from pathlib import Path

import numpy as np
import pytest

from loadsum.cli import main
from loadsum.report import document

STUDY = """\
[study]
title = "Three months"
date = "2031-05-04"
time_zone = "+01:00"
demand_interval_min = 60

[[readings]]
files = "meters.csv"
unit = "kWh"
stamp = "start"

[[season]]
name = "winter"
months = [12, 1, 2]

[[season]]
name = "the rest"
months = [3, 4, 5, 6, 7, 8, 9, 10, 11]

[model]
resamples = 20

[transformer]
ratings_kva = [5, 10]
power_factor = 0.95
"""


@pytest.fixture(scope="module")
def results(tmp_path_factory: pytest.TempPathFactory) -> dict:
    folder: Path = tmp_path_factory.mktemp("months")
    rng = np.random.default_rng(11)
    stamps = np.arange("2030-12-01", "2031-03-01", dtype="datetime64[h]").astype(str)
    kw = np.round(rng.gamma(1.5, 0.8, (stamps.size, 4)), 2)
    rows = ["stamp,A1,A2,A3,A4", *(f"{t}:00,{','.join(map(str, row))}" for t, row in zip(stamps, kw, strict=True))]
    (folder / "meters.csv").write_text("\n".join(rows), encoding="utf-8")
    (folder / "study.toml").write_text(STUDY, encoding="utf-8")
    assert main(["study", str(folder / "study.toml"), "--out", str(folder / "out"), "--quiet"]) == 0
    return json.loads((folder / "out" / "results.json").read_text(encoding="utf-8"))


def test_the_results_name_what_is_not_covered(results: dict) -> None:
    coverage = results["transformers"][0]["coverage"]
    assert not coverage["whole_year"]
    assert coverage["covered_hours"] == pytest.approx(90 * 24, rel=0.05)
    assert any(text.startswith("the rest") for text in coverage["uncovered"])


def test_page_1_says_for_how_many_hours_of_the_year_it_speaks(results: dict) -> None:
    html = document.compose(results).html
    first = html[: html.index("Contents")] if "Contents" in html else html
    coverage = results["transformers"][0]["coverage"]
    assert f"{coverage['covered_hours']:.0f}" in first.replace(" ", "").replace(" ", "")
    assert "the rest" in first


def test_without_a_criterion_there_is_no_verdict(results: dict) -> None:
    selection = results["transformers"][0]["selection"]
    assert selection["verdict"] == "no criterion"
    assert selection["rating_kva"] is None
