"""Every fault of a study file in one run, each with its dotted key and what to do."""

import dataclasses
from pathlib import Path

import pytest

from loadsum.cli import main
from loadsum.errors import InputError
from loadsum.study.load import load_study, study_from

GOOD = """\
[study]
title = "Pole transformer at Mill Lane"
time_zone = "America/Chicago"
demand_interval_min = 60
date = 2031-05-04

[readings]
files = "meters.csv"
unit = "kWh"
stamp = "start"

[transformer]
ratings_kva = [15, 25, 37.5]
power_factor = 0.95
"""

TWELVE = """\
[study]
titel = "Pole transformer at Mill Lane"
time_zone = "America/Chicgo"
demand_interval_min = "sixty"
date = "4 May 2031"

[[readings]]
files = "meters/*.csv"
unit = "kVAh"
stamp = "start"
quantity = "energy"

[[season]]
name = "winter"
months = [11, 12, 1, 2, 3]

[[season]]
name = "summer"
months = [3, 4, 5, 6, 7, 8, 9, 10]

[day_types]
holidays_country = "Utopia"

[transformer]
ratings_kva = [15, 25, -50]
power_factor = 1.2

[[criterion]]
quantity = "exceedance hours per year"
season = "monsoon"
"""

# The exact sentences, in the order in which they are printed.
TWELVE_MESSAGES = [
    "study.titel: unknown key; did you mean title?",
    'study.demand_interval_min: must be a whole number, got "sixty"',
    'readings.unit: must be one of Wh, kWh, MWh, W, kW, MW; got "kVAh"',
    "transformer.ratings_kva[3]: must be greater than 0, got -50",
    "transformer.power_factor: must be at most 1, got 1.2",
    "criterion.limit: missing; your utility's loading standard states it",
    'readings.files: no file matches "meters/*.csv" from the folder of the study file',
    'study.time_zone: "America/Chicgo" is no IANA time zone such as "Europe/Oslo" and no fixed offset such as "+10:00"',
    'study.date: must be an ISO 8601 date such as 2031-05-04, got "4 May 2031"',
    'season[2].months: month 3 is already in season "winter"',
    'criterion.season: no season is called "monsoon"; known: all, winter, summer',
    'day_types.holidays_country: no holidays are known for "Utopia"; give the ISO 3166 code of the country,'
    " or list the days under day_types.holidays",
]


def write(folder: Path, text: str) -> Path:
    (folder / "meters.csv").write_text("customer,time,kwh\n", encoding="utf-8")
    path = folder / "study.toml"
    path.write_text(text, encoding="utf-8")
    return path


def messages(folder: Path, text: str) -> list[str]:
    with pytest.raises(InputError) as caught:
        load_study(write(folder, text))
    return [str(fault) for fault in caught.value.faults]


def changed(old: str, new: str) -> str:
    assert old in GOOD
    return GOOD.replace(old, new)


def test_twelve_different_faults_give_exactly_twelve_messages_in_one_run(tmp_path):
    assert len(TWELVE_MESSAGES) == 12
    assert messages(tmp_path, TWELVE) == TWELVE_MESSAGES


def test_the_command_prints_the_twelve_messages_without_a_traceback_and_returns_2(tmp_path, capsys):
    path = write(tmp_path, TWELVE)
    assert main(["study", str(path), "--out", str(tmp_path / "out")]) == 2
    printed = capsys.readouterr().err
    assert "Traceback" not in printed
    assert [line.strip() for line in printed.strip().splitlines()[1:]] == TWELVE_MESSAGES
    assert not (tmp_path / "out").exists()


def test_a_good_study_file_is_read_with_its_defaults(tmp_path):
    study = load_study(write(tmp_path, GOOD))
    assert study.study.date == "2031-05-04"
    assert study.transformer[0].ratings_kva == (15.0, 25.0, 37.5)
    assert study.readings[0].quantity == "energy"
    with pytest.raises(dataclasses.FrozenInstanceError):
        study.study.title = "another"  # type: ignore[misc]


def test_several_transformers_stand_in_an_array_of_tables(tmp_path):
    text = changed("[transformer]\n", '[[transformer]]\nid = "T-1"\n') + (
        '[[transformer]]\nid = "T-2"\nratings_kva = [50]\npower_factor = 0.9\n'
    )
    assert [unit.id for unit in load_study(write(tmp_path, text)).transformer] == ["T-1", "T-2"]


