"""Pages of docs/ that are checked or made by the program."""

import doctest
import json
from pathlib import Path

from loadsum.report.schema import results_schema

ROOT = Path(__file__).resolve().parents[1]


def test_the_examples_of_the_python_page_run() -> None:
    found = doctest.testfile(str(ROOT / "docs" / "python.md"), module_relative=False)
    assert found.attempted > 10
    assert found.failed == 0


def test_the_schema_of_results_is_current() -> None:
    page = json.loads((ROOT / "docs" / "results.schema.json").read_text(encoding="utf-8"))
    assert page == results_schema(), "python -m loadsum.report.schema docs writes it anew"
