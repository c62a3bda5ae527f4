"""NEM12 against small files written here, and against the examples that an independent reader comes with."""

import importlib.util
import io
import sys
import tarfile
import time
import types
import zipfile
from pathlib import Path

import numpy as np
import pytest

from loadsum.errors import InputError
from loadsum.intake.readers.channels import read_nem12
from loadsum.intake.readers.nem12 import parse_nem12
from tests.intake.studies import accounted, load, rules

LEAVES_FILES_OPEN = pytest.mark.filterwarnings(
    "ignore::pytest.PytestUnraisableExceptionWarning", "ignore::ResourceWarning"
)
BASELINE = "nemreader==0.9.2"  # MIT; its source distribution holds the examples (examples/)


def day(*values: float, flag: str = "A", date: str = "20310101") -> str:
    return f"300,{date},{','.join(str(v) for v in values)},{flag},,,\n"


def meter(channel: str, unit: str = "kWh", minutes: int = 30, name: str = "00METER") -> str:
    return f"200,{name},E1B1,,{channel},,,{unit},{minutes},\n"


def file(*records: str) -> str:
    return "100,NEM12,203101020000,X,Y\n" + "".join(records) + "900\n"


def test_intervals_stand_at_market_time_and_half_hours_become_power(tmp_path):
    loaded = load(
        tmp_path, file(meter("E1"), day(*range(48))), zone="Australia/Brisbane", interval_min=30, format="nem12"
    )
    assert loaded.readings.customers == ("00METER",)
    np.testing.assert_array_equal(loaded.readings.kw[0], 2.0 * np.arange(48))
    assert loaded.readings.interval_of_day.tolist() == list(range(48))
    assert accounted(loaded)


def test_export_is_netted_reactive_kept_and_units_read_in_any_case(tmp_path):
    text = file(
        meter("E1", "WH"), day(*[1500] * 48), meter("B1", "kwh"), day(*[0.5] * 48), meter("Q1", "KVARH"), day(*[2] * 48)
    )
    loaded = load(tmp_path, text, zone="+10:00", interval_min=30, format="nem12")
    np.testing.assert_allclose(loaded.readings.kw, 2.0)
    np.testing.assert_allclose(loaded.readings.kvar, 4.0)
    assert accounted(loaded)


def test_ranges_of_quality_mark_estimates_and_empty_intervals(tmp_path):
    text = file(meter("E1"), day(*[1] * 48, flag="V"), "400,1,20,A,,\n", "400,21,40,S14,1,\n", "400,41,48,N,,\n")
    loaded = load(tmp_path, text, zone="+10:00", interval_min=30, format="nem12")
    assert loaded.readings.estimated[0].sum() == 20
    assert sum(f.excluded for f in loaded.readings.findings if f.rule == "empty reading") == 8
    assert accounted(loaded)


def test_days_in_any_order_repeated_and_conflicting_are_accounted_for(tmp_path):
    text = file(
        meter("E1"),
        day(*[2] * 48, date="20310103"),
        day(*[1] * 48, date="20310101"),
        day(*[1] * 48, date="20310101"),
        meter("B1"),
        day(*[0] * 48, date="20310101"),
        meter("E1"),
        day(*[3] * 48, date="20310103"),
        day(*[9] * 48, date="20310102"),
    )
    loaded = load(tmp_path, text, zone="+10:00", interval_min=30, format="nem12")
    np.testing.assert_array_equal(loaded.readings.kw[0], np.full(48, 2.0))
    assert {"repeated reading", "conflicting readings", "channel missing"} <= rules(loaded)
    assert accounted(loaded)


def test_missing_header_and_end_are_said_not_guessed_away(tmp_path):
    loaded = load(tmp_path, meter("E1") + day(*[1] * 48), zone="+10:00", interval_min=30, format="nem12")
    assert [f.message for f in loaded.readings.findings if f.rule == "record missing"] == [
        "the file has no header (100)",
        "the file has no end record (900)",
    ]


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("100,NEM13,2,X,Y\n250,A\n900\n", "a.csv:1: holds NEM13 accumulated readings"),
        (file(), "holds no interval record"),
        (file(meter("E1"), day(*range(47))), "a.csv:3: a day of 30 min has 48 values; found 47"),
        (file(meter("E1", minutes=10), day(*range(48))), "interval length must be 5, 15 or 30, got '10'"),
        (file(meter("E1"), day(*range(48), flag="V"), "400,1,47,A,,\n"), "no 400 record covers interval 48"),
        (file(meter("E1"), day(*range(48)), "400,1,96,A,,\n"), "must lie within 1 to 48"),
        (file(meter("E1"), day(*range(48), date="20310231")), "date '20310231' is not YYYYMMDD"),
        (file(meter("E1"), day(*range(47), float("inf"))), "no number of a believable size"),
        (file(meter("E1"), "xyz\n", day(*range(48))), "a.csv:3: is no record of NEM12"),
    ],
)
def test_a_faulty_file_is_refused_by_line(tmp_path, text, message):
    with pytest.raises(InputError) as caught:
        load(tmp_path, text, zone="+10:00", interval_min=30, format="nem12")
    assert message in str(caught.value)