ONE_FAULT = {
    "no power factor": (
        changed("power_factor = 0.95\n", ""),
        "transformer.power_factor: missing; state the power factor of the group, above 0, or name the kvar_column of"
        " the readings",
    ),
    "repeated rating": (changed("[15, 25, 37.5]", "[15, 25, 25]"), "transformer.ratings_kva[3]: 25 is listed twice"),
    "unsorted ratings": (
        changed("[15, 25, 37.5]", "[25, 15, 37.5]"),
        "transformer.ratings_kva[2]: 15 follows 25; list them in order",
    ),
    "series beside ratings": (
        changed("power_factor", 'series = "single-phase 60 Hz"\npower_factor'),
        "transformer.series: stands beside ratings_kva; keep one of the two",
    ),
    "no ratings": (
        changed("ratings_kva = [15, 25, 37.5]\n", ""),
        "transformer.ratings_kva: missing; list the ratings to compare, or name a series, or the installed_kva",
    ),
    "customer twice": (
        GOOD + '[[customer]]\nid = "A"\n[[customer]]\nid = "A"\n',
        'customer[2].id: customer "A" is listed twice',
    ),
    "unknown transformer": (
        GOOD + '[[customer]]\nid = "A"\ntransformer = "T-9"\n',
        'customer[1].transformer: no transformer has the id "T-9"; known: none has an id',
    ),
    "months missing": (
        GOOD + '[[season]]\nname = "winter"\nmonths = [12, 1, 2]\n',
        "season: months in no season: 3, 4, 5, 6, 7, 8, 9, 10, 11",
    ),
    "month 13": (GOOD + '[season]\nname = "all"\nmonths = [13]\n', "season.months[1]: must be at most 12, got 13"),
    "wrong kind of list": (changed("[15, 25, 37.5]", "25"), "transformer.ratings_kva: must be a list, got 25"),
    "true for a number": (
        changed("demand_interval_min = 60", "demand_interval_min = true"),
        "study.demand_interval_min: must be a whole number, got true",
    ),
    "not a number": (changed("0.95", "nan"), "transformer.power_factor: must be a finite number, got nan"),
    "a value for a table": ("person = 3\n" + GOOD, "person: must be a list, got 3"),
    "key of another table": (
        changed("date = ", "power_factor = 0.9\ndate = "),
        "study.power_factor: unknown key; it belongs to [transformer]",
    ),
    "clock": (
        changed('stamp = "start"', 'stamp = "start"\nclock = "winter"'),
        'readings.clock: must be local, utc, standard or an offset such as "+10:00"; got "winter"',
    ),
    "no interval without stamps": (
        changed('stamp = "start"', 'stamp = "start"\nfirst_stamp = 2031-01-01T00:00:00'),
        "readings.interval_min: missing; a file without stamps needs it",
    ),
    "no weather file": (GOOD + '[weather]\nfile = "t.csv"\n', 'weather.file: no file "t.csv" beside the study file'),
    "subdivision": (
        GOOD + '[day_types]\nholidays_country = "US"\nholidays_subdivision = "ZZ"\n',
        'day_types.holidays_subdivision: US has no subdivision "ZZ"',
    ),
    "emergency below normal": (
        GOOD + "[allowed_loading]\nnormal_pu = 1.2\nemergency_pu = 1.1\n",
        "allowed_loading.emergency_pu: must be at least the normal 1.2, got 1.1",
    ),
    "source of nothing": (
        changed("power_factor", 'sources = ["impedence: nameplate"]\npower_factor'),
        'transformer.sources[1]: must begin with a key of this table and a colon, such as "impedance_pct: nameplate,'
        ' read 2031-02-03"; got "impedence: nameplate"',
    ),
    "no TOML": (
        "[study\n",
        "study.toml: is not TOML: Expected ']' at the end of a table declaration (at line 1, column 7)",
    ),
}


@pytest.mark.parametrize("name", ONE_FAULT)
def test_one_fault_gives_one_message(name, tmp_path):
    text, message = ONE_FAULT[name]
    assert messages(tmp_path, text) == [message]


def test_a_fault_in_a_season_does_not_bring_faults_about_seasons_in_its_train(tmp_path):
    text = GOOD + '[season]\nname = "year"\nmonths = [1, "two", 3, 4, 5, 6, 7, 8, 9, 10, 11, 12]\n'
    assert messages(tmp_path, text) == ['season.months[2]: must be a whole number, got "two"']


def test_nothing_at_all_is_told_by_the_tables_that_are_needed():
    with pytest.raises(InputError) as caught:
        study_from({}, "study.toml")
    assert {fault.where for fault in caught.value.faults} == {"study", "readings", "transformer"}


def test_a_file_that_is_not_text_or_not_there_is_a_fault(tmp_path):
    (tmp_path / "study.toml").write_bytes(b"title = \xff")
    for name, message in (("study.toml", "is not UTF-8 text"), ("other.toml", "cannot be read")):
        with pytest.raises(InputError, match=message):
            load_study(tmp_path / name)
