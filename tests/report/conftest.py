"""A report of the invented study, made once for all tests of the report."""

import json
from typing import Any

import pytest

from loadsum.report.archive import Attachment
from loadsum.report.document import render
from tests.report import invented_results


@pytest.fixture(scope="session")
def results() -> dict[str, Any]:
    """The invented study as read from JSON."""
    return dict(json.loads(json.dumps(invented_results.results())))


@pytest.fixture(scope="session")
def attachments(results: dict[str, Any]) -> list[Attachment]:
    """What the pipeline attaches."""
    return [
        Attachment(
            name="study.toml", content=b'[study]\ntitle = "x"\n', description="Study file", relationship="Source"
        ),
        Attachment(name="results.json", content=json.dumps(results).encode(), description="Results"),
        Attachment(name="hours.csv", content=b"season,interval\n", description="Demand by hour"),
        Attachment(name="findings.csv", content=b"rule,count\n", description="Findings"),
    ]


@pytest.fixture(scope="session")
def report(results: dict[str, Any], attachments: list[Attachment]) -> bytes:
    """The report on A4."""
    return render(results, attachments=attachments)
