"""The customer table: rows of [[customer]] kept as delimited text or as a workbook beside the study file."""

import csv
import dataclasses
import difflib
import io
import typing
from pathlib import Path
from typing import Any

from loadsum.errors import Fault, MissingExtraError
from loadsum.study.keys import KeyInfo
from loadsum.study.tables import Customer, Study
from loadsum.study.values import shown, value_faults

LIST_SIGN = ";"  # parts one cell from the next within a cell of a comma-separated table
YES, NO = ("yes", "true", "1"), ("no", "false", "0")


def with_customer_table(study: Study, folder: Path) -> tuple[Study, list[Fault]]:
    """The study with the rows of its customer table added to the customers of the study file, and the table's faults.

    Parameters
    ----------
    study : Study
        Study as the TOML file describes it.
    folder : Path
        Folder of the study file.

    Raises
    ------
    MissingExtraError
        The table is a workbook and the package that reads it is not installed.
    """
    if not study.customers.table:
        return study, []
    path = folder / study.customers.table
    if not path.is_file():
        return study, [Fault("customers.table", f"no file {shown(study.customers.table)} beside the study file")]
    try:
        rows = _workbook(path) if path.suffix.lower() == ".xlsx" else _text(path)
    except UnicodeDecodeError as error:
        return study, [Fault(path.name, f"is not UTF-8 text: {error.reason} at byte {error.start}")]
    customers, faults = customers_of(rows, path.name)
    return dataclasses.replace(study, customer=study.customer + customers), faults


def customers_of(rows: list[tuple[int, list[str]]], source: str) -> tuple[tuple[Customer, ...], list[Fault]]:
    """Customers of the numbered rows of a table whose first row names the columns, and the faults found."""
    if not rows:
        return (), [Fault(source, "is empty; its first row must name the columns")]
    fields = {field.name: field for field in dataclasses.fields(Customer)}
    hints = typing.get_type_hints(Customer)
    header = ["_".join(name.lower().split()) for name in rows[0][1]]
    faults = []
    for name in header:
        if name not in fields:
            near = difflib.get_close_matches(name, fields, n=1, cutoff=0.6)
            advice = f"did you mean {near[0]}?" if near else f"known: {', '.join(fields)}"
            faults.append(Fault(f"{source}:{rows[0][0]}", f"unknown column {shown(name)}; {advice}"))
    if "id" not in header:
        faults.append(Fault(f"{source}:{rows[0][0]}", "has no column id, the identifier of the customer"))
    customers = []
    for line, row in rows[1:]:
        if len(row) > len(header):
            faults.append(Fault(f"{source}:{line}", f"has {len(row)} cells under {len(header)} columns"))
        values: dict[str, Any] = {}
        found: list[Fault] = []
        for name, cell in zip(header, row, strict=False):
            if name not in fields or not cell.strip():
                continue
            info: KeyInfo = fields[name].metadata["key"]
            values[name] = _cell(hints[name], cell.strip(), f"{source}:{line} {name}", info, found)
        if "id" not in values and "id" in header:
            found.append(Fault(f"{source}:{line} id", "missing; identifier as in the meter files"))
        faults.extend(found)
        if not found and "id" in values:
            customers.append(Customer(**values))
    return tuple(customers), faults


def _cell(kind: Any, text: str, where: str, info: KeyInfo, faults: list[Fault]) -> Any:
    """The value of one cell."""
    if typing.get_origin(kind) is tuple:
        member = typing.get_args(kind)[0]
        parts = [part.strip() for part in text.split(LIST_SIGN) if part.strip()]
        return tuple(_cell(member, part, where, info, faults) for part in parts)
    if kind is bool:
        if text.lower() not in YES + NO:
            faults.append(Fault(where, f"must be yes or no, got {shown(text)}"))
        return text.lower() in YES
    value: Any = text
    if kind in (int, float):
        try:
            value = kind(text)
        except ValueError:
            what = "a whole number" if kind is int else "a number"
            faults.append(Fault(where, f"must be {what}, got {shown(text)}"))
            return kind()
    faults.extend(value_faults(value, where, info))
    return value


def _text(path: Path) -> list[tuple[int, list[str]]]:
    """Rows of delimited text that are not blank, with their line numbers; lines led by # are remarks."""
    content = path.read_text(encoding="utf-8-sig")
    lines = [line for line in content.splitlines() if line.strip() and not line.startswith("#")]
    delimiter = max(",;\t", key=(lines[0] if lines else "").count)
    reader = csv.reader(io.StringIO(content), delimiter=delimiter)
    return [
        (reader.line_num, [_decimal(cell, delimiter) for cell in row])
        for row in reader
        if any(cell.strip() for cell in row) and not row[0].startswith("#")
    ]


def _decimal(cell: str, delimiter: str) -> str:
    """A cell of a table whose delimiter is no comma may hold a decimal comma."""
    if delimiter == "," or cell.count(",") != 1 or not cell.replace(",", "").strip().lstrip("-").isdigit():
        return cell
    return cell.replace(",", ".")


def _workbook(path: Path) -> list[tuple[int, list[str]]]:
    """Rows of the first sheet of a workbook that are not blank, with their numbers."""
    try:
        import openpyxl
    except ImportError as error:
        raise MissingExtraError(f"reading {path.name}", "xlsx") from error
    book = openpyxl.load_workbook(path, read_only=True, data_only=True)
    rows = []
    for line, row in enumerate(book.worksheets[0].iter_rows(values_only=True), start=1):
        cells = ["" if cell is None else _plain(cell) for cell in row]
        if any(cells) and not cells[0].startswith("#"):
            rows.append((line, cells))
    book.close()
    return rows


def _plain(cell: object) -> str:
    """Text of a cell; a whole number that the workbook keeps as a fraction loses its point."""
    return str(int(cell)) if isinstance(cell, float) and cell.is_integer() else str(cell)
