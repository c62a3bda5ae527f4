"""Scores of a forecast distribution against what came."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from loadsum.demand.lattice import LatticeMass


def pinball(level_kw: NDArray[np.float64], observed_kw: NDArray[np.float64], share: float) -> NDArray[np.float64]:
    """Loss of a level that is meant to lie above a share of what comes, (n,) float64. [kW]

    References
    ----------
    .. [1] Koenker and Bassett, Regression quantiles, Econometrica 46 (1978) 33-50.
    """
    away = observed_kw - level_kw
    return np.asarray(np.where(away > 0.0, share * away, (share - 1.0) * away), dtype=np.float64)


def crps_normal(
    mean_kw: NDArray[np.float64], spread_kw: NDArray[np.float64], observed_kw: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Continuous ranked probability score of a normal law, (n,) float64. [kW]

    References
    ----------
    .. [1] Gneiting and Raftery, Strictly proper scoring rules, JASA 102 (2007) 359-378, eq. 21.
    """
    w = (observed_kw - mean_kw) / spread_kw
    density = np.exp(-0.5 * w**2) / np.sqrt(2.0 * np.pi)
    return np.asarray(spread_kw * (w * (2.0 * ndtr(w) - 1.0) + 2.0 * density - 1.0 / np.sqrt(np.pi)), dtype=np.float64)


def crps_lattice(law: LatticeMass, observed_kw: NDArray[np.float64]) -> NDArray[np.float64]:
    """Continuous ranked probability score of a lattice law, (n,) float64. [kW]

    The integral of the squared difference between the distribution function and the step at the observation,
    computed exactly between lattice points.
    """
    points, step = law.points_kw, law.step_kw
    below = np.minimum(np.cumsum(law.mass), 1.0)
    left = np.concatenate([[0.0], np.cumsum(below[:-1] ** 2) * step])
    right = np.concatenate([np.cumsum(((1.0 - below[:-1]) ** 2)[::-1])[::-1] * step, [0.0]])
    place = np.searchsorted(points, observed_kw, side="right") - 1
    inside = np.clip(place, 0, points.size - 1)
    part = np.clip(observed_kw - points[inside], 0.0, step)
    at = below[inside]
    score = left[inside] + part * at**2 + right[inside] - part * (1.0 - at) ** 2
    score = np.where(observed_kw >= points[-1], left[-1] + observed_kw - points[-1], score)
    return np.asarray(np.where(observed_kw < points[0], points[0] - observed_kw + right[0], score), dtype=np.float64)


def crps_sample(sample_kw: NDArray[np.float64], observed_kw: NDArray[np.float64]) -> NDArray[np.float64]:
    """Continuous ranked probability score of the empirical law of a sample, (n,) float64. [kW]"""
    ordered = np.sort(sample_kw)
    n = ordered.size
    apart = 2.0 * float((np.arange(1, n + 1) * 2 - n - 1) @ ordered) / n**2
    near = np.abs(observed_kw[:, None] - ordered).mean(axis=1)
    return np.asarray(near - 0.5 * apart, dtype=np.float64)


@dataclass(frozen=True, slots=True, kw_only=True)
class Brier:
    """Mean squared error of forecast probabilities, and its parts: score = reliability - resolution + uncertainty."""

    score: float
    reliability: float
    resolution: float
    uncertainty: float


def brier(forecast: NDArray[np.float64], came: NDArray[np.float64]) -> Brier:
    """Brier score and its decomposition over the distinct forecasts.

    References
    ----------
    .. [1] Brier, Monthly Weather Review 78 (1950) 1-3; Murphy, J. Applied Meteorology 12 (1973) 595-600 (from memory).
    """
    overall = float(came.mean())
    _, place = np.unique(forecast, return_inverse=True)
    count = np.bincount(place)
    said, found = (np.bincount(place, weights=values) / count for values in (forecast, came))
    return Brier(
        score=float(((forecast - came) ** 2).mean()),
        reliability=float(count @ (said - found) ** 2) / came.size,
        resolution=float(count @ (found - overall) ** 2) / came.size,
        uncertainty=overall * (1.0 - overall),
    )


def randomised_pit(law: LatticeMass, observed_kw: NDArray[np.float64], rng: np.random.Generator) -> NDArray[np.float64]:
    """Probability integral transform, uniform if the law is right, jumps spread at random, (n,) float64. [-]

    References
    ----------
    .. [1] Czado, Gneiting and Held, Biometrics 65 (2009) 1254-1261 (from memory).
    """
    below = law.below_many(observed_kw)
    at_most = 1.0 - law.above_many(observed_kw)
    return np.asarray(below + rng.random(observed_kw.size) * np.maximum(at_most - below, 0.0), dtype=np.float64)
