"""Published and recomputed values for sums of demands, with their citation and provenance (sums.json)."""

import json
from pathlib import Path
from typing import Any

_FILE = Path(__file__).with_name("sums.json")
VALUES: dict[str, dict[str, Any]] = {v["id"]: v for v in json.loads(_FILE.read_text(encoding="utf-8"))["values"]}


def expected(name: str) -> Any:
    """The expected value or values of one entry."""
    return VALUES[name]["expected"]
