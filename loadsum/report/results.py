"""results.json: everything a study found, versioned, and the only thing a report is made from."""

import dataclasses
import json
import math
from collections.abc import Mapping
from dataclasses import dataclass
from enum import Enum
from typing import Any

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import BlockDiagnostics
from loadsum.demand.normalfamily import NormalFamily
from loadsum.evidence.holdout import HoldOut
from loadsum.intake.findings import Finding
from loadsum.intake.inputs import InputFile
from loadsum.intake.reconcile import Reconciliation
from loadsum.peak.diversity import Diversity
from loadsum.peak.estimated import EstimatedReadings
from loadsum.peak.peaks import Peaks
from loadsum.peak.scenarios import ScenarioResult
from loadsum.report.energybymonth import CustomerMonths
from loadsum.report.hourmap import HourMap
from loadsum.report.quality import QualityCalendar
from loadsum.study.assumptions import Assumption
from loadsum.study.tables import Heading, Person
from loadsum.transformer.headroom import Headroom
from loadsum.transformer.life import Life
from loadsum.transformer.losses import Losses
from loadsum.transformer.selection import Selection
from loadsum.transformer.whatmoves import WhatMoves

SCHEMA_VERSION = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class Coverage:
    """What part of the year the readings speak for.

    Parameters
    ----------
    first_day, last_day : str
        First and last local day with readings, ISO 8601.
    days : int
        Days with readings. [d]
    hours_in_year, covered_hours : float
        Hours of an average year, and of those the hours whose season, day type and interval have readings. [h]
    uncovered : tuple of str
        Classes without readings, in words.
    whole_year : bool
        Whether annual figures speak for the whole year.
    """

    first_day: str
    last_day: str
    days: int
    hours_in_year: float
    covered_hours: float
    uncovered: tuple[str, ...]
    whole_year: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class CustomerRow:
    """One customer as the report lists it, under its pseudonym unless the user asked otherwise."""

    id: str
    customer_class: str
    role: str
    readings: int
    days: int
    mean_kw: float
    max_kw: float
    annual_kwh: float


@dataclass(frozen=True, slots=True, kw_only=True)
class HourRow:
    """Distribution of the coincident demand in one demand interval of one season and day type."""

    season: str
    day_type: str
    interval: int
    starts: str
    hours_per_year: float
    n_days: int
    mean_kw: float
    sd_kw: float
    skewness: float
    q50_kw: float
    q90_kw: float
    q99_kw: float
    q999_kw: float
    floor: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Curve:
    """Exceedance of coincident demand averaged over the covered hours of the year, against level.

    Parameters
    ----------
    levels_kw : (L,) float64
        Levels. [kW]
    adopted, lower, upper : (L,) float64
        Adopted model and its arithmetic bracket. [-]
    independent : (L,) float64
        Exact convolution of independent customers. [-]
    normal : (L,) float64
        Normal law with the covariance of the customers. [-]
    normal_independent : (L,) float64
        Normal law of independent customers. [-]
    observed : (L,) float64
        Share of observed sums above the level, each class of days weighted by its hours. [-]
    floor : float
        Smallest share of all demand intervals that the record supports: one week in which such demand occurs. [-]
    """

    levels_kw: NDArray[np.float64]
    adopted: NDArray[np.float64]
    lower: NDArray[np.float64]
    upper: NDArray[np.float64]
    independent: NDArray[np.float64]
    normal: NDArray[np.float64]
    normal_independent: NDArray[np.float64]
    observed: NDArray[np.float64]
    floor: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Program:
    """What made the results, to the version."""

    name: str
    version: str
    python: str
    dependencies: Mapping[str, str]


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """A demand interval of a class of days."""

    season: str
    day_type: str
    interval: int
    starts: str


