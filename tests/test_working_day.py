"""The planner's working day through the command: pseudonyms, a changed assumption, a revision and why it differs."""

import datetime as dt
import json
import re
from pathlib import Path

import numpy as np
import pytest

from loadsum.cli import main
from loadsum.report.received import read_report

NAMES = ("MTR-4711", "MTR-4712", "MTR-4713", "17")
STUDY = """\
[study]
title = "A revised study"
date = "2031-05-04"
time_zone = "+00:00"
demand_interval_min = 60

[[readings]]
files = "{files}"
customer_column = "meter"
time_column = "from"
value_column = "kwh"
unit = "kWh"
stamp = "start"

[model]
resamples = 0

[transformer]
ratings_kva = [8, 10, 15]
installed_kva = 10
power_factor = 1.0

[[criterion]]
quantity = "exceedance hours per year"
of = "nameplate"
limit = {limit}
source = "stated for this test"
"""


def meters(path: Path, days: int, replaced: float = 1.0) -> None:
    """Readings of an evening peak that differ from day to day; the second meter may be replaced by another."""
    rng = np.random.default_rng(7)
    lines = ["meter,from,kwh"]
    hours = np.arange(24 * 120)
    for n, name in enumerate(NAMES):
        shape = 0.6 + 1.6 * np.exp(-0.5 * ((hours % 24 - 18 - n % 2) / 1.5) ** 2)
        kwh = np.round(shape * rng.gamma(4.0, 0.25, hours.size) * (replaced if n == 1 else 1.0), 2)
        start = dt.datetime(2031, 1, 1)
        stamps = [(start + dt.timedelta(hours=int(h))).isoformat() for h in hours[: 24 * days]]
        lines += [f"{name},{stamp},{value:.2f}" for stamp, value in zip(stamps, kwh.tolist(), strict=False)]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("working_day")
    meters(folder / "old.csv", 90)
    meters(folder / "new.csv", 120, replaced=1.3)
    for name, limit in (("old", 40), ("new", 20)):
        text = STUDY.format(files=f"{name}.csv", limit=limit)
        (folder / f"{name}.toml").write_text(text, encoding="utf-8")
        assert main(["study", str(folder / f"{name}.toml"), "--out", str(folder / name), "--quiet"]) == 0
    return folder


def test_no_output_of_a_study_holds_an_identifier_and_a_customer_keeps_its_pseudonym(folder: Path) -> None:
    kept = []
    for name in ("old", "new"):
        files = {
            path.name: path.read_bytes() for path in (folder / name).rglob("*") if path.suffix in (".json", ".csv")
        }
        attached = read_report((folder / name / "report.pdf").read_bytes()).attachments
        files |= {f"attached {name}": part.content for name, part in attached.items()}
        assert len(files) >= 6
        for content in files.values():
            assert not any(identifier.encode() in content for identifier in NAMES[:3])
        results = json.loads(files["results.json"])
        rows = [row["id"] for row in results["transformers"][0]["customers"]]
        assert all(re.fullmatch("C-[2-9A-Z]{5}", row) for row in rows)
        assert "17" not in results["quality"]["customers"]
        kept.append(sorted(rows))
    assert kept[0] == kept[1]
    assert (folder / "study.key").exists()


def test_raw_identifiers_are_printed_only_on_request(folder: Path) -> None:
    out = folder / "raw"
    given = ["--with", "privacy.raw_identifiers=true", "--xlsx", "--out", str(out), "--quiet"]
    assert main(["study", str(folder / "old.toml"), *given]) == 0
    assert (out / "tables.xlsx").stat().st_size > 1000
    assert "MTR-4711" in (out / "results.json").read_text(encoding="utf-8")