@pytest.fixture(scope="module")
def baseline(tmp_path_factory):
    """The independent reader and the folder of its examples."""
    archive = Path.home() / ".cache" / "loadsum-tests" / "nemreader-0.9.2.tar.gz"
    if not archive.exists():
        pytest.skip(f"the source distribution of {BASELINE} is not in ~/.cache/loadsum-tests (pip download --no-deps)")
    folder = tmp_path_factory.mktemp("nem")
    with tarfile.open(archive) as packed:
        # the filter came with Python 3.11.4; the archive is the one of that name and version from the registry
        packed.extractall(folder, **({"filter": "data"} if hasattr(tarfile, "data_filter") else {}))
    root = folder / "nemreader-0.9.2"
    sys.path.insert(0, str(root))
    if importlib.util.find_spec("sqlite_utils") is None:  # needed by its outputs only, which are not used here
        sys.modules["sqlite_utils"] = types.ModuleType("sqlite_utils")
        sys.modules["sqlite_utils"].Database = object
    yield root
    sys.path.remove(str(root))


@LEAVES_FILES_OPEN
def test_every_valid_example_gives_the_sums_of_an_independent_reader(baseline, caplog):
    reader = pytest.importorskip("nemreader.nem_reader", reason=f"{BASELINE} cannot be imported")
    checked = 0
    for path in sorted((baseline / "examples").rglob("*")):
        if path.is_dir() or "invalid" in path.parts or "13" in path.name.upper()[:5] or "NEM13" in path.name:
            continue
        content = path.read_bytes()
        if path.suffix.lower() == ".zip":
            with zipfile.ZipFile(io.BytesIO(content)) as packed:
                content = packed.read(packed.namelist()[0])
        caplog.clear()
        theirs = reader.read_nem_file(str(path), ignore_missing_header=True)
        expected = {
            (meter, suffix): sum(reading.read_value for reading in readings if reading.read_value is not None)
            for meter, channels in theirs.readings.items()
            for suffix, readings in channels.items()
            if suffix[0] in "EBQK" and readings and readings[0].uom.lower() in ("kwh", "wh", "kvarh", "varh")
        }
        ours: dict[tuple[str, str], float] = {}
        try:
            channels = parse_nem12(content, path.name).channels
        except InputError:
            assert "Skipping" in caplog.text or "not supported" in caplog.text, path.name  # it drops records, we do not
            continue
        for channel in channels:
            key = (channel.meter, channel.suffix)
            ours[key] = ours.get(key, 0.0) + float(np.nansum(channel.values))
        expected = {key: total for key, total in expected.items() if key in ours or total}
        assert set(expected) <= set(ours), path.name
        for key, total in expected.items():
            assert ours[key] == pytest.approx(total, rel=1e-9, abs=1e-9), (path.name, key)
        checked += 1
    assert checked >= 60


def test_every_invalid_example_is_refused_or_its_missing_records_are_said(baseline):
    for path in sorted((baseline / "examples" / "invalid").glob("*.csv")):
        try:
            found = parse_nem12(path.read_bytes() or b"\n", path.name)
        except InputError as refusal:
            assert path.name in str(refusal)
        else:
            assert found.missing, path.name


@LEAVES_FILES_OPEN
@pytest.mark.slow
def test_a_year_is_read_ten_times_faster_than_by_the_independent_reader(baseline, tmp_path):
    reader = pytest.importorskip("nemreader.nem_reader", reason=f"{BASELINE} cannot be imported")
    dates = np.arange("2030-01-01", "2031-01-01", dtype="datetime64[D]")
    days = "".join(day(*(n % 7 / 8 for n in range(288)), date=str(d).replace("-", "")) for d in dates)
    path = tmp_path / "a.csv"
    path.write_text(file(meter("E1", minutes=5), days))
    begin = time.perf_counter()
    read_nem12(path.read_bytes(), path.name, [], [])
    ours = time.perf_counter() - begin
    begin = time.perf_counter()
    reader.read_nem_file(str(path))
    assert time.perf_counter() - begin > 10.0 * ours
