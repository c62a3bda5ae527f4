"""A study drafted from a folder of meter files, and what is left to the user."""

import datetime as dt
from pathlib import Path

import pytest

from loadsum.errors import InputError
from loadsum.intake.draft import draft_study
from loadsum.intake.load import load_readings
from loadsum.study.load import load_study, read_tree

HOURS = [dt.datetime(2031, 1, 1) + dt.timedelta(hours=n) for n in range(24 * 400)]
CUSTOMERS_HEAD = "id,customer_class,role,transformer,annual_kwh,service_rating_kw,export,devices"


def long(path: Path, form: str, names: tuple[str, ...], hours: list[dt.datetime] = HOURS, delimiter: str = ",") -> None:
    lines = [delimiter.join(("when", "meter", "kwh"))]
    for name in names:
        lines += [delimiter.join((t.strftime(form), name, "0,50" if delimiter == ";" else "0.50")) for t in hours]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


def text_of(folder: Path) -> str:
    return (folder / "study.toml").read_text(encoding="utf-8")


def answered(folder: Path, *changes: tuple[str, str]) -> None:
    """What a user does: take away the signs, correct the values."""
    text = text_of(folder).replace("#? ", "")
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new)
    (folder / "study.toml").write_text(text, encoding="utf-8")


ANSWERS = (
    ('title = ""', 'title = "drafted"'),
    ("ratings_kva = []", "ratings_kva = [25, 50]"),
    ("power_factor = ", "power_factor = 0.95"),
)


def test_a_drafted_study_names_each_unanswered_question_and_runs_once_they_are_answered(tmp_path):
    long(tmp_path / "east.csv", "%d/%m/%Y %H:%M", ("007", "008"), delimiter=";")
    written, said = draft_study(tmp_path)
    assert [path.name for path in written] == ["study.toml", "customers.csv"]
    assert said == (
        "east.csv: readings; 2 customer(s), 19200 readings, 2031-01-01 00:00 to 2032-02-04 23:00; interval 60 min;"
        " no hour is repeated or skipped: standard time, UTC, or a place without daylight saving",
    )
    with pytest.raises(InputError) as caught:
        load_study(tmp_path / "study.toml")
    assert [fault.where for fault in caught.value.faults] == [
        "study.title",
        "study.time_zone",
        "study.demand_interval_min",
        "readings.stamp",
        "transformer.ratings_kva",
        "transformer.power_factor",
    ]
    answered(tmp_path, *ANSWERS, ('clock = "local"', 'clock = "standard"'))
    study = load_study(tmp_path / "study.toml")
    assert [customer.id for customer in study.customer] == ["007", "008"]
    loaded = load_readings(study, tmp_path)
    assert loaded.readings.rows_in == 2 * len(HOURS)
    assert loaded.readings.kw[:, 0].tolist() == [0.5, 0.5]


def test_no_criterion_and_no_unit_is_ever_invented(tmp_path):
    (tmp_path / "a.csv").write_text("time,x1,x2\n2031-01-01T00:00,1,2\n2031-01-01T01:00,1,2\n", encoding="utf-8")
    draft_study(tmp_path)
    tree = read_tree(tmp_path / "study.toml")
    assert "criterion" not in tree
    assert "unit" not in tree["readings"][0]
    assert "stamp" not in tree["readings"][0]


def test_stamps_that_end_their_interval_are_told_by_the_first_and_the_last(tmp_path):
    long(tmp_path / "a.csv", "%Y-%m-%d %H:%M", ("A",), HOURS[1:25])
    draft_study(tmp_path)
    assert '#? stamp = "end"' in text_of(tmp_path)


@pytest.mark.parametrize(
    ("form", "found"), [("%d/%m/%Y %H:%M", "%d/%m/%Y %H:%M"), ("%m/%d/%Y %I:%M %p", "%m/%d/%Y %I:%M %p")]
)
def test_the_order_of_day_and_month_is_told_by_the_stamps(form, found, tmp_path):
    long(tmp_path / "a.csv", form, ("A",))
    draft_study(tmp_path)
    assert f'time_format = "{found}"  # told by the stamps' in text_of(tmp_path)


