"""The order of the stages and nothing else."""

import logging
import platform
from importlib import metadata
from pathlib import Path
from typing import Any

import numpy as np

from loadsum import __version__
from loadsum.demand.group import group_demand
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import calendar, day_blocks
from loadsum.intake.load import Loaded, load_readings
from loadsum.intake.readings import Readings
from loadsum.peak.exceedance import exceedance_hours
from loadsum.progress import Progress
from loadsum.report import document, figures
from loadsum.report.archive import RESULTS_FILE, STUDY_FILE, Attachment
from loadsum.report.csvtables import csv_table
from loadsum.report.outputs import write_outputs
from loadsum.report.results import SCHEMA_VERSION, Program, StudyResults, TransformerResults, encode, to_json
from loadsum.report.tables import coverage, curve, curve_levels, customer_rows, exceedance_rows, hour_rows
from loadsum.study.load import load_study
from loadsum.study.tables import Customer, Study, Transformer

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
    loaded = load_readings(asked, folder)
    units = []
    for number, unit in enumerate(asked.transformer):
        progress("computing", 0.2 + 0.6 * number / len(asked.transformer))
        units.append(one_transformer(asked, unit, loaded))
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
        findings=loaded.readings.findings,
        transformers=tuple(units),
    )


def one_transformer(asked: Study, unit: Transformer, loaded: Loaded) -> TransformerResults:
    """Results of one transformer."""
    readings = loaded.readings
    customers = asked.customer or tuple(Customer(id=name) for name in readings.customers)
    years = sorted(
        {int(d) for d in readings.local_day.astype("datetime64[D]").astype("datetime64[Y]").astype(int) + 1970}
    )
    blocks = day_blocks(readings, calendar(asked.season, asked.day_types, years), years, loaded.temperature)
    demand = group_demand(
        blocks,
        interval_min=readings.interval_min,
        power_factor=unit.power_factor,
        settings=ModelSettings(resamples=asked.model.resamples),
        resolution_kw=shared_resolution(readings),
        rng=np.random.default_rng(asked.study.seed),
    )
    above = exceedance_hours(
        demand, {f"{rating:g} kVA": [rating] * len(demand.blocks) for rating in unit.ratings_kva}, "both"
    )
    return TransformerResults(
        id=unit.id,
        installed_kva=unit.installed_kva,
        phases=unit.phases,
        power_factor=unit.power_factor,
        coverage=coverage(demand, readings),
        customers=customer_rows(readings, customers),
        hours=hour_rows(demand),
        curve=curve(demand, curve_levels(demand, max(unit.ratings_kva))),
        exceedance=exceedance_rows(demand, above, unit.ratings_kva, "nameplate"),
    )


def shared_resolution(readings: Readings) -> float:
    """Resolution that all meters share, as demand; 0 where they differ or one is unknown. [kW]"""
    found = np.unique(readings.resolution_kw)
    return float(found[0]) if found.size == 1 else 0.0
