"""What a study leaves behind: the report with what it carries, the results and their tables, the figures."""

from typing import Any

from loadsum.report import document
from loadsum.report.archive import RESULTS_FILE, STUDY_FILE, Attachment
from loadsum.report.csvtables import csv_table
from loadsum.report.results import to_json


def tables_of(results: dict[str, Any]) -> dict[str, bytes]:
    """Results and their tables as files, by name."""
    hours = [{"transformer": unit["id"], **row} for unit in results["transformers"] for row in unit["hours"]]
    people = [{"transformer": unit["id"], **row} for unit in results["transformers"] for row in unit["customers"]]
    return {
        RESULTS_FILE: to_json(results).encode(),
        "hours.csv": csv_table(hours),
        "findings.csv": csv_table(results["findings"]),
        "customers.csv": csv_table(people),
    }


def attachments(results: dict[str, Any], study_file: bytes | None) -> list[Attachment]:
    """What the report carries beside its pages."""
    tables = tables_of(results)
    attached = [
        Attachment(name=RESULTS_FILE, content=tables[RESULTS_FILE], description="Results"),
        Attachment(
            name="hours.csv", content=tables["hours.csv"], description="Demand in every interval of every class"
        ),
        Attachment(name="findings.csv", content=tables["findings.csv"], description="Findings on the readings"),
        Attachment(name="customers.csv", content=tables["customers.csv"], description="Customers with their demand"),
    ]
    if study_file is not None:
        attached.insert(
            0, Attachment(name=STUDY_FILE, content=study_file, description="Study file", relationship="Source")
        )
    return attached


def outputs(results: dict[str, Any], study_file: bytes) -> dict[str, bytes]:
    """Everything that a study leaves behind, by name relative to its folder."""
    report = document.compose(results, attachments=attachments(results, study_file))
    drawn = {f"figures/{name}": content for name, content in report.figure_files().items()}
    return {"report.pdf": document.printed(report, results), STUDY_FILE: study_file, **tables_of(results), **drawn}
