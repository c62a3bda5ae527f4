"""The order of the stages and nothing else."""

import logging
import platform
from collections.abc import Sequence
from importlib import metadata
from pathlib import Path
from typing import Any

import numpy as np

from loadsum import __version__
from loadsum.demand.group import group_demand
from loadsum.demand.served import (
    cannot_be_studied,
    record_by_class,
    scaled,
    served_by,
    settings_of,
    with_unmetered_block,
)
from loadsum.intake.hourclass import Calendar, DayBlock, calendar, day_blocks, metered_years
from loadsum.intake.load import Loaded, load_readings
from loadsum.intake.readings import shared_resolution
from loadsum.peak.exceedance import days_by_month, exceedance_hours
from loadsum.progress import Progress
from loadsum.report import document, figures
from loadsum.report.archive import RESULTS_FILE, STUDY_FILE, Attachment
from loadsum.report.csvtables import csv_table
from loadsum.report.energybymonth import energy_by_month
from loadsum.report.hourmap import hour_map
from loadsum.report.outputs import write_outputs
from loadsum.report.quality import quality_calendar
from loadsum.report.register import assumptions
from loadsum.report.results import SCHEMA_VERSION, Program, StudyResults, TransformerResults, encode, to_json
from loadsum.report.tables import coverage, curve, curve_levels, customer_rows, exceedance_rows, hour_rows
from loadsum.study.checks import billed_kwh
from loadsum.study.load import load_study
from loadsum.study.tables import Study, Transformer
from loadsum.transformer.loading import loadings
from loadsum.transformer.ratings import ratings_of
from loadsum.transformer.selection import evaluate

log = logging.getLogger(__name__)

STANDS_ON = ("numpy", "scipy", "pandas", "jinja2", "weasyprint", "matplotlib", "holidays")


def study(path: Path, *, out: Path, progress: Progress) -> str:
    """Make a study and write its outputs; returns what to tell the user.

    Raises
    ------
    InputError
        The study file or a meter file is at fault.
    MachineError
        The outputs cannot be written or the PDF renderer cannot be loaded.
    """
    progress("reading the study file", 0.0)
    asked = load_study(path)
    results = encode(compute(asked, path.parent, progress=progress))
    progress("drawing the report", 0.8)
    write_outputs(out, outputs(results, path.read_bytes()))
    return f"report: {out / 'report.pdf'}"


def outputs(results: dict[str, Any], study_file: bytes) -> dict[str, bytes]:
    """Everything that a study leaves behind, by name relative to its folder."""
    tables = {
        RESULTS_FILE: to_json(results).encode(),
        "hours.csv": csv_table(
            [{"transformer": unit["id"], **row} for unit in results["transformers"] for row in unit["hours"]]
        ),
        "findings.csv": csv_table(results["findings"]),
    }
    attached = [
        Attachment(name=STUDY_FILE, content=study_file, description="Study file", relationship="Source"),
        Attachment(name=RESULTS_FILE, content=tables[RESULTS_FILE], description="Results"),
        Attachment(
            name="hours.csv", content=tables["hours.csv"], description="Demand in every interval of every class"
        ),
        Attachment(name="findings.csv", content=tables["findings.csv"], description="Findings on the readings"),
    ]
    drawn = {f"figures/{name}": content for name, content in figures.draw(results).items()}
    return {"report.pdf": document.render(results, attachments=attached), **tables, **drawn}


def inspect(path: Path, *, out: Path | None, progress: Progress) -> str:
    """Read the meter files of a study and tell every finding; writes findings.csv where a folder is given."""
    progress("reading meter files", 0.1)
    asked = load_study(path)
    loaded = load_readings(asked, path.parent)
    rows = encode(loaded.readings.findings)
    if out is not None:
        write_outputs(out, {"findings.csv": csv_table(rows)})
    used = loaded.readings.rows_in - sum(row["excluded"] for row in rows)
    lines = [f"{loaded.readings.rows_in} readings of {len(loaded.readings.customers)} customers, {used} used"]
    for file in loaded.inputs:
        lines.append(f"{file.name}: {file.format}, {file.layout}; {'; '.join(file.choices)}")
    for row in rows:
        place = ", ".join(part for part in (row["customer"], row["place"]) if part)
        said = f"{row['message']}. {row['effect']}".rstrip()
        lines.append(f"{row['severity']}: {row['rule']}{f' ({place})' if place else ''}: {said}")
    return "\n".join(lines)


