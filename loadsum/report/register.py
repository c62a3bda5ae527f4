"""The register of assumptions of one transformer."""

from loadsum.demand.hourly import GroupDemand
from loadsum.demand.served import Served
from loadsum.study.assumptions import Assumption
from loadsum.study.record import transformer_record
from loadsum.study.tables import Study
from loadsum.study.unittables import Transformer
from loadsum.transformer.loading import seasons_without_allowance

FILE = "study file"
DEFAULT = "program default"


def assumptions(asked: Study, unit: Transformer, served: Served, demand: GroupDemand) -> tuple[Assumption, ...]:
    """Everything the study of one transformer takes as given."""
    listed = [
        Assumption(
            name="power factor of the group",
            value=f"{unit.power_factor:g}",
            source=unit.power_factor_source or "no source given",
            decided_by=FILE,
        ),
        Assumption(
            name="losses between meters and transformer",
            value=f"{unit.losses_allowance_pct:g}",
            unit="%",
            source=FILE if unit.losses_allowance_pct else "none stated: meters are taken as if at the transformer",
            decided_by=FILE if unit.losses_allowance_pct else DEFAULT,
        ),
        Assumption(
            name="unmetered block",
            value=f"{unit.unmetered_kw:g}",
            unit="kW",
            source=FILE if unit.unmetered_kw else "none stated",
            decided_by=FILE if unit.unmetered_kw else DEFAULT,
        ),
    ]
    listed += transformer_record(unit)
    missing = seasons_without_allowance(demand, asked.allowed_loading)
    if asked.allowed_loading and missing:
        listed.append(
            Assumption(
                name=f"allowed loading in {', '.join(missing)}",
                value="1",
                unit="pu",
                source="none stated: nameplate",
                decided_by=DEFAULT,
            )
        )
    listed += [
        Assumption(
            name=f"allowed loading, normal, {row.season}",
            value=f"{row.normal_pu:g}",
            unit="pu",
            source=row.source or "not traced to a utility standard",
            decided_by=FILE,
        )
        for row in asked.allowed_loading
    ]
    if served.without_readings:
        listed.append(
            Assumption(
                name="customers without readings or energy",
                value=str(len(served.without_readings)),
                source="each stands as a typical member of its class",
                decided_by=DEFAULT,
            )
        )
    settings = demand.settings
    listed.append(
        Assumption(
            name="weight of the customer class in each customer's distribution",
            value=f"{settings.borrowed_days:g}" if settings.shrinkage else "0",
            unit="days",
            source="chosen by hold-out on other readings, docs/validation.md",
            decided_by=FILE if asked.model.borrowed_days else DEFAULT,
        )
    )
    if settings.correlation is not None:
        listed.append(
            Assumption(
                name="mean correlation between customers",
                value=f"{settings.correlation:g}",
                source=FILE,
                decided_by=FILE,
            )
        )
    return tuple(listed)
