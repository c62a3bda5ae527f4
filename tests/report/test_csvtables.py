import csv
import io

from loadsum.report.csvtables import csv_table


def test_a_table_has_names_units_and_every_digit() -> None:
    rows = list(
        csv.reader(
            io.StringIO(csv_table([{"season": "winter", "mean_kw": 0.1 + 0.2, "hours_per_year": None}]).decode())
        )
    )
    assert rows == [["season", "mean_kw", "hours_per_year"], ["", "kW", "h"], ["winter", "0.30000000000000004", ""]]


def test_text_that_a_spreadsheet_would_run_is_defused() -> None:
    assert b"'=1+1" in csv_table([{"customer": "=1+1"}])


def test_no_rows_make_an_empty_file() -> None:
    assert csv_table([]) == b""
