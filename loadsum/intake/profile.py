"""A device's demand profile from delimited text: one row a day."""

from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError
from loadsum.intake.inputs import InputFile, digest
from loadsum.study.tables import Study


def read_profiles(study: Study, folder: Path) -> tuple[dict[str, NDArray[np.float64]], tuple[InputFile, ...]]:
    """Every profile that the additions of a study name, by its name in the study file, and what was read.

    Raises
    ------
    InputError
        Faults of all profiles together.
    """
    found: dict[str, NDArray[np.float64]] = {}
    inputs: list[InputFile] = []
    faults: list[Fault] = []
    for name in dict.fromkeys(row.profile for row in study.addition if row.profile):
        try:
            found[name] = read_profile(folder / name, study.study.demand_interval_min)
        except InputError as error:
            faults.extend(error.faults)
            continue
        sha256, size = digest(folder / name)
        inputs.append(
            InputFile(
                name=name,
                sha256=sha256,
                bytes=size,
                format="delimited text",
                layout="one row a day",
                choices=("demand of one device in kW",),
            )
        )
    if faults:
        raise InputError("profiles", faults)
    return found, tuple(inputs)


def read_profile(path: Path, interval_min: int) -> NDArray[np.float64]:
    """Demand of one device in each demand interval of each day of its profile.

    Parameters
    ----------
    path : Path
        UTF-8 text with a header line; then one line a day: a name, then average kW of equal intervals from midnight.
        Fields are separated by commas, or by semicolons where the header has any.
    interval_min : int
        Demand interval of the study; finer intervals are averaged up, coarser ones refused. [min]

    Returns
    -------
    (D, I) float64
        Demand. [kW]

    Raises
    ------
    InputError
        The file cannot be read, or it holds faults, with every line at fault.
    """
    try:
        lines = path.read_text(encoding="utf-8-sig").splitlines()
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(path.name, [Fault(path.name, f"cannot be read as UTF-8 text: {error}")]) from error
    separator = ";" if lines and ";" in lines[0] else ","
    wanted = 1440 // interval_min
    width = len(lines[0].split(separator)) - 1 if lines else 0
    faults: list[Fault] = []
    if width < wanted or width % wanted:
        faults.append(
            Fault(
                f"{path.name}:1",
                f"has {width} intervals a day; the study needs {wanted}, or a multiple of them to average up",
            )
        )
    days = []
    for number, line in enumerate(lines[1:], start=2):
        if not line.strip():
            continue
        fields = line.split(separator)[1:]
        if len(fields) != width:
            faults.append(Fault(f"{path.name}:{number}", f"has {len(fields)} intervals, the header {width}"))
            continue
        try:
            days.append([float(field) for field in fields])
        except ValueError as error:
            faults.append(Fault(f"{path.name}:{number}", f"is not a row of numbers: {error}"))
            continue
        if not np.isfinite(days[-1]).all():
            faults.append(Fault(f"{path.name}:{number}", "holds a value that is not finite"))
    if not days and not faults:
        faults.append(Fault(f"{path.name}:2", "has no row of a day"))
    if faults:
        raise InputError(path.name, faults)
    return np.asarray(np.array(days).reshape(len(days), wanted, width // wanted).mean(axis=2), dtype=np.float64)
