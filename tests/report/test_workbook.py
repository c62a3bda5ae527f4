"""Tables of the results as a workbook."""

import io
import time

import pytest

from loadsum.report.workbook import workbook

openpyxl = pytest.importorskip("openpyxl")
TABLES = {
    "hours": [{"season": "winter", "mean_kw": 1.5}, {"season": "=1+1", "mean_kw": None}],
    "nothing": [],
    "findings of the readings, and a title too long": [{"rule": "gap", "count": 3, "parts": ["a", "b"]}],
}


def test_each_table_is_a_sheet_with_a_row_of_units_and_no_formula():
    book = openpyxl.load_workbook(io.BytesIO(workbook(TABLES)))
    assert book.sheetnames == ["hours", "findings of the readings, and a"]
    rows = [list(row) for row in book["hours"].iter_rows(values_only=True)]
    assert rows == [["season", "mean_kw"], [None, "kW"], ["winter", 1.5], ["'=1+1", None]]
    assert [cell.value for cell in book["findings of the readings, and a"][3]] == ["gap", 3, "a; b"]


def test_the_same_results_give_the_same_bytes():
    first = workbook(TABLES)
    time.sleep(2.1)  # a zip archive tells two seconds apart
    assert workbook(TABLES) == first
