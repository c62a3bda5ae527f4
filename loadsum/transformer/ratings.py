"""Ratings to compare: the study's own list, or a published preferred series."""

from loadsum.study.unittables import Transformer

# Preferred ratings of the IEEE C57.12 family, read in two public restatements that agree (source_read_secondary);
# the standard itself was not at hand: confirm on a licensed copy. [kVA]
SERIES = {
    "single-phase 60 Hz": (5.0, 10.0, 15.0, 25.0, 37.5, 50.0, 75.0, 100.0, 167.0, 250.0, 333.0, 500.0),
    "three-phase 60 Hz": (
        15.0, 30.0, 45.0, 75.0, 112.5, 150.0, 225.0, 300.0, 500.0, 750.0, 1000.0, 1500.0, 2000.0, 2500.0,
    ),
}  # fmt: skip


def ratings_of(unit: Transformer) -> tuple[float, ...]:
    """Ratings to compare, increasing, the one in service among them. [kVA]"""
    listed = set(unit.ratings_kva or SERIES.get(unit.series, ()))
    if unit.installed_kva > 0.0:
        listed.add(unit.installed_kva)
    return tuple(sorted(listed))
