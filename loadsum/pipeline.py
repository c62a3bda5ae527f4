"""The order of the stages and nothing else."""

import json
import logging
import platform
from collections.abc import Mapping, Sequence
from dataclasses import replace
from importlib import metadata
from pathlib import Path
from typing import Any

import numpy as np

from loadsum import __version__
from loadsum.demand.group import Group, group_demand
from loadsum.demand.hourly import GroupDemand
from loadsum.demand.modelparts import part_effects
from loadsum.demand.normalfamily import normal_family
from loadsum.demand.planned import Planned
from loadsum.demand.reactive import power_factor_when_high
from loadsum.demand.served import (
    numbers_by_class,
    record_by_class,
    scaled,
    settings_of,
    tested_group,
    with_more,
)
from loadsum.demand.settings import ModelSettings
from loadsum.evidence.holdout import hold_out
from loadsum.intake.customers import customer_findings
from loadsum.intake.draft import draft_study
from loadsum.intake.hourclass import Calendar, DayBlock, calendar, day_blocks, metered_years
from loadsum.intake.load import Loaded, load_readings
from loadsum.peak.dayandyear import day_and_year
from loadsum.peak.diversity import diversity
from loadsum.peak.estimated import estimated_readings
from loadsum.peak.exceedance import ExceedanceTable, days_by_month, exceedance_hours
from loadsum.preparation import grouped, prepared, tester
from loadsum.progress import Progress
from loadsum.report import revision
from loadsum.report.csvtables import csv_table
from loadsum.report.delivered import outputs
from loadsum.report.energybymonth import energy_by_month
from loadsum.report.hourmap import hour_map
from loadsum.report.inspection import inspection
from loadsum.report.outputs import write_outputs
from loadsum.report.quality import quality_calendar
from loadsum.report.register import assumptions
from loadsum.report.results import SCHEMA_VERSION, Program, StudyResults, TransformerResults, encode, to_json
from loadsum.report.tables import coverage, curve, curve_levels, customer_rows, exceedance_rows, hour_rows
from loadsum.report.workbook import result_tables, workbook
from loadsum.study.load import load_study
from loadsum.study.overrides import with_values_noted
from loadsum.study.pseudonyms import key_beside, pseudonyms
from loadsum.study.tables import Study
from loadsum.study.unittables import Transformer
from loadsum.transformer.criterionfigures import annual_probability, life_of, missing_for_life, temperature_figures
from loadsum.transformer.loading import loadings
from loadsum.transformer.loadtocome import load_to_come
from loadsum.transformer.losses import losses
from loadsum.transformer.ratings import ratings_of
from loadsum.transformer.selection import evaluate
from loadsum.transformer.sensitivity import sensitivity
from loadsum.transformer.whatmoves import what_moves

log = logging.getLogger(__name__)

STANDS_ON = ("numpy", "scipy", "pandas", "jinja2", "weasyprint", "matplotlib", "holidays")


def study(path: Path, *, out: Path, progress: Progress, overrides: Sequence[str] = (), xlsx: bool = False) -> str:
    """Make a study and write its outputs; returns what to tell the user.

    Parameters
    ----------
    path : Path
        Study file.
    out : Path
        Folder for the outputs.
    progress : Progress
        Told how far the work is.
    overrides : sequence of str
        ``key=value`` each: values that stand for those of the study file.
    xlsx : bool
        Whether the result tables are written as a workbook as well.

    Raises
    ------
    InputError
        The study file or a meter file is at fault.
    MachineError
        The outputs cannot be written or the PDF renderer cannot be loaded.
    """
    progress("reading the study file", 0.0)
    asked = load_study(path, overrides)
    before = load_study(path) if overrides else None
    key, made = (b"", False) if asked.privacy.raw_identifiers else key_beside(path, asked.privacy.key_file)
    study_file = with_values_noted(path.read_text(encoding="utf-8-sig"), overrides)
    said = deliver(asked, path.parent, study_file, key, before=before, out=out, progress=progress, xlsx=xlsx)
    if made:
        said.append(f"customers have pseudonyms; keep their key: {path.parent / asked.privacy.key_file}")
    return "\n".join(said)


def deliver(
    asked: Study,
    folder: Path,
    study_file: str,
    key: bytes,
    *,
    before: Study | None,
    out: Path,
    progress: Progress,
    xlsx: bool,
) -> list[str]:
    """Compute a study, write its outputs, and say how it differs from the study it was before, where one is given."""
    results = encode(compute(asked, folder, progress=progress))
    said = [f"report: {out / 'report.pdf'}"]
    if before is not None:
        as_it_was = encode(compute(before, folder, progress=progress))
        said += [str(change) for change in revision.compare(as_it_was, results)] or ["no figure and no verdict changed"]
    if not asked.privacy.raw_identifiers:
        named = pseudonyms(identifiers(asked, results), key)
        results, study_file = {**named.results(results), "pseudonymised": True}, named.toml(study_file)
    progress("drawing the report", 0.8)
    results = json.loads(to_json(results))  # drawn from what is written, so that it can be drawn again
    files = outputs(results, study_file.encode())
    if xlsx:
        files["tables.xlsx"] = workbook(result_tables(results))
    write_outputs(out, files)
    return said


