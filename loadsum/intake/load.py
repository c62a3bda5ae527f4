"""Meter files of a study -> readings aligned to its demand interval, with the choices made for each file."""

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError
from loadsum.intake.align import Matrix, aligned
from loadsum.intake.clock import grid_phase_s, local_calendar, zone
from loadsum.intake.findings import Finding
from loadsum.intake.grouprules import judged
from loadsum.intake.hourclass import calendar
from loadsum.intake.inputs import InputFile, digest, matching
from loadsum.intake.profile import read_profiles
from loadsum.intake.readers.formats import read_file
from loadsum.intake.readings import Readings, TemperatureRecord
from loadsum.intake.reconcile import Clock, Reconciliation, groups_of, observed, reconciled
from loadsum.intake.resolution import resolution
from loadsum.intake.timed import Timed
from loadsum.intake.vee import Held
from loadsum.intake.weather import read_temperature
from loadsum.study.tables import MeterFiles, Study


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
    reconciliation : tuple of Reconciliation
        Sum of the customers against each meter of a group; empty where none was given or too little is metered.
    profiles : mapping of str to (D, I) float64
        Demand of one device by the name of its profile file. [kW]
    """

    readings: Readings
    inputs: tuple[InputFile, ...]
    temperature: TemperatureRecord | None
    record: TemperatureRecord | None
    reconciliation: tuple[Reconciliation, ...] = ()
    profiles: Mapping[str, NDArray[np.float64]] = field(default_factory=dict)


def load_readings(study: Study, folder: Path) -> Loaded:
    """Readings of a study whose files lie in a folder.

    Raises
    ------
    InputError
        Faults of the files, all at once.
    MissingExtraError
        A format needs an optional package.
    """
    place = zone(study.study.time_zone)
    interval_min = study.study.demand_interval_min
    faults: list[Fault] = []
    findings: list[Finding] = []
    inputs: list[InputFile] = []
    parts: dict[str, list[Timed]] = {"customers": [], "group": []}
    rows_in = 0
    for n, source in enumerate(study.readings, start=1):
        try:
            paths = matching(folder, source.files, f"readings[{n}].files")
        except InputError as error:
            faults.extend(error.faults)
            continue
        for path in paths:
            try:
                rows, file = _one_file(path, folder, source, place, findings, parts[source.meters])
            except InputError as error:
                faults.extend(error.faults)
                continue
            rows_in += rows
            inputs.append(file)
    temperature, record = _temperatures(study, folder, place, interval_min, inputs, faults)
    profiles: Mapping[str, NDArray[np.float64]] = {}
    try:
        profiles, described = read_profiles(study, folder)
        inputs.extend(described)
    except InputError as error:
        faults.extend(error.faults)
    if faults:
        raise InputError("the study's files", faults)
    phase_s = grid_phase_s(place, interval_min)
    matrix = _matrix(parts["customers"], interval_min, phase_s)
    head = _matrix(parts["group"], interval_min, phase_s) if parts["group"] else None
    parts.clear()
    listed = {customer.id: customer for customer in study.customer}
    multiplier = np.array([listed[name].multiplier if name in listed else 1.0 for name in matrix.customers])
    kw, kvar = matrix.kw, matrix.kvar
    if (multiplier != 1.0).any():
        kw = kw * multiplier[:, None]
        kvar = None if kvar is None else kvar * multiplier[:, None]
    day, interval = local_calendar(matrix.start_utc, place, interval_min)
    held = Held(
        customers=matrix.customers,
        kw=kw,
        estimated=matrix.estimated,
        start_utc=matrix.start_utc,
        local_day=day,
        interval_of_day=interval,
        interval_min=interval_min,
        may_export=frozenset(c.id for c in study.customer if c.export),
        service_kw={c.id: c.service_rating_kw for c in study.customer if c.service_rating_kw > 0.0},
        limits=study.findings,
    )
    kw, doubts = judged(held, matrix.readings_behind)
    comparison: tuple[Reconciliation, ...] = ()
    compared: tuple[Finding, ...] = ()
    if head is not None:
        comparison, compared = reconciled(
            observed(matrix.customers, matrix.start_utc, kw, matrix.estimated),
            observed(head.customers, head.start_utc, head.kw, head.estimated),
            groups_of(study, matrix.customers, head.customers),
            _clock(study, day, interval),
        )
    readings = Readings(
        customers=matrix.customers,
        start_utc=matrix.start_utc,
        interval_min=interval_min,
        local_day=day,
        interval_of_day=interval,
        kw=kw,
        kvar=None if kvar is None else np.where(np.isfinite(kw), kvar, np.nan),
        estimated=matrix.estimated,
        resolution_kw=np.array([resolution(row) for row in kw]),
        findings=(*findings, *matrix.findings, *(head.findings if head else ()), *doubts, *compared),
        rows_in=rows_in,
    )
    return Loaded(
        readings=readings,
        inputs=tuple(inputs),
        temperature=temperature,
        record=record,
        reconciliation=comparison,
        profiles=profiles,
    )


def inspect_findings(study: Study, folder: Path) -> Loaded:
    """What intake has to say about the files of a study; the same reading as that of the study itself."""
    return load_readings(study, folder)


def _clock(study: Study, day: NDArray[np.int64], interval: NDArray[np.int64]) -> Clock:
    """Season, day type and interval of the day of each interval."""
    distinct, where = np.unique(day, return_inverse=True)
    years = sorted({int(year) + 1970 for year in distinct.astype("datetime64[D]").astype("datetime64[Y]").astype(int)})
    days = calendar(study.season, study.day_types, years)
    kinds = len(days.day_types)
    numbers = np.array([season * kinds + kind for season, kind in (days.place(d) for d in distinct.tolist())])
    return Clock(
        interval_min=study.study.demand_interval_min,
        interval_of_day=interval,
        day_class=numbers[where],
        names=tuple((season, kind) for season in days.season_names for kind in days.day_types),
    )


def _matrix(parts: list[Timed], interval_min: int, phase_s: int) -> Matrix:
    matrix, broken = (
        aligned(parts, interval_min, phase_s) if parts else (None, [Fault("readings", "no meter of a customer")])
    )
    if matrix is None:
        raise InputError("the study's files", broken)
    return matrix


def _one_file(
    path: Path, folder: Path, source: MeterFiles, place: dt.tzinfo, findings: list[Finding], parts: list[Timed]
) -> tuple[int, InputFile]:
    rows, layout, choices = 0, "", []
    for read in read_file(path, source, place, findings):
        layout, choices = read.layout, read.choices
        rows += read.rows
        parts.append(read.timed)
    sha256, size = digest(path)
    return rows, InputFile(
        name=str(path.relative_to(folder)) if path.is_relative_to(folder) else path.name,
        sha256=sha256,
        bytes=size,
        format=source.format,
        layout=layout,
        choices=tuple(choices),
    )


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