@dataclass(frozen=True, slots=True, kw_only=True)
class ExceedanceRow:
    """One rating under one of its limits, as page 1 and the table of ratings print it.

    Parameters
    ----------
    rating_kva : float
        Nameplate rating. [kVA]
    of : str
        Limit that the exceedance is of: nameplate, or allowed loading.
    level_kva : float
        The limit; the lowest of the seasons' where they differ. [kVA]
    hours_per_year, hours_low, hours_high : float
        Expected exceedance hours in the covered hours of a year, and their interval. [h]
    hours_lower, hours_upper : float
        Bracket of the expected hours that rounding readings to the lattice leaves. [h]
    highest_probability, highest_low, highest_high : float
        Largest probability of any demand interval, and its interval. [-]
    floor : float
        Smallest probability that the record supports there. [-]
    highest_at : Place or None
        Where it is largest.
    normal_factor : float
        The normal law's answer over the year divided by the adopted model's. [-]
    """

    rating_kva: float
    of: str
    level_kva: float
    hours_per_year: float
    hours_low: float
    hours_high: float
    hours_lower: float
    hours_upper: float
    highest_probability: float
    highest_low: float
    highest_high: float
    floor: float
    highest_at: Place | None
    normal_factor: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TransformerResults:
    """What was found for one transformer; a part that was not computed is null.

    Parameters
    ----------
    id : str
        Asset number.
    reason : str
        Why there are no results, where the transformer could not be studied; empty otherwise.
    """

    id: str
    reason: str = ""
    installed_kva: float = 0.0
    phases: int = 1
    power_factor: float = 1.0
    ratings_kva: tuple[float, ...] = ()
    coverage: Coverage | None = None
    customers: tuple[CustomerRow, ...] = ()
    hours: tuple[HourRow, ...] = ()
    curve: Curve | None = None
    normal_family: NormalFamily | None = None
    exceedance: tuple[ExceedanceRow, ...] = ()
    estimated: EstimatedReadings | None = None
    hour_map: HourMap | None = None
    selection: Selection | None = None
    what_moves: WhatMoves | None = None
    peaks: Peaks | None = None
    diversity: Diversity | None = None
    scenarios: tuple[ScenarioResult, ...] = ()
    headroom: tuple[Headroom, ...] = ()
    thermal: Life | None = None
    thermal_beside: Life | None = None
    losses: Losses | None = None
    evidence: HoldOut | None = None
    diagnostics: tuple[BlockDiagnostics, ...] = ()
    assumptions: tuple[Assumption, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StudyResults:
    """Everything a study found.

    Parameters
    ----------
    pseudonymised : bool
        Whether customers stand under pseudonyms; the report says which it is.
    """

    schema_version: int
    program: Program
    study: Heading
    people: tuple[Person, ...]
    seed: int
    inputs: tuple[InputFile, ...]
    findings: tuple[Finding, ...]
    quality: QualityCalendar
    transformers: tuple[TransformerResults, ...]
    months: tuple[CustomerMonths, ...] = ()
    reconciliation: tuple[Reconciliation, ...] = ()
    pseudonymised: bool = False


def encode(value: Any) -> Any:
    """A value of the result types as JSON knows it: fields to keys, arrays to lists, what is not a number to null."""
    if value is None or isinstance(value, bool | int | str):
        return value
    if isinstance(value, float | np.floating):
        return float(value) if math.isfinite(value) else None
    if isinstance(value, np.integer):
        return int(value)
    if isinstance(value, np.bool_):
        return bool(value)
    if isinstance(value, Enum):
        return value.value
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {f.name: encode(getattr(value, f.name)) for f in dataclasses.fields(value)}
    if isinstance(value, np.ndarray):
        return encode(value.tolist())
    if isinstance(value, Mapping):
        return {str(k): encode(v) for k, v in value.items()}
    if isinstance(value, tuple | list | frozenset | set):
        return [encode(v) for v in (sorted(value) if isinstance(value, frozenset | set) else value)]
    raise TypeError(f"results cannot hold a {type(value).__name__}")


def to_json(results: Mapping[str, Any]) -> str:
    """Results as JSON text: sorted keys, no NaN, one line feed at the end; the same results give the same bytes."""
    return json.dumps(results, sort_keys=True, allow_nan=False, ensure_ascii=False, indent=1) + "\n"