def identifiers(asked: Study, results: dict[str, Any]) -> list[str]:
    """Every identifier of a customer that a study knows, listed or only metered."""
    metered = [row["customer"] for row in results["months"]]
    return list(dict.fromkeys([*metered, *(customer.id for customer in asked.customer)]))


def inspect(path: Path, *, out: Path | None, progress: Progress) -> str:
    """Read the meter files of a study and tell every finding; writes findings.csv where a folder is given."""
    progress("reading meter files", 0.1)
    asked = load_study(path)
    loaded = load_readings(asked, path.parent)
    rows = encode((*loaded.readings.findings, *customer_findings(asked, loaded.readings)))
    if out is not None:
        write_outputs(out, {"findings.csv": csv_table(rows)})
    return inspection(loaded, rows)


def draft(folder: Path) -> str:
    """Draft a study file and a customer table from a folder of meter files; returns what to tell the user."""
    files, said = draft_study(folder)
    end = [f"written: {path}" for path in files] or ["nothing new; nothing written"]
    return "\n".join([*said, *end])


def compute(asked: Study, folder: Path, *, progress: Progress) -> StudyResults:
    """Results of a study whose files lie in a folder."""
    progress("reading meter files", 0.05)
    log.info("reading meter files")
    loaded = load_readings(asked, folder)
    readings = loaded.readings
    days, years, blocks = classes(asked, loaded)
    units = []
    for number, unit in enumerate(asked.transformer):
        progress("computing", 0.15 + 0.6 * number / len(asked.transformer))
        log.info("computing transformer %s", unit.id or number + 1)
        units.append(one_transformer(asked, unit, loaded, blocks, days, years))
    return StudyResults(
        schema_version=SCHEMA_VERSION,
        program=program(),
        study=asked.study,
        people=asked.person,
        seed=asked.study.seed,
        inputs=loaded.inputs,
        findings=(*readings.findings, *customer_findings(asked, readings)),
        quality=quality_calendar(readings),
        months=energy_by_month(readings),
        reconciliation=loaded.reconciliation,
        transformers=tuple(units),
    )


def program() -> Program:
    """This program, and what it stands on."""
    return Program(
        name="loadsum",
        version=__version__,
        python=platform.python_version(),
        dependencies={name: metadata.version(name) for name in STANDS_ON},
    )


def classes(asked: Study, loaded: Loaded) -> tuple[Calendar, Sequence[int], Sequence[DayBlock]]:
    """Calendar, metered years, and the readings sorted into classes of days."""
    years = metered_years(loaded.readings)
    days = calendar(asked.season, asked.day_types, years)
    return days, years, day_blocks(loaded.readings, days, years, loaded.temperature)


def with_readings(asked: Study, loaded: Loaded, *, only: str) -> TransformerResults:
    """Results of the one transformer of that id, from readings that are loaded already."""
    days, years, blocks = classes(asked, loaded)
    unit = next(unit for unit in asked.transformer if unit.id == only)
    return one_transformer(asked, unit, loaded, blocks, days, years)


