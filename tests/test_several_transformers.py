"""Several transformers in one study: the numbers of each alone, the head of the feeder, one that cannot be studied."""

import json
import re
from pathlib import Path

import numpy as np
import pytest

from loadsum.cli import main
from loadsum.comparison import shares_of_change
from loadsum.progress import silent
from loadsum.report.revision import moved
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


def test_every_transformer_whose_verdict_moved_has_its_shares_of_the_change(folder, together):
    text = (folder / "together.toml").read_text(encoding="utf-8")
    (folder / "stricter.toml").write_text(text.replace("limit = 40", "limit = 20"), encoding="utf-8")
    files = folder / "together.toml", folder / "stricter.toml"
    said = shares_of_change(*files, moved=("T-1", "T-2"), progress=silent)
    heads, causes = said[0::2], said[1::2]
    assert [head.partition(" at ")[2] for head in heads] == [
        f"10 kVA, {name}, as a share of its limit:" for name in ("T-1", "T-2")
    ]
    for unit, cause in zip(together[:2], causes, strict=True):
        at = next(row for row in unit["selection"]["criteria"][0]["by_rating"] if row["rating_kva"] == 10)
        half_the_limit = at["value"] / 40 - at["value"] / 20  # of (limit - hours) / limit, the hours as they were
        found = re.fullmatch(r"  \[criterion\] changed: ([+-]\d+\.\d+) \(.*\)", cause)
        assert float(found[1]) == pytest.approx(half_the_limit, abs=6e-5)


def test_a_verdict_moves_with_its_answer_and_not_with_a_figure_alone():
    def results(hours: float, meets: bool) -> dict:
        at = {"rating_kva": 10.0, "value": hours, "meets": meets, "outcome": "met" if meets else "not met"}
        row = {"quantity": "exceedance hours per year", "of": "nameplate", "by_rating": [at]}
        choice = {"verdict": "sufficient", "rating_kva": 15.0, "criteria": [row]}
        return {"transformers": [{"id": "T-1", "selection": choice}, {"id": "T-2", "reason": "no customer"}]}

    assert moved(results(3.0, True), results(4.0, True)) == ()
    assert moved(results(3.0, True), results(9.0, False)) == ("T-1",)
