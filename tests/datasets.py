"""Real meter data that the package registry carries; read as files, never imported, never vendored."""

import datetime as dt
import importlib.util
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

# CityLearn 1.8.0 (MIT): 17 homes, hourly, one year. Its first row is hour 24 of a Sunday, 31 July (Month 7, Day Type 7)
# the readings were taken in 2016 and 2017, so the series starts on 2016-07-31 at 23:00.
FIRST_STAMP = dt.datetime(2016, 7, 31, 23)


def package_file(package: str, relative: str) -> Path:
    """Path of a data file inside an installed package; skips the test with the reason where it is absent."""
    spec = importlib.util.find_spec(package)
    if spec is None or not spec.submodule_search_locations:
        pytest.skip(f"the package {package} is not installed (pip install --no-deps)")
    path = Path(next(iter(spec.submodule_search_locations))) / relative
    if not path.exists():
        pytest.skip(f"the installed {package} has no {relative}")
    return path


def real_homes() -> tuple[tuple[str, ...], NDArray[np.float64]]:
    """Identifiers and hourly demand of 17 homes over a year, (17, 8760) float64. [kW]"""
    names, rows = [], []
    for number in range(1, 18):
        path = package_file("citylearn", f"data/citylearn_challenge_2022_phase_all/Building_{number}.csv")
        header, *lines = path.read_text(encoding="utf-8").splitlines()
        column = header.split(",").index("Equipment Electric Power [kWh]")
        names.append(f"B{number:02d}")
        rows.append([float(line.split(",")[column]) for line in lines])
    return tuple(names), np.array(rows)


def real_homes_temperature() -> NDArray[np.float64]:
    """Hourly outdoor temperature beside the 17 homes, (8760,) float64. [°C]"""
    path = package_file("citylearn", "data/citylearn_challenge_2022_phase_all/weather.csv")
    header, *lines = path.read_text(encoding="utf-8").splitlines()
    column = header.split(",").index("Outdoor Drybulb Temperature [C]")
    return np.array([float(line.split(",")[column]) for line in lines])
