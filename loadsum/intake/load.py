"""Meter files of a study -> readings aligned to its demand interval, with the choices made for each file."""

import datetime as dt
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError
from loadsum.intake.align import Timed, aligned
from loadsum.intake.clock import NAT, local_calendar, read_stamps, zone
from loadsum.intake.findings import Finding
from loadsum.intake.inputs import InputFile, digest, matching, unpacked
from loadsum.intake.readers.delimited import RawReadings, read_delimited
from loadsum.intake.readings import Readings, TemperatureRecord
from loadsum.intake.vee import Held, validate
from loadsum.intake.weather import read_temperature
from loadsum.study.tables import MeterFiles, Study

POWER_KW = {"W": 1e-3, "kW": 1.0, "MW": 1e3}
ENERGY_KWH = {"Wh": 1e-3, "kWh": 1.0, "MWh": 1e3}
INTERVALS_MIN = (1, 5, 10, 15, 20, 30, 60)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Loaded:
    """Everything that intake hands on.

    Parameters
    ----------
    readings : Readings
        Aligned readings with all findings.
    inputs : tuple of InputFile
        Files that were read.
    temperature : TemperatureRecord or None
        Outdoor temperature on the metered days.
    record : TemperatureRecord or None
        Longer record over which the year is mixed; None where none was given.
    """

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
    place = zone(study.study.time_zone)
    interval_min = study.study.demand_interval_min
    faults: list[Fault] = []
    findings: list[Finding] = []
    inputs: list[InputFile] = []
    parts: list[Timed] = []
    rows_in = 0
    for n, source in enumerate(study.readings, start=1):
        try:
            paths = matching(folder, source.files, f"readings[{n}].files")
        except InputError as error:
            faults.extend(error.faults)
            continue
        for path in paths:
            try:
                rows, file = _one_file(path, folder, source, place, findings, parts)
            except InputError as error:
                faults.extend(error.faults)
                continue
            rows_in += rows
            inputs.append(file)
    temperature, record = _temperatures(study, folder, place, interval_min, inputs, faults)
    if faults:
        raise InputError("the study's files", faults)
    matrix, broken = aligned(parts, interval_min)
    if matrix is None:
        raise InputError("the study's files", broken)
    listed = {customer.id: customer for customer in study.customer}
    held = Held(
        customers=matrix.customers,
        kw=matrix.kw,
        estimated=matrix.estimated,
        start_utc=matrix.start_utc,
        interval_min=interval_min,
        may_export=frozenset(c.id for c in study.customer if c.export),
        service_kw={c.id: c.service_rating_kw for c in study.customer if c.service_rating_kw > 0.0},
    )
    multiplier = np.array([listed[name].multiplier if name in listed else 1.0 for name in matrix.customers])
    day, interval = local_calendar(matrix.start_utc, place, interval_min)
    readings = Readings(
        customers=matrix.customers,
        start_utc=matrix.start_utc,
        interval_min=interval_min,
        local_day=day,
        interval_of_day=interval,
        kw=matrix.kw * multiplier[:, None],
        kvar=matrix.kvar * multiplier[:, None] if np.isfinite(matrix.kvar).any() else None,
        estimated=matrix.estimated,
        resolution_kw=np.array([resolution(row) for row in matrix.kw * multiplier[:, None]]),
        findings=(*findings, *matrix.findings, *validate(held)),
        rows_in=rows_in,
    )
    return Loaded(readings=readings, inputs=tuple(inputs), temperature=temperature, record=record)


def _temperatures(
    study: Study, folder: Path, place: dt.tzinfo, interval_min: int, inputs: list[InputFile], faults: list[Fault]
) -> tuple[TemperatureRecord | None, TemperatureRecord | None]:
    found: list[TemperatureRecord | None] = []
    for key in ("file", "record_file"):
        name = getattr(study.weather, key)
        if not name:
            found.append(None)
            continue
        try:
            (path,) = matching(folder, name, f"weather.{key}")[:1]
            record, file = read_temperature(path, study.weather, place, interval_min)
        except InputError as error:
            faults.extend(error.faults)
            found.append(None)
            continue
        found.append(record)
        inputs.append(file)
    return found[0], found[1]


def _one_file(
    path: Path, folder: Path, source: MeterFiles, place: dt.tzinfo, findings: list[Finding], parts: list[Timed]
) -> tuple[int, InputFile]:
    rows, layout, choices = 0, "", []
    for name, content in unpacked(path):
        raw = read_delimited(content, name, source)
        layout = raw.layout
        choices = list(raw.choices)
        rows += raw.value.size
        parts.append(_timed(raw, source, place, findings, choices))
    sha256, size = digest(path)
    return rows, InputFile(
        name=str(path.relative_to(folder)) if path.is_relative_to(folder) else path.name,
        sha256=sha256,
        bytes=size,
        format=source.format,
        layout=layout,
        choices=tuple(choices),
    )


