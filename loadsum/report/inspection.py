"""What intake found, in lines for the person at the keyboard."""

from collections.abc import Mapping, Sequence
from typing import Any

from loadsum.intake.load import Loaded


def inspection(loaded: Loaded, findings: Sequence[Mapping[str, Any]]) -> str:
    """Readings in and used, how each file was read, and every finding.

    Parameters
    ----------
    loaded : Loaded
        What intake handed on.
    findings : sequence of mapping
        Findings as the results have them.
    """
    readings = loaded.readings
    used = readings.rows_in - sum(row["excluded"] for row in findings)
    lines = [f"{readings.rows_in} readings of {len(readings.customers)} customers, {used} used"]
    for file in loaded.inputs:
        lines.append(f"{file.name}: {file.format}, {file.layout}; {'; '.join(file.choices)}")
    for row in findings:
        place = ", ".join(part for part in (row["customer"], row["place"]) if part)
        said = f"{row['message']}. {row['effect']}".rstrip()
        lines.append(f"{row['severity']}: {row['rule']}{f' ({place})' if place else ''}: {said}")
    return "\n".join(lines)
