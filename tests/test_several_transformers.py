"""Several transformers in one study: the numbers of each alone, the head of the feeder, one that cannot be studied."""

import json
from pathlib import Path

import numpy as np
import pytest

from loadsum.cli import main
from tests.test_working_day import STUDY, meters

CUSTOMERS = """\
id,transformer
MTR-4711,T-1
MTR-4712,T-1
MTR-4713,T-2
17,T-2
"""


def unit(name: str, more: str = "") -> str:
    return f'[[transformer]]\nid = "{name}"\nratings_kva = [5, 8, 10]\npower_factor = 1.0\n{more}'


def run(folder: Path, name: str, *units: str) -> list[dict]:
    before, after = STUDY.format(files="m.csv", limit=40).split("[transformer]")
    criterion = after[after.index("[[criterion]]") :]
    text = before + "\n".join(units) + '\n[customers]\ntable = "customers.csv"\n' + criterion
    (folder / f"{name}.toml").write_text(text.replace("resamples = 0", "resamples = 5"), encoding="utf-8")
    assert main(["study", str(folder / f"{name}.toml"), "--out", str(folder / name), "--quiet"]) == 0
    return json.loads((folder / name / "results.json").read_text(encoding="utf-8"))["transformers"]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("several")
    meters(folder / "m.csv", 90)
    (folder / "customers.csv").write_text(CUSTOMERS, encoding="utf-8")
    return folder


@pytest.fixture(scope="module")
def together(folder: Path) -> list[dict]:
    return run(folder, "together", unit("T-1"), unit("T-2"), unit("T-3"), unit("head", "feeder_head = true\n"))


def test_each_transformer_of_a_study_has_the_very_numbers_of_a_study_of_its_own(folder, together):
    for index, name in ((0, "T-1"), (1, "T-2")):
        (alone,) = run(folder, f"alone {name}", unit(name))
        assert alone["exceedance"] == together[index]["exceedance"]
        assert alone == together[index]


def test_a_transformer_without_customers_becomes_a_result_with_its_reason(together):
    assert together[2]["id"] == "T-3"
    assert together[2]["reason"] == "no customer is served by it; check the transformer of each customer"
    assert together[3]["reason"] == ""


def test_the_head_of_the_feeder_serves_everybody(together):
    ids = [{row["id"] for row in unit["customers"]} for unit in together]
    assert ids[3] == ids[0] | ids[1]
    means = [np.array([row["mean_kw"] for row in unit["hours"]]) for unit in together]
    assert means[3] == pytest.approx(means[0] + means[1], rel=0.02)
