"""Delimited text to aligned readings: layouts, clocks, duplicates, accounting."""

import datetime as dt
import gzip
import zipfile
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from loadsum.errors import InputError
from loadsum.intake.load import load_readings
from tests.datasets import package_file
from tests.intake.studies import accounted, load, rules, study

LONG = "customer,time,kwh\n" + "".join(
    f"{who},2031-01-01T{hour:02d}:00,{hour + n}\n" for n, who in enumerate(("007", "B")) for hour in range(24)
)
WIDE = "time,007,B\n" + "".join(f"2031-01-01T{hour:02d}:00,{hour},{hour + 1}\n" for hour in range(24))
DAYS = "customer,date," + ",".join(f"{h:02d}:00" for h in range(24)) + "\n"
DAYS += "".join(
    f"{who},2031-01-01," + ",".join(str(h + n) for h in range(24)) + "\n" for n, who in enumerate(("007", "B"))
)
EXPECTED = np.array([np.arange(24.0), np.arange(24.0) + 1])


@pytest.mark.parametrize("text", [LONG, WIDE, DAYS], ids=["long", "wide", "one row a day"])
def test_every_layout_gives_the_same_matrix_and_keeps_leading_zeros(tmp_path, text):
    loaded = load(tmp_path, text)
    assert loaded.readings.customers == ("007", "B")
    np.testing.assert_array_equal(loaded.readings.kw, EXPECTED)
    assert accounted(loaded)


@pytest.mark.parametrize("delimiter", [";", "\t", "|"])
def test_any_delimiter_and_a_decimal_comma_are_read_and_said(tmp_path, delimiter):
    text = LONG.replace(",", delimiter).replace("T", " ")
    lines = [line + (",25" if n else "") for n, line in enumerate(text.splitlines())]
    loaded = load(tmp_path, "\n".join(lines) + "\n")
    np.testing.assert_allclose(loaded.readings.kw, EXPECTED + 0.25)
    assert "decimal comma, guessed" in loaded.inputs[0].choices


def test_the_fast_reader_and_the_careful_reader_agree(tmp_path, monkeypatch):
    text = LONG.replace("007", " 007")
    quick = load(tmp_path, text)
    monkeypatch.setattr("loadsum.intake.readers.delimited._quickly", lambda *_: None)
    slow = load(tmp_path, text)
    np.testing.assert_array_equal(quick.readings.kw, slow.readings.kw)
    assert quick.readings.customers == slow.readings.customers
    assert quick.inputs == slow.inputs


def test_gz_zip_folder_and_pattern_give_the_same_readings(tmp_path):
    (tmp_path / "m").mkdir()
    half = LONG.splitlines(keepends=True)
    with gzip.open(tmp_path / "m" / "a.csv.gz", "wb") as file:
        file.write("".join(half[:25]).encode())
    with zipfile.ZipFile(tmp_path / "m" / "b.zip", "w") as archive:
        archive.writestr("inner.csv", half[0] + "".join(half[25:]))
    for pattern in ("m", "m/*"):
        loaded = load_readings(study({"files": pattern}), tmp_path)
        np.testing.assert_array_equal(loaded.readings.kw, EXPECTED)
    assert [file.name for file in loaded.inputs] == ["m/a.csv.gz", "m/b.zip"]


def test_energy_of_a_quarter_hour_becomes_average_power_of_the_hour(tmp_path):
    rows = "".join(f"A,2031-01-01T{m // 60:02d}:{m % 60:02d},{m % 60 / 60}\n" for m in range(0, 180, 15))
    loaded = load(tmp_path, "customer,time,kwh\n" + rows)
    np.testing.assert_allclose(loaded.readings.kw, np.full((1, 3), 1.5))
    assert accounted(loaded, 4)


def test_meters_of_different_intervals_in_one_file_are_each_averaged_up(tmp_path):
    rows = [f"Q,2031-01-01T{m // 60:02d}:{m % 60:02d},0.25" for m in range(0, 1440, 15)]
    rows += [f"H,2031-01-01T{h:02d}:00,3" for h in range(24)]
    loaded = load(tmp_path, "customer,time,kwh\n" + "\n".join(rows) + "\n")
    np.testing.assert_allclose(loaded.readings.kw, [[3.0] * 24, [1.0] * 24])


