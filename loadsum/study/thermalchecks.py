"""What must hold of thermal data, losses and money in a study file."""

from loadsum.errors import Fault
from loadsum.study.tables import Study
from loadsum.study.unittables import Transformer

NEEDED = (
    "top_oil_rise_k",
    "hot_spot_gradient_k",
    "loss_ratio",
    "oil_exponent",
    "winding_exponent",
    "oil_time_constant_min",
    "winding_time_constant_min",
)
TEMPERATURE_QUANTITIES = ("hot-spot temperature", "top-oil temperature", "ageing per year")


def missing_thermal(unit: Transformer) -> tuple[str, ...]:
    """Figures that a temperature needs and the study file leaves out."""
    return tuple(name for name in NEEDED if getattr(unit, name) <= 0.0) + (() if unit.paper else ("paper",))


def check_transformers(study: Study) -> list[Fault]:
    """Faults of thermal data, losses and money."""
    faults = []
    for n, unit in enumerate(study.transformer, start=1):
        where = "transformer" if len(study.transformer) == 1 else f"transformer[{n}]"
        if unit.loading_guide and (missing := missing_thermal(unit)):
            faults.append(Fault(f"{where}.loading_guide", f"needs {', '.join(missing)}; none of these is ever assumed"))
        faults.extend(
            Fault(
                f"{where}.{key}",
                f"must have one figure a rating: {len(unit.ratings_kva)}, got {len(given)}",
            )
            for key in ("no_load_losses_w", "load_losses_w", "prices")
            if (given := getattr(unit, key)) and len(given) != len(unit.ratings_kva)
        )
        if bool(unit.no_load_losses_w) != bool(unit.load_losses_w):
            faults.append(Fault(f"{where}.load_losses_w", "no-load and load losses must be given together"))
        if bool(unit.loss_factor_a_per_w) != bool(unit.loss_factor_b_per_w):
            faults.append(Fault(f"{where}.loss_factor_b_per_w", "both worths of a watt must be given together"))
        if unit.energy_price_per_kwh and (unit.loss_factor_a_per_w or unit.loss_factor_b_per_w):
            faults.append(
                Fault(f"{where}.energy_price_per_kwh", "stands beside the worth of a watt; keep one of the two")
            )
        if bool(unit.energy_price_per_kwh) != bool(unit.worth_years):
            faults.append(
                Fault(f"{where}.worth_years", "must be given together with energy_price_per_kwh; no horizon is assumed")
            )
    for n, criterion in enumerate(study.criterion, start=1):
        if criterion.quantity in TEMPERATURE_QUANTITIES[:2] and criterion.probability == 0.0:
            faults.append(
                Fault(f"criterion[{n}].probability", "state the probability per year with which it may be passed")
            )
        if criterion.quantity == "hot-spot temperature" and any(
            criterion.limit <= unit.ambient_c for unit in study.transformer
        ):
            faults.append(Fault(f"criterion[{n}].limit", "lies at or below the stated ambient temperature"))
    return faults
