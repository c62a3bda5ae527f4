"""Round trips: an aligned matrix written in each format and read back is the same."""

import datetime as dt
import importlib.util

import numpy as np
import pytest

from loadsum.errors import InputError, MissingExtraError
from loadsum.intake.load import load_readings
from tests.intake.readers import test_espi, test_nem12
from tests.intake.studies import accounted, study

DAYS = 3
STARTS = [dt.datetime(2031, 1, 1, tzinfo=dt.UTC) + dt.timedelta(minutes=30 * n) for n in range(48 * DAYS)]
NAMES = ("007", "B")
WH = np.random.default_rng(5).integers(0, 4000, (2, len(STARTS)))
KW = WH / 500.0


def long_csv(path):
    lines = [f"{c},{t.isoformat()},{WH[n, i]}" for n, c in enumerate(NAMES) for i, t in enumerate(STARTS)]
    path.write_text("customer,time,wh\n" + "\n".join(lines) + "\n", encoding="utf-8")


def wide_csv(path):
    lines = [f"{t.isoformat()},{WH[0, i]},{WH[1, i]}" for i, t in enumerate(STARTS)]
    path.write_text("time,007,B\n" + "\n".join(lines) + "\n", encoding="utf-8")


def utf16_csv(path):
    long_csv(path)
    path.write_bytes(path.read_text(encoding="utf-8").encode("utf-16"))


def parquet(path):
    pa, pq = pytest.importorskip("pyarrow"), pytest.importorskip("pyarrow.parquet")
    table = pa.table(
        {
            "customer": [c for c in NAMES for _ in STARTS],
            "time": pa.array(STARTS * 2, pa.timestamp("us", tz="UTC")),
            "wh": WH.ravel().astype(float),
        }
    )
    pq.write_table(table, path, row_group_size=100)


def parquet_by_customer(path):
    pa, pq = pytest.importorskip("pyarrow"), pytest.importorskip("pyarrow.parquet")
    for n, name in enumerate(NAMES):
        (path / f"customer={name}").mkdir(parents=True)
        table = pa.table({"time": pa.array(STARTS, pa.timestamp("s", tz="UTC")), "wh": WH[n].astype(float)})
        pq.write_table(table, path / f"customer={name}" / "part.parquet")


def workbook(path):
    openpyxl = pytest.importorskip("openpyxl")
    book = openpyxl.Workbook()
    book.active.append(["customer", "time", "wh"])
    for n, name in enumerate(NAMES):
        for i, t in enumerate(STARTS):
            book.active.append([name, t.replace(tzinfo=None), int(WH[n, i])])
    book.save(path)


def espi(path):
    parts = []
    for n, name in enumerate(NAMES):
        reads = "".join(test_espi.reading(int(t.timestamp()), int(WH[n, i]), 1800) for i, t in enumerate(STARTS))
        parts.append(test_espi.channel(name, 1, reads, test_espi.kind()))
    path.write_text(test_espi.feed(*parts, points=NAMES), encoding="utf-8")


def nem12(path):
    # Market days are not UTC days: the file is written for market days and the study is read on its own clock.
    records = []
    for n, name in enumerate(NAMES):
        records.append(test_nem12.meter("E1", "Wh", name=name))
        for d in range(DAYS):
            date = STARTS[48 * d].strftime("%Y%m%d")
            records.append(test_nem12.day(*WH[n, 48 * d : 48 * d + 48].tolist(), date=date))
    path.write_text(test_nem12.file(*records), encoding="utf-8")


@pytest.mark.parametrize(
    ("write", "name", "form"),
    [
        (long_csv, "a.csv", "delimited text"),
        (wide_csv, "a.csv", "delimited text"),
        (utf16_csv, "a.csv", "delimited text"),
        (parquet, "a.parquet", "parquet"),
        (parquet_by_customer, "folder", "parquet"),
        (workbook, "a.xlsx", "workbook"),
        (espi, "a.xml", "espi"),
        (nem12, "a.csv", "nem12"),
    ],
)
def test_a_matrix_written_and_read_back_is_identical(tmp_path, write, name, form):
    write(tmp_path / name)
    keys = {"files": name, "format": form, "unit": "Wh"}
    loaded = load_readings(study(keys, zone="+10:00" if form == "nem12" else "+00:00", interval_min=30), tmp_path)
    assert loaded.readings.customers == NAMES
    np.testing.assert_array_equal(loaded.readings.kw, KW)
    shift = 36000 if form == "nem12" else 0
    assert loaded.readings.start_utc.tolist() == [int(t.timestamp()) - shift for t in STARTS]
    assert accounted(loaded)


@pytest.mark.parametrize(("form", "name"), [("parquet", "pyarrow"), ("workbook", "openpyxl")])
def test_a_missing_optional_package_is_named_with_the_line_that_installs_it(tmp_path, monkeypatch, form, name):
    (tmp_path / "a").write_bytes(b"x")
    found = importlib.util.find_spec
    monkeypatch.setattr(importlib.util, "find_spec", lambda wanted, *rest: None if wanted == name else found(wanted))
    with pytest.raises(MissingExtraError, match=r"pip install 'loadsum\["):
        load_readings(study({"files": "a", "format": form}), tmp_path)


@pytest.mark.parametrize(("form", "said"), [("parquet", "as Parquet"), ("workbook", "no .xlsx workbook")])
def test_a_file_of_another_kind_is_refused(tmp_path, form, said):
    (tmp_path / "a").write_bytes(b"not this format at all, by no means")
    with pytest.raises(InputError, match=said):
        load_readings(study({"files": "a", "format": form}), tmp_path)