def _timed(
    raw: RawReadings, source: MeterFiles, place: dt.tzinfo, findings: list[Finding], choices: list[str]
) -> Timed:
    """Readings of one file as average power with their instants; what cannot be used goes to the findings."""
    stamps = read_stamps(pd.Series(raw.stamps, dtype=str), source.time_format, source.clock, place)
    if stamps.unread.all():
        example = raw.stamps[0] if raw.stamps else ""
        advice = 'state readings.time_format, for example "%d/%m/%Y %H:%M"'
        raise InputError(raw.name, [Fault(f"{raw.name}:{raw.line[0]}", f"{example!r} is no ISO 8601 stamp; {advice}")])
    start = stamps.first[raw.stamp]
    second = _occurrence(raw) & (stamps.second != stamps.first)[raw.stamp]
    start = np.where(second, stamps.second[raw.stamp], start)
    shown = "their own offset" if stamps.own_offset else f"{source.clock} clock"
    minutes = source.interval_min or _interval(raw, start)
    if minutes == 0:
        raise InputError(
            raw.name, [Fault(raw.name, "the interval of its readings cannot be told; state readings.interval_min")]
        )
    choices.append(f"stamps mark the {source.stamp} of {minutes} min intervals, on {shown}")
    choices.append(f"{source.quantity} in {source.unit}")
    if source.stamp == "end":
        start = np.where(start == NAT, NAT, start - minutes * 60)
    kw = _average_power(raw.value, source, minutes)
    if raw.exported is not None:
        kw = kw - np.nan_to_num(_average_power(raw.exported, source, minutes))
    kvar = _average_power(raw.kvar, source, minutes) if raw.kvar is not None else np.full(kw.size, np.nan)
    bad_lines = {line for line, _ in raw.unreadable}
    unreadable = np.isnan(raw.value) & np.isin(raw.line, np.array(sorted(bad_lines), dtype=np.int64))
    empty = np.isnan(raw.value) & ~unreadable
    skipped = stamps.skipped[raw.stamp] & ~np.isnan(raw.value)
    unread = stamps.unread[raw.stamp] & ~np.isnan(raw.value)
    for chosen, rule, what, effect in (
        (empty, "empty reading", "hold no value", "they count as missing"),
        (unreadable, "unreadable reading", "are no number", "they count as missing"),
        (unread, "unreadable stamp", "have a stamp that cannot be understood", "they are left out"),
        (
            skipped,
            "stamp in the skipped hour",
            "stand in the hour that local time skips: the file ignores the clock change",
            'they are left out; state clock = "standard" if the file never changes its clock',
        ),
    ):
        if chosen.any():
            where = int(np.flatnonzero(chosen)[0])
            findings.append(
                Finding(
                    rule=rule,
                    severity="excluded",
                    customer=_only(raw, chosen),
                    place=f"{raw.name}:{raw.line[where]}",
                    count=int(chosen.sum()),
                    excluded=int(chosen.sum()),
                    message=f"{int(chosen.sum())} reading(s) {what}",
                    effect=effect,
                )
            )
    keep = ~(empty | unreadable | skipped | unread)
    names = np.array(raw.customers, dtype=object)
    return Timed(
        customer=names[raw.customer][keep],
        start_s=start[keep],
        minutes=np.full(int(keep.sum()), minutes, dtype=np.int64),
        kw=kw[keep],
        kvar=kvar[keep],
        estimated=raw.flagged[keep],
        place=np.array([f"{raw.name}:{line}" for line in raw.line[keep].tolist()], dtype=object),
    )


def _only(raw: RawReadings, chosen: NDArray[np.bool_]) -> str:
    who = np.unique(raw.customer[chosen])
    return raw.customers[int(who[0])] if who.size == 1 else ""


def _occurrence(raw: RawReadings) -> NDArray[np.bool_]:
    """Readings whose customer and stamp stood in the file before."""
    key = raw.customer * max(len(raw.stamps), 1) + raw.stamp
    return pd.Series(key).duplicated().to_numpy()


def _interval(raw: RawReadings, start: NDArray[np.int64]) -> int:
    """Interval of a file's readings: the commonest step between stamps, where it is an ordinary one; else 0. [min]"""
    instants = np.unique(start[start != NAT])
    if instants.size < 2:
        return 0
    steps, count = np.unique(np.diff(instants), return_counts=True)
    common = int(steps[np.argmax(count)])
    return common // 60 if common % 60 == 0 and common // 60 in INTERVALS_MIN else 0


def _average_power(value: NDArray[np.float64], source: MeterFiles, minutes: int) -> NDArray[np.float64]:
    if source.quantity == "power":
        factor = POWER_KW.get(source.unit)
    else:
        factor = ENERGY_KWH[source.unit] * 60.0 / minutes if source.unit in ENERGY_KWH else None
    if factor is None:
        raise InputError("study file", [Fault("readings.unit", f"{source.unit} is no unit of {source.quantity}")])
    return np.asarray(value * factor * source.multiplier, dtype=np.float64)


def resolution(kw: NDArray[np.float64]) -> float:
    """Meter resolution told from the readings: the coarsest step of 1, 2 or 5 that every one is a multiple of. [kW]

    0 where the readings are finer than a millionth of a kilowatt.
    """
    known = kw[np.isfinite(kw)]
    known = known[known != 0.0]
    if known.size == 0:
        return 0.0
    for exponent in range(0, -7, -1):
        for digit in (5, 2, 1):
            step = digit * 10.0**exponent
            ratio = known / step
            if np.all(np.abs(ratio - np.rint(ratio)) < 1e-6 * np.maximum(1.0, np.abs(ratio) * 1e-6)):
                return step
    return 0.0
