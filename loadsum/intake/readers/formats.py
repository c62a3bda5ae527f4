"""One meter file, whatever its format."""

import datetime as dt
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from loadsum.intake.findings import Finding
from loadsum.intake.inputs import unpacked
from loadsum.intake.instants import timed_readings
from loadsum.intake.readers.channels import read_nem12
from loadsum.intake.readers.delimited import read_delimited, read_table
from loadsum.intake.readers.parquet import read_parquet
from loadsum.intake.readers.usage import read_espi
from loadsum.intake.readers.workbook import read_workbook
from loadsum.intake.timed import Timed
from loadsum.study.tables import MeterFiles


@dataclass(frozen=True, slots=True, kw_only=True)
class FileReadings:
    """Readings of one file, or of one file inside an archive.

    Parameters
    ----------
    timed : Timed
        Readings that can be used.
    rows : int
        Readings in the file, used or standing in a finding. [-]
    layout : str
        Layout they were read as.
    choices : list of str
        The choices made, in words.
    """

    timed: Timed
    rows: int
    layout: str
    choices: list[str]


def read_file(path: Path, source: MeterFiles, place: dt.tzinfo, findings: list[Finding]) -> Iterator[FileReadings]:
    """Readings of one meter file.

    Raises
    ------
    InputError
        The file is at fault.
    MissingExtraError
        The format needs an optional package.
    """
    if source.format == "parquet":
        for raw in read_parquet(path, path.name, source):
            said = list(raw.choices)
            timed = timed_readings(raw, source, place, findings, said)
            yield FileReadings(timed=timed, rows=int(raw.value.size), layout=raw.layout, choices=said)
        return
    for name, content in unpacked(path):
        choices: list[str] = []
        if source.format in ("nem12", "espi"):
            if source.format == "nem12":
                timed, rows = read_nem12(content, name, findings, choices)
            else:
                timed, rows = read_espi(content, name, source, findings, choices)
            yield FileReadings(timed=timed, rows=rows, layout="records", choices=choices)
            continue
        if source.format == "workbook":
            frame = read_workbook(content, name, choices)
            raw = read_table(frame, name, source, choices)
        else:
            raw = read_delimited(content, name, source)
        del content
        choices = list(raw.choices)
        timed, rows, layout = timed_readings(raw, source, place, findings, choices), int(raw.value.size), raw.layout
        del raw  # so that the text's codes are gone before the next file
        yield FileReadings(timed=timed, rows=rows, layout=layout, choices=choices)