def test_files_that_are_described_alike_stand_under_one_pattern_that_does_not_catch_the_customer_table(tmp_path):
    for name in ("meter_1.csv", "meter_2.csv"):
        long(tmp_path / name, "%Y-%m-%d %H:%M", (name[:7],), HOURS[:48])
    draft_study(tmp_path)
    assert [entry["files"] for entry in read_tree(tmp_path / "study.toml")["readings"]] == ["meter_*.csv"]
    other = tmp_path / "other"
    other.mkdir()
    for name in ("a.csv", "b.csv"):
        long(other / name, "%Y-%m-%d %H:%M", (name[:1],), HOURS[:48])
    draft_study(other)
    assert [entry["files"] for entry in read_tree(other / "study.toml")["readings"]] == ["a.csv", "b.csv"]


def test_drafting_again_overwrites_nothing_and_adds_what_is_new_as_remarks(tmp_path):
    long(tmp_path / "east.csv", "%Y-%m-%d %H:%M", ("A",), HOURS[:48])
    draft_study(tmp_path)
    answered(tmp_path, *ANSWERS)
    before, table = text_of(tmp_path), (tmp_path / "customers.csv").read_text(encoding="utf-8")
    assert draft_study(tmp_path)[0] == ()
    long(tmp_path / "west.csv", "%Y-%m-%d %H:%M", ("B",), HOURS[:48])
    written, _ = draft_study(tmp_path)
    assert [path.name for path in written] == ["study.toml", "customers.csv"]
    added = text_of(tmp_path).removeprefix(before)
    assert all(line.startswith("#") for line in added.splitlines() if line)
    assert '# files = "west.csv"' in added
    assert (tmp_path / "customers.csv").read_text(encoding="utf-8") == table + "# new in the meter files:\n# B\n"
    assert [customer.id for customer in load_study(tmp_path / "study.toml").customer] == ["A"]


def test_a_table_without_header_or_stamps_asks_for_its_first_stamp(tmp_path):
    (tmp_path / "loads.csv").write_text("0.5,1.25\n0.25,1.5\n" * 48, encoding="utf-8")
    draft_study(tmp_path)
    answered(
        tmp_path,
        *ANSWERS,
        ('unit = "kWh"', 'unit = "kW"\nquantity = "power"'),
        ("interval_min = 60  #", "interval_min = 15  #"),
    )
    loaded = load_readings(load_study(tmp_path / "study.toml"), tmp_path)
    assert loaded.readings.customers == ("column 1", "column 2")
    assert loaded.readings.kw[:, 0].tolist() == pytest.approx([0.375, 1.375])


def test_a_temperature_series_is_known_for_one_and_a_strange_file_is_named(tmp_path):
    long(tmp_path / "a.csv", "%Y-%m-%d %H:%M", ("A",), HOURS[:48])
    (tmp_path / "weather.csv").write_text(
        "time,outdoor_f\n" + "".join(f"{t:%Y-%m-%d %H:%M},50.0\n" for t in HOURS[:48]), encoding="utf-8"
    )
    (tmp_path / "prices.csv").write_text("month,price\n1,7\n2,8\n", encoding="utf-8")
    (tmp_path / "notes.txt").write_text("call the meter shop\n", encoding="utf-8")
    draft_study(tmp_path)
    assert read_tree(tmp_path / "study.toml")["weather"]["temperature_column"] == "outdoor_f"
    assert '#? unit = "F"' in text_of(tmp_path)
    assert "# not understood: notes.txt" in text_of(tmp_path)
    assert (tmp_path / "customers.csv").read_text(encoding="utf-8") == f"{CUSTOMERS_HEAD}\nA,,,,,,,\n"


def test_a_folder_without_meter_files_is_the_users_fault(tmp_path):
    with pytest.raises(InputError, match="holds no meter file"):
        draft_study(tmp_path)
    with pytest.raises(InputError, match="is no folder"):
        draft_study(tmp_path / "none")
