"""The section on the meter of the group, from a study made through the command."""

import json
from pathlib import Path

import numpy as np
import pytest

from loadsum.cli import main
from loadsum.report.document import compose

STUDY = """\
[study]
title = "Head meter"
date = "2031-05-04"
time_zone = "+01:00"
demand_interval_min = 60

[[readings]]
files = "meters.csv"
unit = "kWh"
stamp = "start"

[[readings]]
files = "head.csv"
unit = "kWh"
stamp = "start"
meters = "group"

[model]
resamples = 0

[transformer]
ratings_kva = [5, 8]
power_factor = 1.0
"""


@pytest.fixture(scope="module")
def results(tmp_path_factory: pytest.TempPathFactory) -> dict:
    folder: Path = tmp_path_factory.mktemp("head")
    rng = np.random.default_rng(5)
    stamps = (np.datetime64("2031-01-01T00") + np.arange(24 * 21)).astype(str)
    kw = np.round(rng.uniform(0.2, 1.0, (stamps.size, 4)), 2)
    head = 1.02 * kw.sum(axis=1) + np.where(np.arange(stamps.size) % 24 >= 22, 1.5, 0.0)
    rows = ["time,A,B,C,D", *(f"{t}:00,{','.join(map(str, row))}" for t, row in zip(stamps, kw, strict=True))]
    (folder / "meters.csv").write_text("\n".join(rows), encoding="utf-8")
    rows = ["time,head", *(f"{t}:00,{value:.4f}" for t, value in zip(stamps, head, strict=True))]
    (folder / "head.csv").write_text("\n".join(rows), encoding="utf-8")
    (folder / "study.toml").write_text(STUDY, encoding="utf-8")
    assert main(["study", str(folder / "study.toml"), "--out", str(folder / "out"), "--quiet"]) == 0
    assert (folder / "out/figures/reconciliation.svg").is_file()
    return json.loads((folder / "out" / "results.json").read_text(encoding="utf-8"))


def test_the_results_carry_measured_and_summed_by_class(results: dict) -> None:
    (group,) = results["reconciliation"]
    assert group["customers"] == 4 and group["intervals"] == 24 * 21
    assert {part["day_type"] for part in group["by_class"]} == {"workday", "weekend or holiday"}
    assert group["by_class"][0]["unaccounted_kw"][23] == pytest.approx(1.5, abs=0.1)
    assert {finding["rule"] for finding in results["findings"]} >= {"reconciliation", "unmetered load"}


def test_the_report_has_the_table_and_the_figure(results: dict) -> None:
    html = compose(results).html
    (group,) = results["reconciliation"]
    section = html[html.index('<section class="section reconciliation"') :]
    section = section[: section.index("</section>")]
    assert f"{group['measured_kwh']:.0f}" in section.replace("\u202f", "").replace("\u00a0", "")
    assert section.count("<tr>") == 3 and "reconciliation.svg" in section


def test_without_such_a_meter_there_is_no_section(results: dict) -> None:
    assert 'class="section reconciliation"' not in compose({**results, "reconciliation": []}).html
