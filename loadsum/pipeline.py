"""The order of the stages and nothing else."""

import logging
import platform
from importlib import metadata
from pathlib import Path

from loadsum import __version__
from loadsum.demand.hourly import group_demand
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import calendar, day_blocks
from loadsum.intake.load import Loaded, load_readings
from loadsum.progress import Progress
from loadsum.report import document
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
    progress("drawing the report", 0.85)
    text = to_json(results)
    write_outputs(out, {"results.json": text.encode(), "report.pdf": document.render(results)})
    return f"report: {out / 'report.pdf'}"


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
        settings=ModelSettings(),
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
        exceedance=exceedance_rows(demand, unit.ratings_kva),
    )
