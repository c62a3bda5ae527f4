"""`loadsum holdout` as its user runs it."""

import csv
import json
from pathlib import Path

import numpy as np
import pytest

from loadsum.cli import main
from tests.report.pdf_structure import structure_faults

STUDY = """\
[study]
title = "A street under test"
date = "2031-05-04"
time_zone = "+01:00"
demand_interval_min = 60

[[readings]]
files = "meters.csv"
unit = "kWh"
stamp = "start"

[model]
resamples = 20

[transformer]
id = "T-7"
ratings_kva = [5, 10]
power_factor = 0.95
"""


def folder_with(path: Path, weeks: int) -> Path:
    rng = np.random.default_rng(11)
    stamps = (np.datetime64("2031-01-06T00", "h") + np.arange(weeks * 168)).astype(str)
    mood = np.repeat(rng.gamma(4.0, 0.25, weeks * 7), 24)[:, None]
    kw = np.round(mood * rng.gamma(1.5, 0.8, (stamps.size, 7)), 2)
    rows = ["stamp,A,B,C,D,E,F,G", *(f"{t}:00,{','.join(map(str, r))}" for t, r in zip(stamps, kw, strict=True))]
    (path / "meters.csv").write_text("\n".join(rows), encoding="utf-8")
    (path / "study.toml").write_text(STUDY, encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = folder_with(tmp_path_factory.mktemp("test"), 9)
    assert main(["holdout", str(path / "study.toml"), "--out", str(path / "out"), "--quiet"]) == 0
    return path


def test_it_writes_a_document_that_meets_the_standards_and_tables(folder: Path) -> None:
    assert sorted(p.name for p in (folder / "out").iterdir()) == ["holdout.csv", "holdout.json", "holdout.pdf"]
    assert structure_faults((folder / "out" / "holdout.pdf").read_bytes()) == []


def test_the_table_holds_every_model_at_every_level_of_every_part(folder: Path) -> None:
    full = json.loads((folder / "out" / "holdout.json").read_text("utf-8"))["transformers"][0]["holdout"]
    with (folder / "out" / "holdout.csv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))[1:]  # the first is of units
    assert len(rows) == 5 * 4 * (1 + len(full["parts"]))
    assert {row["by"] for row in rows} == {"all", "season", "day type", "part of the day", "month", "customers"}
    whole = next(r for r in rows if (r["by"], r["model"], r["expected_share"]) == ("all", "adopted", "0.01"))
    assert float(whole["observed_share"]) == pytest.approx(full["whole"]["levels"][2]["observed_share"])


def test_the_study_itself_carries_the_same_test_where_it_looks_at_every_interval(folder: Path) -> None:
    assert main(["study", str(folder / "study.toml"), "--out", str(folder / "made"), "--quiet"]) == 0
    study = json.loads((folder / "made" / "results.json").read_text("utf-8"))["transformers"][0]["evidence"]
    full = json.loads((folder / "out" / "holdout.json").read_text("utf-8"))["transformers"][0]["evidence"]
    assert study["levels"] == full["levels"]


def test_too_few_weeks_are_said_and_still_make_a_document(tmp_path: Path, capsys: pytest.CaptureFixture) -> None:
    path = folder_with(tmp_path, 7)
    assert main(["holdout", str(path / "study.toml"), "--out", str(path / "out")]) == 0
    assert "not tested: fewer than eight weeks" in capsys.readouterr().out
    assert (path / "out" / "holdout.pdf").read_bytes().startswith(b"%PDF")


def test_a_faulty_study_file_writes_nothing(tmp_path: Path) -> None:
    path = folder_with(tmp_path, 7)
    (path / "study.toml").write_text(STUDY.replace('unit = "kWh"', 'unit = "barrels"'), encoding="utf-8")
    assert main(["holdout", str(path / "study.toml"), "--out", str(path / "out"), "--quiet"]) == 2
    assert not (path / "out").exists()
