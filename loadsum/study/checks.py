"""What must hold between the keys of a study file, and between the study file and the files it names."""

import dataclasses
import datetime as dt
import re
import zoneinfo
from collections.abc import Iterator
from pathlib import Path

from loadsum.errors import Fault
from loadsum.study.futurechecks import check_load_to_come
from loadsum.study.tables import Customer, Study
from loadsum.study.thermalchecks import check_transformers
from loadsum.study.unittables import Transformer
from loadsum.study.values import shown

OFFSET = re.compile(r"[+-](0\d|1[0-4]):[0-5]\d")


def check_study(study: Study) -> list[Fault]:
    """Faults between keys; empty when the study file is consistent."""
    return [
        *_heading(study),
        *_clocks(study),
        *_stamps(study),
        *_seasons(study),
        *_days(study),
        *_customers(study),
        *_transformers(study),
        *_loading(study),
        *check_load_to_come(study),
        *check_transformers(study),
    ]


def check_files(study: Study, folder: Path) -> list[Fault]:
    """Faults of the file names in a study file that lies in a folder."""
    faults = []
    for n, source in enumerate(study.readings, start=1):
        where = f"{_place('readings', n, len(study.readings))}.files"
        if not source.files.strip():
            faults.append(Fault(where, "is empty; name the meter file, relative to the study file"))
        elif not (folder / source.files).exists() and not _matches(folder, source.files):
            faults.append(Fault(where, f"no file matches {shown(source.files)} from the folder of the study file"))
    for n, row in enumerate(study.addition, start=1):
        if row.profile and not (folder / row.profile).is_file():
            place = _place("addition", n, len(study.addition))
            faults.append(Fault(f"{place}.profile", f"no file {shown(row.profile)} beside the study file"))
    for name in ("file", "record_file"):
        file = getattr(study.weather, name)
        if file and not (folder / file).is_file():
            faults.append(Fault(f"weather.{name}", f"no file {shown(file)} beside the study file"))
    return faults


def _matches(folder: Path, pattern: str) -> bool:
    base = folder if not Path(pattern).is_absolute() else Path(Path(pattern).anchor)
    return any(base.glob(str(Path(pattern).relative_to(base)) if Path(pattern).is_absolute() else pattern))


def _place(table: str, n: int, of: int) -> str:
    """Dotted place of the n-th of several like tables, without a number where there is only one."""
    return table if of == 1 else f"{table}[{n}]"


def _heading(study: Study) -> Iterator[Fault]:
    zone = study.study.time_zone
    if not OFFSET.fullmatch(zone) and zone not in zoneinfo.available_timezones():
        yield Fault(
            "study.time_zone",
            f'{shown(zone)} is no IANA time zone such as "Europe/Oslo" and no fixed offset such as "+10:00"',
        )
    if study.study.date and not _is_date(study.study.date):
        yield Fault("study.date", f"must be an ISO 8601 date such as 2031-05-04, got {shown(study.study.date)}")


def _clocks(study: Study) -> Iterator[Fault]:
    clocks = [
        (f"{_place('readings', n, len(study.readings))}.clock", r.clock) for n, r in enumerate(study.readings, start=1)
    ]
    for where, clock in [*clocks, ("weather.clock", study.weather.clock)]:
        if clock not in ("local", "utc", "standard") and not OFFSET.fullmatch(clock):
            yield Fault(where, f'must be local, utc, standard or an offset such as "+10:00"; got {shown(clock)}')


def _stamps(study: Study) -> Iterator[Fault]:
    for n, source in enumerate(study.readings, start=1):
        where = _place("readings", n, len(study.readings))
        if not source.first_stamp:
            continue
        if source.interval_min == 0:
            yield Fault(f"{where}.interval_min", "missing; a file without stamps needs it")
        if source.time_column:
            yield Fault(f"{where}.first_stamp", "stands beside time_column; keep one of the two")
        try:
            dt.datetime.fromisoformat(source.first_stamp)
        except ValueError:
            yield Fault(
                f"{where}.first_stamp",
                f"must be an ISO 8601 stamp such as 2031-05-04T00:00, got {shown(source.first_stamp)}",
            )


def _seasons(study: Study) -> Iterator[Fault]:
    owner: dict[int, str] = {}
    seen: set[str] = set()
    several = len(study.season)
    for n, season in enumerate(study.season, start=1):
        where = _place("season", n, several)
        if season.name in seen:
            yield Fault(f"{where}.name", f"two seasons are called {shown(season.name)}")
        seen.add(season.name)
        for month in season.months:
            if month in owner:
                yield Fault(f"{where}.months", f"month {month} is already in season {shown(owner[month])}")
            owner.setdefault(month, season.name)
    if study.season and (missing := sorted(set(range(1, 13)) - set(owner))):
        yield Fault("season", f"months in no season: {', '.join(map(str, missing))}")
    known = ", ".join(["all", *(season.name for season in study.season)])
    for field in dataclasses.fields(study):
        rows = getattr(study, field.name)
        if not isinstance(rows, tuple):
            continue
        for n, row in enumerate(rows, start=1):
            named = getattr(row, "season", "all")
            if named not in seen and named != "all":
                yield Fault(
                    f"{_place(field.name, n, len(rows))}.season",
                    f"no season is called {shown(named)}; known: {known}",
                )