def compute(asked: Study, folder: Path, *, progress: Progress) -> StudyResults:
    """Results of a study whose files lie in a folder."""
    progress("reading meter files", 0.05)
    log.info("reading meter files")
    loaded = load_readings(asked, folder)
    readings = loaded.readings
    years = metered_years(readings)
    days = calendar(asked.season, asked.day_types, years)
    blocks = day_blocks(readings, days, years, loaded.temperature)
    units = []
    for number, unit in enumerate(asked.transformer):
        progress("computing", 0.15 + 0.6 * number / len(asked.transformer))
        log.info("computing transformer %s", unit.id or number + 1)
        units.append(one_transformer(asked, unit, loaded, blocks, days, years))
    return StudyResults(
        schema_version=SCHEMA_VERSION,
        program=Program(
            name="loadsum",
            version=__version__,
            python=platform.python_version(),
            dependencies={name: metadata.version(name) for name in STANDS_ON},
        ),
        study=asked.study,
        people=asked.person,
        seed=asked.study.seed,
        inputs=loaded.inputs,
        findings=readings.findings,
        quality=quality_calendar(readings),
        months=energy_by_month(readings),
        transformers=tuple(units),
    )


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
    usable = np.flatnonzero((np.isfinite(readings.kw) & ~readings.estimated).any(axis=1))
    served = served_by(
        unit.id,
        len(asked.transformer) == 1,
        asked.customer,
        [readings.customers[c] for c in usable],
        {customer.id: billed_kwh(customer) for customer in asked.customer},
    )
    reason = cannot_be_studied(served)
    if reason:
        return TransformerResults(id=unit.id, reason=reason, installed_kva=unit.installed_kva)
    rng = np.random.default_rng(asked.study.seed)
    allowance = 1.0 + unit.losses_allowance_pct / 100.0
    group, group_blocks = with_unmetered_block(
        served.group, [scaled(block, usable, allowance) for block in blocks], unit, readings.interval_min
    )
    demand = group_demand(
        group_blocks,
        interval_min=readings.interval_min,
        power_factor=unit.power_factor,
        settings=settings_of(asked.model),
        group=group,
        resolution_kw=shared_resolution(readings) * allowance,
        record_c=record_by_class(loaded.record, days),
        rng=rng,
    )
    if not demand.covered().any():
        reason = "the readings leave no demand interval with at least two days"
        return TransformerResults(id=unit.id, reason=reason, installed_kva=unit.installed_kva)
    ratings = ratings_of(unit)
    month_days = days_by_month(days, years)
    above = {
        of: exceedance_hours(
            demand, {f"{rating:g} kVA": rating * share for rating in ratings}, "both", month_days=month_days
        )
        for of, share in loadings(demand, asked.allowed_loading).items()
    }
    selection = evaluate(demand, ratings, asked.criterion, asked.allowed_loading, installed_kva=unit.installed_kva)
    return TransformerResults(
        id=unit.id,
        installed_kva=unit.installed_kva,
        phases=unit.phases,
        power_factor=unit.power_factor,
        ratings_kva=tuple(ratings),
        coverage=coverage(demand, readings),
        customers=customer_rows(readings, served.customers),
        hours=hour_rows(demand),
        curve=curve(demand, curve_levels(demand, max(ratings) * unit.power_factor)),
        exceedance=tuple(row for of, table in above.items() for row in exceedance_rows(demand, table, ratings, of)),
        hour_map=hour_map(demand.blocks, ratings, list(above.values())[-1].levels),
        selection=selection,
        diagnostics=demand.diagnostics,
        assumptions=assumptions(asked, unit, served, demand),
    )