def one_transformer(
    asked: Study,
    unit: Transformer,
    loaded: Loaded,
    blocks: Sequence[DayBlock],
    days: Calendar,
    years: Sequence[int],
) -> TransformerResults:
    """Results of one transformer; where it cannot be studied, the reason."""
    readings = loaded.readings
    group_of = prepared(asked, unit, loaded, blocks)
    if isinstance(group_of, str):
        return TransformerResults(id=unit.id, reason=group_of, installed_kva=unit.installed_kva)
    served, group, group_blocks, resolution = (group_of.served, group_of.group, group_of.blocks, group_of.resolution_kw)
    rng = np.random.default_rng(asked.study.seed)
    settings = settings_of(asked.model)
    judged, note = tested_group(group, bool(served.group.served.any()))
    tested = hold_out(group_blocks, fit=tester(asked, unit, loaded, group_of, judged), served=judged.served, note=note)

    def modelled(
        changed: Group, changed_blocks: Sequence[DayBlock], resolution_kw: float, using: ModelSettings = settings
    ) -> GroupDemand:
        return group_demand(
            changed_blocks,
            interval_min=readings.interval_min,
            power_factor=unit.power_factor,
            settings=using,
            group=changed,
            resolution_kw=resolution_kw,
            record_c=record_by_class(loaded.record, days),
            rng=np.random.default_rng(asked.study.seed),
        )

    def rebuilt(planned: Sequence[Planned], factors: Mapping[str, float]) -> GroupDemand:
        changed, changed_blocks = with_more(group, group_blocks, planned, factors)
        return modelled(changed, changed_blocks, 0.0 if factors else resolution)

    ratings = ratings_of(unit)
    month_days = days_by_month(days, years)

    def hours_above(model: GroupDemand) -> dict[str, ExceedanceTable]:
        return {
            of: exceedance_hours(
                model, {f"{rating:g} kVA": rating * share for rating in ratings}, "both", month_days=month_days
            )
            for of, share in loadings(model, asked.allowed_loading).items()
        }

    def with_estimated() -> dict[str, ExceedanceTable]:
        every = day_blocks(readings, days, years, loaded.temperature, estimated_too=True)
        given = grouped(group_of, unit, every, readings.interval_min)
        return hours_above(modelled(*given, resolution, replace(settings, resamples=0)))

    metered = group_of.usable[served.group.served]
    taken_in = with_estimated() if readings.estimated[metered].any() else {}  # its model is gone before the next
    demand = modelled(group, group_blocks, resolution)
    if not demand.covered().any():
        reason = "the readings leave no demand interval with at least two days"
        return TransformerResults(id=unit.id, reason=reason, installed_kva=unit.installed_kva)

    above = hours_above(demand)
    together = day_and_year(
        demand,
        calendar=days,
        calendar_years_metered=years,
        metered=loaded.temperature,
        record=loaded.record,
        reference=group_blocks,
    )
    lived, beside = life_of(unit, asked.criterion, together, ratings, rng)
    selection = evaluate(
        demand,
        ratings,
        asked.criterion,
        asked.allowed_loading,
        installed_kva=unit.installed_kva,
        above=above,
        others={
            "annual exceedance probability": annual_probability(together, asked.allowed_loading, asked.study.seed),
            **temperature_figures(lived, missing_for_life(unit)),
        },
    )
    turning = sensitivity(
        demand, ratings, selection, asked.criterion, asked.allowed_loading, power_factor=unit.power_factor
    )
    parts = part_effects(
        group_blocks,
        lambda some, switched: group_demand(
            some,
            interval_min=readings.interval_min,
            power_factor=unit.power_factor,
            settings=switched,
            group=group,
            record_c=record_by_class(loaded.record, days),
        ),
        settings,
        judged_kva := selection.rating_kva or unit.installed_kva or max(ratings),
    )
    scenarios, rooms = load_to_come(
        asked,
        demand,
        ratings,
        profiles=loaded.profiles,
        customers=numbers_by_class(served.customers),
        rebuild=rebuilt,
    )
    power_factor = power_factor_when_high(demand)
    shown = list(loadings(demand, asked.allowed_loading).values())[-1]
    return TransformerResults(
        id=unit.id,
        installed_kva=unit.installed_kva,
        phases=unit.phases,
        power_factor=power_factor,
        ratings_kva=tuple(ratings),
        coverage=coverage(demand, readings),
        customers=customer_rows(readings, served.customers),
        hours=hour_rows(demand),
        curve=curve(demand, curve_levels(demand, max(ratings) * power_factor)),
        normal_family=normal_family(demand, {rating: rating * shown for rating in ratings}),
        exceedance=tuple(row for of, table in above.items() for row in exceedance_rows(demand, table, ratings, of)),
        estimated=estimated_readings(readings, metered, ratings, above, lambda: taken_in),
        hour_map=hour_map(demand.blocks, ratings, list(above.values())[-1].levels),
        selection=selection,
        what_moves=what_moves(demand, judged_kva, asked.allowed_loading, parts, power_factor=power_factor),
        peaks=together.peaks({f"{rating:g} kVA": rating * shown for rating in ratings}, rng),
        diversity=diversity(
            [scaled(block, group_of.usable[served.group.served], group_of.allowance) for block in blocks],
            interval_min=readings.interval_min,
            power_factor=unit.power_factor,
            rng=rng,
            rating_kva=unit.installed_kva,
            rusck=asked.rusck,
            velander=asked.velander,
            tables=asked.diversity_table,
        )
        if served.group.served.any()
        else None,
        scenarios=scenarios,
        headroom=rooms,
        thermal=lived,
        thermal_beside=beside,
        losses=losses(
            demand,
            unit.ratings_kva,
            unit.no_load_losses_w,
            unit.load_losses_w,
            a_per_w=unit.loss_factor_a_per_w,
            b_per_w=unit.loss_factor_b_per_w,
            energy_price_per_kwh=unit.energy_price_per_kwh,
            discount_rate_pct=unit.discount_rate_pct,
            worth_years=unit.worth_years,
            prices=unit.prices,
            currency=unit.currency,
        ),
        evidence=tested,
        diagnostics=demand.diagnostics,
        assumptions=assumptions(asked, unit, served, demand, turning, parts),
    )