def _days(study: Study) -> Iterator[Fault]:
    for n, text in enumerate(study.day_types.holidays, start=1):
        if not _is_date(text):
            yield Fault(f"day_types.holidays[{n}]", f"must be an ISO 8601 date such as 2031-05-04, got {shown(text)}")
    country, part = study.day_types.holidays_country, study.day_types.holidays_subdivision
    if country:
        import holidays

        known = holidays.list_supported_countries()
        if country not in known:
            yield Fault(
                "day_types.holidays_country",
                f"no holidays are known for {shown(country)}; give the ISO 3166 code of the country,"
                " or list the days under day_types.holidays",
            )
        elif part and part not in known[country]:
            yield Fault("day_types.holidays_subdivision", f"{country} has no subdivision {shown(part)}")
    elif part:
        yield Fault("day_types.holidays_country", "missing; a subdivision is given without its country")


def _customers(study: Study) -> Iterator[Fault]:
    units = {unit.id for unit in study.transformer if unit.id}
    seen: set[str] = set()
    for n, customer in enumerate(study.customer, start=1):
        where = f"customer[{n}]"
        if customer.id in seen:
            yield Fault(f"{where}.id", f"customer {shown(customer.id)} is listed twice")
        seen.add(customer.id)
        # A study of one transformer may use the customer table of its feeder: the others lend to their class.
        elsewhere = len(study.transformer) == 1 and bool(units)
        if customer.transformer and customer.transformer not in units and not elsewhere:
            known = ", ".join(sorted(units)) or "none has an id"
            yield Fault(
                f"{where}.transformer", f"no transformer has the id {shown(customer.transformer)}; known: {known}"
            )
        if len(customer.monthly_kwh) not in (0, 12):
            yield Fault(f"{where}.monthly_kwh", f"must hold 12 months, got {len(customer.monthly_kwh)}")
        elif customer.monthly_kwh and customer.annual_kwh:
            yield Fault(f"{where}.annual_kwh", "stands beside monthly_kwh; keep one of the two")
        if customer.count > 1 and customer.role != "planned":
            yield Fault(f"{where}.count", f"stands for {customer.count} customers, but only planned customers may")


def billed_kwh(customer: Customer) -> float:
    """Energy per year that a customer is billed for; 0 where unknown. [kWh]"""
    return sum(customer.monthly_kwh) or customer.annual_kwh


def _transformers(study: Study) -> Iterator[Fault]:
    several = len(study.transformer)
    metered_kvar = any(source.kvar_column for source in study.readings)
    seen: set[str] = set()
    for n, unit in enumerate(study.transformer, start=1):
        where = _place("transformer", n, several)
        if several > 1 and not unit.id:
            yield Fault(f"{where}.id", "missing; each of several transformers needs its asset number")
        elif unit.id and unit.id in seen:
            yield Fault(f"{where}.id", f"two transformers have the id {shown(unit.id)}")
        seen.add(unit.id)
        yield from _ratings(unit, where)
        if unit.power_factor == 0.0 and not metered_kvar:
            yield Fault(
                f"{where}.power_factor",
                "missing; state the power factor of the group, above 0, or name the kvar_column of the readings",
            )
        if unit.unmetered_hours and unit.unmetered_kw == 0.0:
            yield Fault(f"{where}.unmetered_kw", "missing; its hours are given")
        keys = {field.name for field in dataclasses.fields(unit)}
        for m, text in enumerate(unit.sources, start=1):
            if text.split(":")[0].strip() not in keys or ":" not in text:
                yield Fault(
                    f"{where}.sources[{m}]",
                    f'must begin with a key of this table and a colon, such as "impedance_pct: nameplate, read'
                    f' 2031-02-03"; got {shown(text)}',
                )


def _ratings(unit: Transformer, where: str) -> Iterator[Fault]:
    ratings = unit.ratings_kva
    if not ratings and not unit.series and not unit.installed_kva:
        yield Fault(
            f"{where}.ratings_kva", "missing; list the ratings to compare, or name a series, or the installed_kva"
        )
    if ratings and unit.series:
        yield Fault(f"{where}.series", "stands beside ratings_kva; keep one of the two")
    for m in range(1, len(ratings)):
        if ratings[m] == ratings[m - 1]:
            yield Fault(f"{where}.ratings_kva[{m + 1}]", f"{ratings[m]:g} is listed twice")
        elif ratings[m] < ratings[m - 1]:
            yield Fault(
                f"{where}.ratings_kva[{m + 1}]", f"{ratings[m]:g} follows {ratings[m - 1]:g}; list them in order"
            )


def _loading(study: Study) -> Iterator[Fault]:
    several = len(study.allowed_loading)
    seen: set[str] = set()
    for n, row in enumerate(study.allowed_loading, start=1):
        where = _place("allowed_loading", n, several)
        if row.season in seen:
            yield Fault(f"{where}.season", f"allowed loading for {shown(row.season)} is given twice")
        seen.add(row.season)
        if 0.0 < row.emergency_pu < row.normal_pu:
            yield Fault(
                f"{where}.emergency_pu",
                f"must be at least the normal {row.normal_pu:g}, got {row.emergency_pu:g}",
            )


def _is_date(text: str) -> bool:
    try:
        dt.date.fromisoformat(text)
    except ValueError:
        return False
    return True