def test_a_changed_assumption_lists_the_differences_it_makes(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    given = ["--with", "transformer.power_factor=0.8", "--out", str(folder / "lower")]
    assert main(["study", str(folder / "old.toml"), *given]) == 0
    said = capsys.readouterr().out
    assert "assumption: power factor of the group: 1 -> 0.8" in said
    assert re.search(r"verdict: transformer, 10 kVA, exceedance hours per year of nameplate: ", said)
    attached = read_report((folder / "lower" / "report.pdf").read_bytes()).attachments
    assert b"# with transformer.power_factor=0.8" in attached["study.toml"].content


def test_the_study_that_a_report_carries_is_made_again_with_a_changed_assumption(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    report, key = str(folder / "old" / "report.pdf"), str(folder / "study.key")
    given = ["--with", "transformer.power_factor=0.8", "--inputs", str(folder), "--key", key]
    assert main(["study", report, *given, "--out", str(folder / "reviewed")]) == 0
    said = capsys.readouterr().out
    assert "assumption: power factor of the group: 1 -> 0.8" in said
    assert re.search(r"verdict: transformer, 10 kVA, exceedance hours per year of nameplate: ", said)
    assert not re.search(r"^(input|readings|customer|finding|criterion): ", said, re.MULTILINE)
    old, new = (
        json.loads((folder / name / "results.json").read_text(encoding="utf-8")) for name in ("old", "reviewed")
    )
    assert new["transformers"][0]["power_factor"] == 0.8
    assert [row["id"] for row in new["transformers"][0]["customers"]] == [
        row["id"] for row in old["transformers"][0]["customers"]
    ]
    audit = ["audit", str(folder / "reviewed" / "report.pdf"), "--inputs", str(folder), "--key", key]
    assert main(audit) == 0, capsys.readouterr().out  # the changed value is part of what the report carries


def test_a_report_without_its_inputs_or_key_is_the_users_fault(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    report, out = str(folder / "old" / "report.pdf"), ["--out", str(folder / "none")]
    assert main(["study", report, *out]) == 2
    assert "--inputs: missing; give the folder of the input files" in capsys.readouterr().err
    assert main(["study", report, "--inputs", str(folder), *out]) == 2
    assert "--key: the report's customers stand under pseudonyms" in capsys.readouterr().err


def test_an_unknown_key_of_a_changed_assumption_is_the_users_fault(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    given = ["--with", "transformer.powerfactor=0.8", "--out", str(folder / "none")]
    assert main(["study", str(folder / "old.toml"), *given]) == 2
    assert "transformer.powerfactor: unknown key; did you mean power_factor" in capsys.readouterr().err


def test_a_month_added_a_meter_replaced_and_a_criterion_changed_are_the_three_causes_with_their_shares(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    files = ["--studies", str(folder / "old.toml"), str(folder / "new.toml")]
    assert main(["compare", str(folder / "old"), str(folder / "new"), *files]) == 0
    said = capsys.readouterr().out
    readings = re.findall(r"^readings: (.*?): ", said, re.MULTILINE)
    assert readings[0] == "month 2031-04"
    assert re.fullmatch("customer C-[2-9A-Z]{5}, all months", readings[1])
    assert len(readings) == 2
    assert len(re.findall("^criterion: ", said, re.MULTILINE)) == 1
    assert "MTR" not in said

    shares = re.findall(r"^  (.*): ([+-]\d+\.\d+) \((-?\d+)% of the change\)$", said, re.MULTILINE)
    assert [re.sub("C-[2-9A-Z]{5}", "C", cause) for cause, _, _ in shares] == [
        "readings of 2031-04-01 to 2031-04-30 added",
        "readings of customer C replaced",
        "[criterion] changed",
    ]
    rooms = []
    for name in ("old", "new"):
        unit = json.loads((folder / name / "results.json").read_text(encoding="utf-8"))["transformers"][0]
        at = next(row for row in unit["selection"]["criteria"][0]["by_rating"] if row["rating_kva"] == 10.0)
        rooms.append(at["margin"] / at["limit"])
    assert sum(float(change) for _, change, _ in shares) == pytest.approx(rooms[1] - rooms[0], abs=2e-4)
    assert float(shares[1][1]) < 0.0  # a meter that reads 1.3 times as much leaves less room
    assert float(shares[2][1]) < 0.0  # and so does half the limit


def test_results_that_are_none_are_the_users_fault(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["compare", str(folder / "old"), str(folder / "old.toml")]) == 2
    assert "is not JSON" in capsys.readouterr().err


def test_a_drafted_folder_is_reported_file_by_file(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    meters(tmp_path / "meters.csv", 3)
    assert main(["draft", str(tmp_path)]) == 0
    said = capsys.readouterr().out
    assert "meters.csv: readings; 4 customer(s), 288 readings" in said
    assert f"written: {tmp_path / 'study.toml'}" in said
