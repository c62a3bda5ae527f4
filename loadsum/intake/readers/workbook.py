"""The first sheet of an .xlsx workbook as a table of text."""

import datetime as dt
import importlib
import importlib.util
import io
import zipfile

import pandas as pd

from loadsum.errors import Fault, InputError, MissingExtraError

LARGEST_BYTES = 2**30  # of the sheets once unpacked
MOST_COLUMNS = 20_000


def read_workbook(content: bytes, name: str, said: list[str]) -> pd.DataFrame:
    """Cells of the first sheet as text, its first row as header.

    Raises
    ------
    MissingExtraError
        openpyxl is not installed.
    InputError
        The file is no workbook, or unpacks to more than is believable.
    """
    if importlib.util.find_spec("openpyxl") is None:
        raise MissingExtraError(f"reading the workbook {name}", "xlsx")
    openpyxl = importlib.import_module("openpyxl")
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as packed:
            if sum(info.file_size for info in packed.infolist()) > LARGEST_BYTES:
                raise InputError(name, [Fault(name, "unpacks to more than 1 GiB; not read")])
        book = openpyxl.load_workbook(io.BytesIO(content), read_only=True, data_only=True)
    except (zipfile.BadZipFile, KeyError, ValueError, OSError, SyntaxError) as error:
        raise InputError(name, [Fault(name, f"is no .xlsx workbook: {str(error)[:80]}")]) from error
    sheet = book.worksheets[0]
    rows = [[_text(cell) for cell in row[:MOST_COLUMNS]] for row in sheet.iter_rows(values_only=True)]
    book.close()
    if len(rows) < 2:
        raise InputError(name, [Fault(name, f"sheet {sheet.title!r} holds no table of readings")])
    said.append(
        f"sheet {sheet.title!r}" + (f", the first of {len(book.sheetnames)}" if len(book.sheetnames) > 1 else "")
    )
    frame = pd.DataFrame(rows[1:], columns=[text.strip() for text in rows[0]], dtype=str).fillna("")
    if frame.columns.duplicated().any():
        twice = frame.columns[frame.columns.duplicated()][0]
        raise InputError(name, [Fault(f"{name}:1", f"two columns are called {twice!r}")])
    return frame


def _text(cell: object) -> str:
    if cell is None:
        return ""
    if isinstance(cell, dt.datetime):
        # A cell keeps days as a fraction, so the nearest second is meant.
        return (cell + dt.timedelta(milliseconds=500)).replace(microsecond=0).isoformat()
    if isinstance(cell, dt.time):
        return cell.isoformat(timespec="minutes")
    if isinstance(cell, float) and cell.is_integer() and abs(cell) < 2**53:
        return str(int(cell))
    return repr(cell) if isinstance(cell, float) else str(cell)
