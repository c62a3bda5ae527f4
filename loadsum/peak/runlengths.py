"""How long demand stays above a level: the model against days it has not seen."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.readings import read_only
from loadsum.peak.anyinterval import RUN_LENGTHS, any_interval, drawn_days, runs_of_at_least
from loadsum.peak.copula import DayCopula
from loadsum.peak.margins import Margins


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RunScore:
    """Runs above one level on held-out days, against the model.

    Parameters
    ----------
    copula : str
        Copula of the model, in words.
    level_kva : (B,) float64
        Level in each class of days. [kVA]
    at_least_intervals : tuple of int
        Lengths of run. [-]
    expected, observed : tuple of float
        Runs of at least each length on the held-out days. [-]
    standard_error : tuple of float
        Of the observed numbers, days taken as independent. [-]
    days : int
        Held-out days. [d]
    """

    copula: str
    level_kva: NDArray[np.float64]
    at_least_intervals: tuple[int, ...]
    expected: tuple[float, ...]
    observed: tuple[float, ...]
    standard_error: tuple[float, ...]
    days: int

    def __post_init__(self) -> None:
        read_only(self.level_kva)

    def ratio(self, length: int) -> float:
        """Observed over expected number of runs of at least so many intervals; NaN where none is expected. [-]"""
        place = self.at_least_intervals.index(length)
        return self.observed[place] / self.expected[place] if self.expected[place] > 0.0 else float("nan")


def score_runs(
    margins: Margins,
    copula: DayCopula,
    held_out_kw: Sequence[NDArray[np.float64]],
    level_kva: NDArray[np.float64],
    rng: np.random.Generator,
    *,
    temperature_c: Sequence[NDArray[np.float64]] | None = None,
) -> RunScore:
    """Runs of high demand on held-out days against what the model expects of the same days.

    Parameters
    ----------
    margins, copula
        Model made without the held-out days.
    held_out_kw : sequence of B (D, I) float64
        Sums on held-out days; days with a missing interval that the model covers are left out. [kW]
    level_kva : (B,) float64
        Level in each class of days. [kVA]
    rng : numpy.random.Generator
        Source of randomness.
    temperature_c : sequence of B (D,) float64 or None
        Temperature of the held-out days, where demand depends on it. [°C]
    """
    single = margins.exceedance(level_kva)
    expected = np.zeros(len(RUN_LENGTHS))
    seen: list[NDArray[np.float64]] = []
    for b, sums in enumerate(held_out_kw):
        known = np.isfinite(single[b, 0])
        whole = np.isfinite(sums[:, known]).all(axis=1) if known.any() else np.zeros(sums.shape[0], dtype=np.bool_)
        if not whole.any():
            continue
        kva = sums[whole] * np.hypot(1.0, margins.kvar_per_kw[b])
        above = np.where(known, kva > level_kva[b], False)
        seen.append(np.array(runs_of_at_least(above), dtype=np.float64))
        drawn = drawn_days(copula, b, rng)
        runs = np.array([any_interval(p, drawn).runs_per_day for p in single[b]])
        if margins.temperature_c is None or temperature_c is None:
            expected += runs[0] * int(whole.sum())
        else:
            warmth = temperature_c[b][whole]
            for k in range(len(RUN_LENGTHS)):
                expected[k] += float(np.interp(warmth, margins.temperature_c[b], runs[:, k]).sum())
    counts = np.concatenate(seen, axis=1) if seen else np.zeros((len(RUN_LENGTHS), 0))
    days = counts.shape[1]
    spread = counts.std(axis=1, ddof=1) * np.sqrt(days) if days > 1 else np.full(len(RUN_LENGTHS), np.nan)
    return RunScore(
        copula=copula.family,
        level_kva=level_kva,
        at_least_intervals=RUN_LENGTHS,
        expected=tuple(expected.tolist()),
        observed=tuple(counts.sum(axis=1).tolist()),
        standard_error=tuple(spread.tolist()),
        days=days,
    )
