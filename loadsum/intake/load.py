"""Meter files of a study -> readings aligned to its demand interval, with the choices made for each file."""

import datetime as dt
import glob
import gzip
import hashlib
import io
import re
import zipfile
import zoneinfo
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd

from loadsum.errors import Fault, InputError
from loadsum.intake.findings import Finding
from loadsum.intake.readings import Readings, TemperatureRecord
from loadsum.study.tables import MeterFiles, Study

UNIT_KW = {"Wh": 1e-3, "kWh": 1.0, "MWh": 1e3, "W": 1e-3, "kW": 1.0, "MW": 1e3}


@dataclass(frozen=True, slots=True, kw_only=True)
class InputFile:
    """One input and how it was read.

    Parameters
    ----------
    name : str
        Path relative to the study file.
    sha256 : str
        Digest of its bytes.
    bytes : int
        Size. [byte]
    format, layout : str
        What it was read as.
    choices : tuple of str
        The choices made in reading it, in words.
    """

    name: str
    sha256: str
    bytes: int
    format: str
    layout: str
    choices: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Loaded:
    """Everything that intake hands on."""

    readings: Readings
    inputs: tuple[InputFile, ...]
    temperature: TemperatureRecord | None
    record: TemperatureRecord | None


def load_readings(study: Study, folder: Path) -> Loaded:
    """Readings of a study whose files lie in a folder.

    Raises
    ------
    InputError
        Faults of the files, all at once.
    """
    frames, inputs, faults = [], [], []
    for n, source in enumerate(study.readings, start=1):
        paths = sorted(Path(p) for p in glob.glob(str(folder / source.files)))
        if not paths:
            faults.append(Fault(f"readings[{n}].files", f"no file matches {source.files!r}"))
        for path in paths:
            content = path.read_bytes()
            frame, layout = _table(source, path, content)
            frames.append(_long(source, frame, layout, study, path.stem))
            inputs.append(
                InputFile(
                    name=str(path.relative_to(folder)),
                    sha256=hashlib.sha256(content).hexdigest(),
                    bytes=len(content),
                    format=source.format,
                    layout=layout,
                    choices=(f"stamps mark the {source.stamp}", f"clock: {source.clock}"),
                )
            )
    if faults:
        raise InputError("study", faults)
    return Loaded(readings=_aligned(pd.concat(frames), study), inputs=tuple(inputs), temperature=None, record=None)


def _table(source: MeterFiles, path: Path, content: bytes) -> tuple[pd.DataFrame, str]:
    if path.suffix == ".gz":
        content = gzip.decompress(content)
    elif path.suffix == ".zip":
        archive = zipfile.ZipFile(io.BytesIO(content))
        content = archive.read(archive.namelist()[0])
    frame = pd.read_csv(
        io.BytesIO(content), dtype=str, sep=source.delimiter or None, engine="python" if not source.delimiter else "c"
    )
    layout = source.layout or ("one row a reading" if len(frame.columns) in (3, 4) else "one column a customer")
    return frame, layout


def _long(source: MeterFiles, frame: pd.DataFrame, layout: str, study: Study, stem: str) -> pd.DataFrame:
    columns = list(frame.columns)
    time = source.time_column or next((c for c in columns if re.search(r"time|date|stamp", c, re.I)), columns[0])
    if layout == "one row a reading":
        who = source.customer_column or next(
            (c for c in columns if re.search(r"customer|meter|id", c, re.I)), columns[0]
        )
        value = source.value_column or next(c for c in columns if c not in (time, who))
        long = pd.DataFrame({"customer": frame[who], "time": frame[time], "value": frame[value]})
    else:
        rest = [c for c in columns if c != time]
        long = pd.concat([pd.DataFrame({"customer": c, "time": frame[time], "value": frame[c]}) for c in rest])
    stamps = pd.to_datetime(pd.Series(long["time"].unique()), format=source.time_format or "ISO8601")
    zone = study.study.time_zone
    offset = re.fullmatch(r"([+-])(\d\d):(\d\d)", zone)
    if offset:
        minutes = int(offset[2]) * 60 + int(offset[3])
        tz: dt.tzinfo = dt.timezone(dt.timedelta(minutes=minutes if offset[1] == "+" else -minutes))
    else:
        tz = zoneinfo.ZoneInfo(zone)
    utc = stamps.dt.tz_localize(tz, ambiguous="NaT", nonexistent="NaT").dt.tz_convert("UTC")
    seconds = dict(
        zip(
            long["time"].unique(),
            (utc.astype("int64") // 10**9).to_numpy()
            if utc.dt.unit == "ns"
            else utc.dt.as_unit("s").astype("int64").to_numpy(),
            strict=True,
        )
    )
    known = dict(zip(long["time"].unique(), utc.notna().to_numpy(), strict=True))
    long = long[long["time"].map(known)]
    numbers = pd.to_numeric(long["value"], errors="coerce")
    return pd.DataFrame(
        {
            "customer": long["customer"],
            "start": long["time"].map(seconds).astype("int64"),
            "kw": numbers * UNIT_KW[source.unit] * source.multiplier,
            "energy": source.quantity == "energy",
        }
    )


def _aligned(frame: pd.DataFrame, study: Study) -> Readings:
    minutes = study.study.demand_interval_min
    names = tuple(sorted(frame["customer"].unique()))
    rows_in = len(frame)
    twice = frame.duplicated(["customer", "start"])
    findings = []
    if twice.any():
        findings.append(
            Finding(
                rule="duplicate",
                severity="excluded",
                count=int(twice.sum()),
                excluded=int(twice.sum()),
                message="second reading for the same interval",
            )
        )
        frame = frame[~twice]
    step = minutes * 60
    first, last = int(frame["start"].min()) // step * step, int(frame["start"].max())
    start = np.arange(first, last + 1, step, dtype=np.int64)
    native = int(np.median(np.diff(np.unique(frame["start"].to_numpy()))))
    hours = native / 3600.0
    total = np.zeros((len(names), start.size))
    count = np.zeros_like(total)
    who = frame["customer"].map({name: n for n, name in enumerate(names)}).to_numpy()
    slot = (frame["start"].to_numpy() - first) // step
    kw = frame["kw"].to_numpy() / np.where(frame["energy"].to_numpy(), hours, 1.0)
    np.add.at(total, (who, slot), kw)
    np.add.at(count, (who, slot), 1.0)
    whole = count >= step // native
    aligned = np.where(whole, total / np.maximum(count, 1.0), np.nan)
    zone = study.study.time_zone
    tz: dt.tzinfo | str = zone if "/" in zone else dt.timezone(dt.timedelta(hours=int(zone[:3])))
    local = pd.to_datetime(start, unit="s", utc=True).tz_convert(tz).tz_localize(None)
    local_s = local.as_unit("s").astype("int64").to_numpy()
    return Readings(
        customers=names,
        start_utc=start,
        interval_min=minutes,
        local_day=local_s // 86400,
        interval_of_day=(local_s % 86400) // step,
        kw=aligned,
        kvar=None,
        estimated=np.zeros(aligned.shape, dtype=bool),
        resolution_kw=np.zeros(len(names)),
        findings=tuple(findings),
        rows_in=rows_in,
    )
