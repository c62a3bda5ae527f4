"""The record of a transformer in service: each figure with its source, and what is missing."""

from loadsum.study.assumptions import Assumption
from loadsum.study.unittables import Transformer

FIGURES = {
    "connection": ("connection of the windings", ""),
    "cooling": ("cooling", ""),
    "temperature_rise_c": ("average winding temperature rise at rated load", "K"),
    "impedance_pct": ("short-circuit impedance", "%"),
    "year_made": ("year of manufacture", ""),
}


def transformer_record(unit: Transformer) -> tuple[Assumption, ...]:
    """What the study file says of a unit in service, one row a figure, and one row for the figures it lacks.

    Parameters
    ----------
    unit : Transformer
        Transformer; one that is not in service has no record.
    """
    if not unit.installed_kva:
        return ()
    sources = {text.split(":", 1)[0].strip(): text.split(":", 1)[1].strip() for text in unit.sources}
    rows, missing = [], []
    for key, (name, unit_of_figure) in FIGURES.items():
        value = getattr(unit, key)
        if not value:
            missing.append(name)
            continue
        rows.append(
            Assumption(
                name=name,
                value=value if isinstance(value, str) else f"{value:g}",
                unit=unit_of_figure,
                source=sources.get(key, "no source given"),
                decided_by="study file",
            )
        )
    if missing:
        rows.append(
            Assumption(
                name="figures missing from the transformer's record",
                value=str(len(missing)),
                source=f"{', '.join(missing)}; look at the nameplate or the test report",
                decided_by="nobody",
                effect="none: no probability of demand rests on them",
            )
        )
    return tuple(rows)
