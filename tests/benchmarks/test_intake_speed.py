"""Speed of intake as ratios within one run: to reading the bytes, and of Parquet to delimited text."""

import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from loadsum.intake.align import aligned
from loadsum.intake.clock import zone
from loadsum.intake.readers.formats import read_file
from tests.intake.studies import study

pa = pytest.importorskip("pyarrow")
pytestmark = pytest.mark.slow

# Guards against a fall from the fast reader, which costs a factor of five and more. The targets are 8, 15, 1.7 and
# 600 MB; measured in processor time on 2 cores: 7.2 to 8, 14.1 to 16 (one run 18), 3.0 to 4.6, and 565 MB.
LONG_RATIO, WIDE_RATIO, PARQUET_GAIN, ADDED_MB = 16.0, 30.0, 1.7, 650
CUSTOMERS, HOURS = 1000, 8760


def best_s(work: Callable[[], object], runs: int = 3) -> float:
    """Least processor time of a few runs, so that other work on the machine does not count. [s]"""
    times = []
    for _ in range(runs):
        begin = time.process_time()
        work()
        times.append(time.process_time() - begin)
    return min(times)


def matrix_of(path: Path, interval_min: int, **keys: object) -> tuple[int, int]:
    source = study({"files": path.name, **keys}).readings[0]
    findings: list = []
    parts = [read.timed for read in read_file(path, source, zone("+00:00"), findings)]
    matrix, faults = aligned(parts, interval_min)
    assert matrix is not None and not faults and not findings and not matrix.findings
    return matrix.kw.shape


@pytest.fixture(scope="module")
def long_files(tmp_path_factory) -> tuple[Path, Path]:
    import pyarrow.csv as pacsv
    import pyarrow.parquet as pq

    folder = tmp_path_factory.mktemp("speed")
    stamps = np.datetime_as_string(np.arange("2031-01-01", "2032-01-01", dtype="datetime64[h]"), unit="m")
    rng = np.random.default_rng(1)
    table = pa.table(
        {
            "customer": pa.array(np.repeat([f"C{n:04d}" for n in range(CUSTOMERS)], HOURS)),
            "time": pa.array(np.tile(stamps, CUSTOMERS)),
            "kwh": np.round(rng.gamma(1.0, 1.0, CUSTOMERS * HOURS), 3),
        }
    )
    pacsv.write_csv(table, folder / "a.csv", pacsv.WriteOptions(quoting_style="none"))
    pq.write_table(table, folder / "a.parquet")
    return folder / "a.csv", folder / "a.parquet"


def test_a_thousand_customers_over_a_year_take_few_times_the_reading_of_the_bytes(long_files):
    path, _ = long_files
    ratio = best_s(lambda: matrix_of(path, 60)) / best_s(path.read_bytes)
    print(f"long: {ratio:.1f} times the reading of the bytes")
    assert ratio < LONG_RATIO


def test_a_thousand_customers_over_a_year_add_little_memory(long_files):
    path, _ = long_files
    code = (
        "import re, sys, pathlib, pyarrow.csv; from tests.benchmarks.test_intake_speed import matrix_of;"
        "most = lambda: int(re.search(r'VmHWM:\\s+(\\d+)', open('/proc/self/status').read())[1]);"
        "before = most(); matrix_of(pathlib.Path(sys.argv[1]), 60); print(most() - before)"
    )
    run = subprocess.run([sys.executable, "-c", code, str(path)], capture_output=True, text=True, check=True)
    added = int(run.stdout) / 1000.0
    print(f"long: {added:.0f} MB added, the bytes of the file ({path.stat().st_size / 1e6:.0f} MB) among them")
    assert added < ADDED_MB


def test_parquet_is_faster_than_delimited_text(long_files):
    text, parquet = long_files
    gain = best_s(lambda: matrix_of(text, 60)) / best_s(lambda: matrix_of(parquet, 60, format="parquet"))
    print(f"Parquet: {gain:.2f} times as fast as delimited text")
    assert gain > PARQUET_GAIN


def test_a_wide_table_stays_with_the_fast_reader(tmp_path):
    import pyarrow.csv as pacsv

    stamps = np.datetime_as_string(np.datetime64("2031-01-01T00:00") + np.arange(35_040) * np.timedelta64(15, "m"))
    rng = np.random.default_rng(1)
    columns = {f"C{n:03d}": np.round(rng.gamma(1.0, 1.0, 35_040), 3) for n in range(200)}
    table = pa.table({"time": pa.array(stamps), **columns})
    pacsv.write_csv(table, tmp_path / "a.csv", pacsv.WriteOptions(quoting_style="none"))
    path = tmp_path / "a.csv"
    ratio = best_s(lambda: matrix_of(path, 15)) / best_s(path.read_bytes)
    print(f"wide: {ratio:.1f} times the reading of the bytes")
    assert ratio < WIDE_RATIO
