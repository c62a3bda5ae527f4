"""Study files for the tests of intake, and small meter files."""

from pathlib import Path

from loadsum.intake.load import Loaded, load_readings
from loadsum.study.load import study_from
from loadsum.study.tables import Study


def study(*readings: dict, zone: str = "+00:00", interval_min: int = 60, **tables: object) -> Study:
    sources = [{"unit": "kWh", "stamp": "start", "files": "a.csv", **entry} for entry in readings or ({},)]
    tree = {
        "study": {"title": "test", "time_zone": zone, "demand_interval_min": interval_min},
        "readings": sources,
        "transformer": {"ratings_kva": [25], "power_factor": 0.9},
        **tables,
    }
    return study_from(tree, "study.toml")


def load(folder: Path, text: str | bytes, name: str = "a.csv", **keys: object) -> Loaded:
    """Readings of one file with the content given."""
    content = text.encode() if isinstance(text, str) else text
    (folder / name).write_bytes(content)
    outer = {key: keys.pop(key) for key in ("zone", "interval_min", "customer", "findings") if key in keys}
    if "minutes" in keys:
        keys["interval_min"] = keys.pop("minutes")
    return load_readings(study({"files": name, **keys}, **outer), folder)


def rules(loaded: Loaded) -> set[str]:
    return {finding.rule for finding in loaded.readings.findings}


def accounted(loaded: Loaded, per_interval: int = 1) -> bool:
    """Readings in equal readings used and readings left out under a finding."""
    used = int((loaded.readings.kw == loaded.readings.kw).sum()) * per_interval
    return loaded.readings.rows_in == used + sum(f.excluded for f in loaded.readings.findings)