def test_readings_longer_than_the_demand_interval_are_refused(tmp_path):
    with pytest.raises(InputError, match=r"study.demand_interval_min: is 15, but a.csv has readings of 60 min"):
        load(tmp_path, LONG, interval_min=15)


def wall_clock(day: str, zone: str, hours: int, minutes: int = 60) -> list[tuple[dt.datetime, str]]:
    begin = dt.datetime.fromisoformat(day).replace(tzinfo=ZoneInfo(zone)).astimezone(dt.UTC)
    instants = [begin + dt.timedelta(minutes=minutes * n) for n in range(hours * 60 // minutes)]
    return [(at, at.astimezone(ZoneInfo(zone)).strftime("%Y-%m-%d %H:%M")) for at in instants]


@pytest.mark.parametrize(("day", "hours"), [("2031-03-30", 23), ("2031-10-26", 25)])
@pytest.mark.parametrize("backwards", [False, True])
@pytest.mark.parametrize("minutes", [15, 60])
def test_days_of_23_and_25_hours_are_true_instants_in_either_order(tmp_path, day, hours, backwards, minutes):
    stamps = wall_clock(day, "Europe/Oslo", hours, minutes)
    rows = [f"A,{text},{n}" for n, (_, text) in enumerate(stamps)]
    text = "customer,time,kw\n" + "\n".join(reversed(rows) if backwards else rows) + "\n"
    loaded = load(tmp_path, text, zone="Europe/Oslo", quantity="power", unit="kW", interval_min=minutes)
    assert loaded.readings.start_utc.tolist() == [int(at.timestamp()) for at, _ in stamps]
    np.testing.assert_array_equal(loaded.readings.kw[0], np.arange(len(stamps)))
    assert not loaded.readings.findings


def test_a_true_duplicate_in_the_repeated_hour_is_not_taken_for_its_second_pass(tmp_path):
    stamps = wall_clock("2031-10-26", "Europe/Oslo", 25)
    rows = [f"A,{text},{n}" for n, (_, text) in enumerate(stamps)]
    doubled = [row for row in rows for _ in range(2)]
    loaded = load(tmp_path, "customer,time,kwh\n" + "\n".join(doubled) + "\n", zone="Europe/Oslo")
    np.testing.assert_array_equal(loaded.readings.kw[0], np.arange(25))
    assert sum(f.excluded for f in loaded.readings.findings if f.rule == "repeated reading") == 25
    assert accounted(loaded)


def test_a_file_that_ignores_the_clock_change_is_said_to(tmp_path):
    rows = "".join(f"A,2031-03-30 {hour:02d}:00,1\n" for hour in range(24))
    loaded = load(tmp_path, "customer,time,kwh\n" + rows, zone="Europe/Oslo")
    (finding,) = [f for f in loaded.readings.findings if f.rule == "stamp in the skipped hour"]
    assert (finding.place, finding.excluded, finding.customer) == ("a.csv:4", 1, "A")
    assert accounted(loaded)


@pytest.mark.parametrize(
    ("clock", "first"), [("utc", "2031-07-01T00:00"), ("standard", "2031-06-30T23:00"), ("+05:30", "2031-06-30T18:30")]
)
def test_other_clocks_are_moved_to_utc(tmp_path, clock, first):
    rows = "".join(f"A,2031-07-01 {m // 60:02d}:{m % 60:02d},1\n" for m in range(0, 1440, 30))
    loaded = load(tmp_path, "customer,time,kwh\n" + rows, zone="Europe/Oslo", clock=clock, interval_min=30)
    assert loaded.readings.start_utc[0] == int(dt.datetime.fromisoformat(first + "+00:00").timestamp())


def test_hours_of_a_zone_half_an_hour_off_stay_whole(tmp_path):
    loaded = load(tmp_path, LONG, zone="Asia/Kolkata")
    np.testing.assert_array_equal(loaded.readings.kw, EXPECTED)
    assert loaded.readings.interval_of_day.tolist() == list(range(24))


def test_end_stamps_mark_the_interval_before_even_at_midnight(tmp_path):
    rows = "".join(f"A,2031-01-01 {hour:02d}:00,{hour}\n" for hour in range(1, 25))
    loaded = load(tmp_path, "customer,time,kwh\n" + rows, stamp="end")
    np.testing.assert_array_equal(loaded.readings.kw[0], np.arange(1, 25))
    assert loaded.readings.interval_of_day.tolist() == list(range(24))


def test_day_and_month_are_asked_for_unless_the_file_proves_them(tmp_path):
    rows = "".join(f"A,03/04/2031 {hour:02d}:00,1\n" for hour in range(24))
    with pytest.raises(InputError, match=r'state readings.day_first = "yes" or "no"'):
        load(tmp_path, "customer,time,kwh\n" + rows)
    stated = load(tmp_path, "customer,time,kwh\n" + rows, day_first="yes")
    assert stated.readings.start_utc[0] == int(dt.datetime(2031, 4, 3, tzinfo=dt.UTC).timestamp())
    proved = load(tmp_path, "customer,time,kwh\n" + rows.replace("03/04", "23/04"))
    assert any("proved by the file" in choice for choice in proved.inputs[0].choices)
    with pytest.raises(InputError, match="mixes dates"):
        load(tmp_path, "customer,time,kwh\n" + rows + "A,04/23/2031 00:00,1\nA,23/04/2031 00:00,1\n")


def test_conflicts_name_the_line_and_use_neither_value(tmp_path):
    loaded = load(tmp_path, LONG + "007,2031-01-01T05:00,99\n")
    (finding,) = [f for f in loaded.readings.findings if f.rule == "conflicting readings"]
    assert (finding.customer, finding.place, finding.excluded) == ("007", "a.csv:7", 2)
    assert np.isnan(loaded.readings.kw[0, 5])
    assert accounted(loaded)


def test_an_observed_reading_supersedes_its_estimate(tmp_path):
    lines = LONG.splitlines()
    text = "\n".join([lines[0] + ",flag", *(line + ",A" for line in lines[1:]), "007,2031-01-01T05:00,99,E"]) + "\n"
    loaded = load(tmp_path, text, flag_column="flag", estimated_flags=["E"])
    assert "superseded estimate" in rules(loaded)
    np.testing.assert_array_equal(loaded.readings.kw, EXPECTED)
    assert not loaded.readings.estimated.any()
    assert accounted(loaded)


def test_registers_are_differenced_with_rollover_and_a_closing_read(tmp_path):
    values = [9990, 9995, 2, 8, 1, 4]  # rolls over after the second, a new meter after the fourth
    rows = "".join(f"A,2031-01-01T{h:02d}:00,{v}\n" for h, v in enumerate(values))
    loaded = load(tmp_path, "customer,time,kwh\n" + rows, quantity="register", register_digits=4)
    np.testing.assert_array_equal(loaded.readings.kw[0], [5.0, 7.0, 6.0, np.nan, 3.0])
    assert {"closing register", "register fell", "register rolled over"} <= rules(loaded)
    assert accounted(loaded)


def test_a_reactive_column_beside_a_register_is_said_not_to_be_used(tmp_path):
    rows = "".join(f"A,2031-01-01T{h:02d}:00,{h},{h}\n" for h in range(6))
    loaded = load(tmp_path, "customer,time,kwh,kvarh\n" + rows, quantity="register", kvar_column="kvarh")
    (finding,) = (one for one in loaded.readings.findings if one.rule == "reactive register")
    assert (finding.count, finding.excluded) == (6, 0)
    assert loaded.readings.kvar is None or np.isnan(loaded.readings.kvar).all()


def test_empty_columns_at_the_end_are_no_customers(tmp_path):
    wide = "time,007,B,,\n" + "".join(f"2031-01-01T{h:02d}:00,{h},{h + 1},,\n" for h in range(24))
    loaded = load(tmp_path, wide)
    assert loaded.readings.customers == ("007", "B")
    assert accounted(loaded)
    one = "time,007,B,\n" + "".join(f"2031-01-01T{h:02d}:00,{h},{h + 1},\n" for h in range(24))
    (tmp_path / "again").mkdir()
    np.testing.assert_array_equal(load(tmp_path / "again", one).readings.kw, loaded.readings.kw)


def test_date_and_time_of_day_in_columns_of_their_own_are_one_stamp(tmp_path):
    rows = "".join(f"{d:02d}/02/2031,{h:02d}:00,{h}\n" for d in (13, 14) for h in range(24))
    rows = rows.replace("\n", ",A\n")
    keys = {"time_column": "Date", "time_of_day_column": "Time", "customer_column": "Meter", "value_column": "kWh"}
    loaded = load(tmp_path, "Date,Time,kWh,Meter\n" + rows, **keys)
    np.testing.assert_array_equal(loaded.readings.kw[0], np.tile(np.arange(24.0), 2))
    assert any("Date and Time together" in choice for choice in loaded.inputs[0].choices)


def test_exported_energy_counts_as_negative_and_kvar_is_kept(tmp_path):
    lines = LONG.splitlines()
    text = "\n".join([lines[0] + ",out,kvarh", *(line + ",2,0.5" for line in lines[1:])]) + "\n"
    loaded = load(tmp_path, text, export_column="out", kvar_column="kvarh")
    np.testing.assert_array_equal(loaded.readings.kw, EXPECTED - 2.0)
    np.testing.assert_array_equal(loaded.readings.kvar, np.full((2, 24), 0.5))


READING = st.tuples(
    st.sampled_from(["A", "B", ""]),
    st.sampled_from(
        ["2031-01-01T00:00", "2031-01-01T01:00", "2031-01-01T01:30", "x", "0001-01-01T00:00", "9999-01-01"]
    ),
    st.sampled_from(["1", "2", "", "x", "inf", "nan", "1e308", "-1"]),
)


@given(st.lists(READING, max_size=30))
@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_every_reading_is_used_or_stands_in_a_finding(tmp_path, rows):
    good = [("G", f"2031-01-01T{hour:02d}:00", "1") for hour in range(24)]
    text = "customer,time,kwh\n" + "".join(",".join(row) + "\n" for row in [*good, *rows])
    assert accounted(load(tmp_path, text, minutes=60))


def test_one_file_a_customer_without_stamps_is_read_as_the_study_file_states(tmp_path):
    homes = package_file("citylearn", "data/citylearn_challenge_2022_phase_all/Building_1.csv").parent
    for number in (1, 2):
        (tmp_path / f"Building_{number}.csv").write_bytes((homes / f"Building_{number}.csv").read_bytes())
    asked = study(
        {
            "files": "Building_*.csv",
            "layout": "one column a customer",
            "customer": "file name",
            "value_column": "Equipment Electric Power [kWh]",
            "first_stamp": "2016-07-31T23:00",
            "interval_min": 60,
        },
        zone="-08:00",
    )
    loaded = load_readings(asked, tmp_path)
    assert loaded.readings.customers == ("Building_1", "Building_2")
    assert loaded.readings.kw.shape == (2, 8760)
    assert loaded.readings.kw[0, 0] == 2.2758
    assert accounted(loaded)


def test_the_dirty_residential_loads_say_zeros_export_and_the_missing_clock(tmp_path):
    path = package_file("ev2gym", "data/residential_loads.csv")
    (tmp_path / "a.csv").write_bytes(path.read_bytes())
    keys = {"unit": "kW", "quantity": "power", "header": "no", "layout": "one column a customer"}
    with pytest.raises(InputError, match="without stamps state first_stamp and interval_min"):
        load_readings(study(keys, interval_min=15), tmp_path)
    stated = {**keys, "first_stamp": "2020-01-01T00:00", "interval_min": 15}
    loaded = load_readings(study(stated, interval_min=15), tmp_path)
    assert loaded.readings.kw.shape == (25, 35040)
    assert accounted(loaded)
    assert any(choice.startswith("no stamps in the file") for choice in loaded.inputs[0].choices)
    raw = np.loadtxt(path, delimiter=",")
    exporters = {f"column {n + 1}" for n in range(25) if (raw[:, n] < 0).any()}
    said = {f.customer for f in loaded.readings.findings if f.rule == "negative demand"}
    assert said == exporters and exporters
    zero_days = [
        float(f.message.split("(")[2].split(" days")[0])
        for f in loaded.readings.findings
        if f.rule == "zeros like a gap"
    ]
    assert any(18.0 <= days < 19.0 for days in zero_days)


def test_a_folder_of_faulty_files_reports_every_fault_at_once(tmp_path: Path):
    (tmp_path / "m").mkdir()
    (tmp_path / "m" / "a.csv").write_bytes(b"")
    (tmp_path / "m" / "b.csv").write_bytes(bytes(range(256)))
    with pytest.raises(InputError) as caught:
        load_readings(study({"files": "m"}, {"files": "none.csv"}), tmp_path)
    assert len(caught.value.faults) == 3
