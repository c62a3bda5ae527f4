"""Tables of the results as CSV with a row of units, ready to paste."""

import csv
import io
from collections.abc import Mapping, Sequence
from typing import Any

UNITS = {
    "kw": "kW",
    "kw2": "kW2",
    "kwh": "kWh",
    "kva": "kVA",
    "kvar": "kvar",
    "c": "degC",
    "h": "h",
    "min": "min",
    "pu": "pu",
    "pct": "%",
    "days": "d",
    "days_per_year": "d",
    "hours_per_year": "h",
    "w": "W",
}

# Text that a spreadsheet would take for a formula is written with a leading apostrophe.
FORMULA_SIGNS = ("=", "+", "-", "@", "\t", "\r")


def unit_of(column: str) -> str:
    """Unit of a column by the last words of its name; empty for words and plain counts."""
    for words in (column, column.rsplit("_", 1)[-1]):
        if words in UNITS:
            return UNITS[words]
    return ""


def csv_table(rows: Sequence[Mapping[str, Any]]) -> bytes:
    """Rows with like keys as CSV: names, units, then one line a row; numbers with all their digits.

    Parameters
    ----------
    rows : sequence of mapping
        Rows of results.json.
    """
    if not rows:
        return b""
    columns = list(rows[0])
    text = io.StringIO()
    out = csv.writer(text, lineterminator="\n")
    out.writerow(columns)
    out.writerow([unit_of(column) for column in columns])
    for row in rows:
        out.writerow([_cell(row[column]) for column in columns])
    return text.getvalue().encode("utf-8")


def _cell(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, float):
        return repr(value)
    if isinstance(value, list):
        return "; ".join(_cell(v) for v in value)
    text = str(value)
    return "'" + text if isinstance(value, str) and text.startswith(FORMULA_SIGNS) else text
