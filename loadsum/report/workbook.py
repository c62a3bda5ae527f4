"""Tables of the results as one workbook, ready to paste; an extra."""

import datetime as dt
import io
import zipfile
from collections.abc import Mapping, Sequence
from typing import Any

from loadsum.errors import MissingExtraError
from loadsum.report.csvtables import FORMULA_SIGNS, unit_of

LONGEST_TITLE = 31
FIXED = dt.datetime(2000, 1, 1)  # every date inside the file, so that the same results give the same bytes


def result_tables(results: dict[str, Any]) -> dict[str, list[dict[str, Any]]]:
    """The tables that people paste, by title; the transformer stands in the first column."""
    units = results["transformers"]
    by_unit = {
        name: [{"transformer": unit["id"], **row} for unit in units for row in unit[name]]
        for name in ("hours", "exceedance", "customers", "assumptions")
    }
    return {**by_unit, "findings": results["findings"]}


def workbook(tables: Mapping[str, Sequence[Mapping[str, Any]]]) -> bytes:
    """Tables as the sheets of a workbook: names, units, then one line a row.

    Parameters
    ----------
    tables : mapping of str to sequence of mapping
        Rows with like keys, by title; empty tables are left out.

    Raises
    ------
    MissingExtraError
        The package that writes workbooks is not installed.
    """
    try:
        import openpyxl
    except ImportError as error:
        raise MissingExtraError("writing a workbook", "xlsx") from error
    book = openpyxl.Workbook()
    book.remove(book.active)
    for title, rows in tables.items():
        if not rows:
            continue
        sheet = book.create_sheet(title[:LONGEST_TITLE])
        columns = list(rows[0])
        sheet.append(columns)
        sheet.append([unit_of(column) for column in columns])
        for row in rows:
            sheet.append([_cell(row[column]) for column in columns])
        sheet.freeze_panes = "A3"
    book.properties.creator, book.properties.created, book.properties.modified = "loadsum", FIXED, FIXED
    written = io.BytesIO()
    book.save(written)
    return _without_clock(written.getvalue())


def _cell(value: Any) -> Any:
    """A value as a cell; text that would be taken for a formula is written with a leading apostrophe."""
    if isinstance(value, list):
        return "; ".join(str(part) for part in value)
    if isinstance(value, dict):
        return "; ".join(f"{name} {part}" for name, part in value.items())
    return "'" + value if isinstance(value, str) and value.startswith(FORMULA_SIGNS) else value


def _without_clock(content: bytes) -> bytes:
    """The same archive with fixed dates."""
    written = io.BytesIO()
    stamp = (FIXED.year, FIXED.month, FIXED.day, 0, 0, 0)
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(written, "w", zipfile.ZIP_DEFLATED) as new:
        for info in old.infolist():
            inside = old.read(info.filename)
            if info.filename == "docProps/core.xml":  # the writer stamps the time of saving over what it is told
                head, _, rest = inside.partition(b"<dcterms:modified")
                _, _, tail = rest.partition(b"</dcterms:modified>")
                inside = head + tail if tail else inside
            new.writestr(zipfile.ZipInfo(info.filename, stamp), inside, zipfile.ZIP_DEFLATED)
    return written.getvalue()
