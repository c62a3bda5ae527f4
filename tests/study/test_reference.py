"""The schema and the reference page are made from the tables of the loader, and are current."""

import copy
import json
import tomllib
from pathlib import Path

import jsonschema
import pytest

from loadsum.errors import InputError
from loadsum.study.load import study_from
from loadsum.study.reference import reference_page
from loadsum.study.schema import study_schema
from tests.study.test_load import GOOD

ROOT = Path(__file__).resolve().parents[2]
RENEW = "run: python -m loadsum.study.reference docs"


def test_the_reference_page_in_docs_is_current():
    assert (ROOT / "docs/study-file.md").read_text(encoding="utf-8") == reference_page(), RENEW


def test_the_schema_in_docs_is_current():
    assert json.loads((ROOT / "docs/study-file.schema.json").read_text(encoding="utf-8")) == study_schema(), RENEW


def as_json(text: str) -> dict:
    return json.loads(json.dumps(tomllib.loads(text), default=str))


@pytest.mark.parametrize("path", sorted(ROOT.glob("demo_feeders/*/study.toml")), ids=lambda path: path.parent.name)
def test_every_demo_study_satisfies_the_schema(path):
    jsonschema.validate(as_json(path.read_text(encoding="utf-8")), study_schema())


SPOILT = [
    ("study", "demand_interval_min", 61),
    ("study", "titel", "x"),
    ("readings", "unit", "kVAh"),
    ("transformer", "power_factor", 1.2),
    ("transformer", "ratings_kva", [0]),
    ("study", "title", 3),
]


@pytest.mark.parametrize(("table", "key", "value"), SPOILT)
def test_the_schema_and_the_loader_refuse_the_same_values(table, key, value):
    tree = as_json(GOOD)
    jsonschema.validate(tree, study_schema())
    study_from(copy.deepcopy(tree), "study.toml")
    tree[table][key] = value
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(tree, study_schema())
    with pytest.raises(InputError):
        study_from(tree, "study.toml")
