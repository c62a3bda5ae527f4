"""What must hold between the keys about load to come."""

from collections.abc import Iterator

from loadsum.errors import Fault
from loadsum.study.tables import Study
from loadsum.study.values import shown


def check_load_to_come(study: Study) -> list[Fault]:
    """Faults between keys; empty when the tables agree."""
    return [*_scenarios(study), *_additions(study), *_tables(study)]


def place_of(table: str, n: int, of: int) -> str:
    """Dotted place of the n-th of several like tables, without a number where there is only one."""
    return table if of == 1 else f"{table}[{n}]"


def _scenarios(study: Study) -> Iterator[Fault]:
    seen: set[str] = set()
    classes = {customer.customer_class for customer in study.customer}
    for n, row in enumerate(study.scenario, start=1):
        where = place_of("scenario", n, len(study.scenario))
        if row.name in seen:
            yield Fault(f"{where}.name", f"two scenarios are called {shown(row.name)}")
        seen.add(row.name)
        if row.growth_pct_per_year and not (row.first_year and row.horizon_years):
            yield Fault(f"{where}.growth_pct_per_year", "needs first_year and horizon_years beside it")
        if row.growth_of == "customer class" and not row.growth_class:
            yield Fault(f"{where}.growth_class", "missing; name the customer class that grows")
        if row.growth_class and classes and row.growth_class not in classes:
            yield Fault(f"{where}.growth_class", f"no customer is of class {shown(row.growth_class)}")
        if row.growth_of == "number of customers" and not row.growth_class and len(classes) > 1:
            yield Fault(f"{where}.growth_class", f"missing; name one of {', '.join(sorted(classes))}")
        if (row.pickup_factor > 0.0) != (row.pickup_h > 0.0):
            yield Fault(f"{where}.pickup_factor", "needs pickup_h beside it, and pickup_h needs it")


def _additions(study: Study) -> Iterator[Fault]:
    scenarios = {row.name for row in study.scenario}
    seasons = {season.name for season in study.season}
    for n, row in enumerate(study.addition, start=1):
        where = place_of("addition", n, len(study.addition))
        if row.scenario and row.scenario not in scenarios:
            yield Fault(f"{where}.scenario", f"no scenario is called {shown(row.scenario)}")
        for name in row.seasons:
            if name not in seasons:
                yield Fault(f"{where}.seasons", f"no season is called {shown(name)}")
        if row.kind == "customers":
            if not row.customer_class:
                yield Fault(f"{where}.customer_class", "missing; name the class of the customers")
            elif study.customer and all(row.customer_class != own.customer_class for own in study.customer):
                yield Fault(f"{where}.customer_class", f"no customer is of class {shown(row.customer_class)}")
            continue
        if bool(row.profile) == bool(row.kw):
            yield Fault(f"{where}.kw", "give either kw, with share_by_hour where it is not always on, or a profile")
        if row.share_by_hour and (row.profile or len(row.share_by_hour) != 24):
            yield Fault(
                f"{where}.share_by_hour",
                f"must be 24 shares beside kw, got {len(row.share_by_hour)}; none for a profile",
            )


def _tables(study: Study) -> Iterator[Fault]:
    for n, row in enumerate(study.diversity_table, start=1):
        where = place_of("diversity_table", n, len(study.diversity_table))
        if len(row.customers) != len(row.factor):
            yield Fault(f"{where}.factor", f"needs {len(row.customers)} factors, one a row, got {len(row.factor)}")
        if list(row.customers) != sorted(set(row.customers)):
            yield Fault(f"{where}.customers", f"must rise, got {list(row.customers)}")
