"""The register of assumptions of one transformer."""

from collections.abc import Sequence

from loadsum.demand.hourly import GroupDemand
from loadsum.demand.modelparts import PARTS, PartEffect
from loadsum.demand.reactive import metered_power_factors
from loadsum.demand.served import Served
from loadsum.study.assumptions import Assumption
from loadsum.study.record import transformer_record
from loadsum.study.tables import Study
from loadsum.study.unittables import Transformer
from loadsum.transformer.loading import seasons_without_allowance
from loadsum.transformer.sensitivity import Sensitivity, ambient_effect, demand_effect, power_factor_effect
from loadsum.transformer.thermalkeys import NO_AMBIENT, thermal_data

FILE = "study file"
DEFAULT = "program default"
READINGS = "meter readings"


THERMAL = {
    "top_oil_rise_k": ("top-oil rise at rated load", "K"),
    "hot_spot_gradient_k": ("hot-spot rise over top oil at rated load", "K"),
    "loss_ratio": ("load losses at rated load over no-load losses", ""),
    "oil_exponent": ("oil exponent", ""),
    "winding_exponent": ("winding exponent", ""),
    "oil_time_constant_min": ("oil time constant", "min"),
    "winding_time_constant_min": ("winding time constant", "min"),
}


def assumptions(
    asked: Study,
    unit: Transformer,
    served: Served,
    demand: GroupDemand,
    turning: Sensitivity | None = None,
    parts: Sequence[PartEffect] = (),
) -> tuple[Assumption, ...]:
    """Everything the study of one transformer takes as given, and what the choice does where that was worked out."""
    metered = metered_power_factors(demand, unit.power_factor)
    listed = [
        Assumption(
            name="power factor of the group",
            value=f"{unit.power_factor:g}" if metered is None else f"{metered[0]:.3f} to {metered[1]:.3f}",
            source=(unit.power_factor_source or "no source given")
            if metered is None
            else f"metered reactive demand of everyone served, in proportion to the active one in each interval of a"
            f" class of days; {unit.power_factor:g}, as stated, where it is missing",
            decided_by=FILE if metered is None else READINGS,
            effect=power_factor_effect(turning),
        ),
        Assumption(
            name="growth of demand since the readings, in the choice of rating",
            value="0",
            unit="%",
            source="none: demand as metered, with the customers and loads of the study",
            decided_by=DEFAULT,
            effect=demand_effect(turning),
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
    if thermal_data(unit) is not None:
        listed += _thermal(unit, turning)
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
    listed += [
        Assumption(
            name=f"part of the demand model: {name}",
            value="on" if getattr(settings, part) else "off",
            source="docs/methods/dependence.md",
            decided_by=DEFAULT if getattr(settings, part) else FILE,
            effect="; ".join(effect.words() for effect in parts if effect.part == part),
        )
        for part, name in PARTS.items()
    ]
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


def _thermal(unit: Transformer, turning: Sensitivity | None) -> list[Assumption]:
    """Thermal data, the same per unit for every rating, and the ambient."""
    source = unit.thermal_source or "no source given"
    rows = [
        Assumption(name=name, value=f"{getattr(unit, key):g}", unit=symbol, source=source, decided_by=FILE)
        for key, (name, symbol) in THERMAL.items()
    ]
    rows.append(Assumption(name="insulation paper", value=unit.paper, source=source, decided_by=FILE))
    stated = unit.ambient_c > NO_AMBIENT
    rows.append(
        Assumption(
            name="ambient temperature of the transformer",
            value=f"{unit.ambient_c:g}" if stated else "outdoor temperature of the same days",
            unit="°C, where no series is given" if stated else "",
            source=FILE if stated else "[weather]",
            decided_by=FILE,
            effect=ambient_effect(turning),
        )
    )
    return rows
