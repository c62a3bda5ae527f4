"""What must hold between the keys of a study file."""

import datetime as dt
import itertools
import re
import zoneinfo
from collections.abc import Iterator

from loadsum.errors import Fault
from loadsum.study.tables import Study


def check_study(study: Study) -> list[Fault]:
    """Faults between keys; empty when the study file is consistent."""
    return [*_heading(study), *_seasons(study), *_days(study), *_customers(study), *_transformers(study)]


def _heading(study: Study) -> Iterator[Fault]:
    zone = study.study.time_zone
    if not re.fullmatch(r"[+-]\d\d:\d\d", zone) and zone not in zoneinfo.available_timezones():
        yield Fault("study.time_zone", f'{zone!r} is no IANA time zone and no fixed offset such as "+10:00"')
    if study.study.date and not _is_date(study.study.date):
        yield Fault("study.date", f"must be an ISO 8601 date such as 2031-05-04, got {study.study.date!r}")


def _seasons(study: Study) -> Iterator[Fault]:
    owner: dict[int, str] = {}
    for n, season in enumerate(study.season, start=1):
        for month in season.months:
            if owner.setdefault(month, season.name) != season.name:
                yield Fault(f"season[{n}].months", f"month {month} is already in season {owner[month]!r}")
    if study.season and (missing := sorted(set(range(1, 13)) - set(owner))):
        yield Fault("season", f"months without a season: {', '.join(map(str, missing))}")
    names = {season.name for season in study.season} | {"all"}
    for table in ("allowed_loading", "criterion"):
        for n, row in enumerate(getattr(study, table), start=1):
            if row.season not in names:
                yield Fault(
                    f"{table}[{n}].season", f"no season is called {row.season!r}; known: {', '.join(sorted(names))}"
                )


def _days(study: Study) -> Iterator[Fault]:
    for n, text in enumerate(study.day_types.holidays, start=1):
        if not _is_date(text):
            yield Fault(f"day_types.holidays[{n}]", f"must be an ISO 8601 date, got {text!r}")
    country, part = study.day_types.holidays_country, study.day_types.holidays_subdivision
    if country:
        import holidays

        known = holidays.list_supported_countries()
        if country not in known:
            yield Fault(
                "day_types.holidays_country",
                f"no holidays are known for {country!r}; list them under day_types.holidays",
            )
        elif part and part not in known[country]:
            yield Fault("day_types.holidays_subdivision", f"{country} has no subdivision {part!r}")


def _customers(study: Study) -> Iterator[Fault]:
    seen: set[str] = set()
    for n, customer in enumerate(study.customer, start=1):
        if customer.id in seen:
            yield Fault(f"customer[{n}].id", f"{customer.id!r} is listed twice")
        seen.add(customer.id)


def _transformers(study: Study) -> Iterator[Fault]:
    for n, unit in enumerate(study.transformer, start=1):
        where = "transformer" if len(study.transformer) == 1 else f"transformer[{n}]"
        ratings = unit.ratings_kva
        if not ratings and not unit.series and not unit.installed_kva:
            yield Fault(
                f"{where}.ratings_kva", "missing; list the ratings to compare, or name a series, or the installed_kva"
            )
        if ratings and unit.series:
            yield Fault(f"{where}.series", "stands beside ratings_kva; keep one of the two")
        if any(b <= a for a, b in itertools.pairwise(ratings)):
            yield Fault(f"{where}.ratings_kva", f"must increase and not repeat, got {list(ratings)}")


def _is_date(text: str) -> bool:
    try:
        dt.date.fromisoformat(text)
    except ValueError:
        return False
    return True
