"""How the intervals of a day move together: a copula over the intervals, from the group's own days."""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln, ndtri, stdtrit
from scipy.stats import norm, rankdata, t

from loadsum.demand.hourly import GroupDemand
from loadsum.intake.readings import read_only

SHRINKAGE = 0.10  # weight of the identity in each correlation matrix
POOLED_DAYS = 60.0  # weight of all classes together in each class's matrix, in days
SMALLEST_EIGENVALUE = 1e-6
LOWEST_LOG = -80.0  # logarithm of the smallest probability in the table of scores
TABLE = 8192  # its entries
CANDIDATES = (np.inf, 30.0, 15.0, 8.0, 5.0, 3.0)  # degrees of freedom that hold-out chooses from


@dataclass(frozen=True, kw_only=True, eq=False)
class DayCopula:
    """Dependence between the intervals of a day, one correlation matrix for each class of days.

    Parameters
    ----------
    correlation : (B, I, I) float64
        Correlation of the normal scores. [-]
    degrees_of_freedom : float
        Of the t copula; infinity is the Gaussian copula. [-]
    days : (B,) int64
        Days of readings behind each matrix before smoothing over classes. [d]
    source : str
        Where the correlation comes from, in words.
    """

    correlation: NDArray[np.float64]
    degrees_of_freedom: float
    days: NDArray[np.int64]
    source: str = "normal scores of the observed sums"

    def __post_init__(self) -> None:
        blocks, intervals, other = self.correlation.shape
        if intervals != other or blocks != self.days.size or not self.degrees_of_freedom > 0.0:
            raise ValueError(f"correlation {self.correlation.shape}, days {self.days.shape} disagree, or no freedom")
        read_only(self.correlation)
        read_only(self.days)

    @property
    def family(self) -> str:
        """Name of the copula, in words."""
        return "Gaussian" if np.isinf(self.degrees_of_freedom) else f"t, {self.degrees_of_freedom:g} degrees of freedom"

    def draw(self, block: int, days: int, rng: np.random.Generator) -> NDArray[np.float64]:
        """Random days of scores, each interval with the law of :meth:`tail`, (days, I) float64. [-]"""
        root = np.linalg.cholesky(self.correlation[block])
        score = rng.standard_normal((days, root.shape[0])) @ root.T
        if np.isfinite(self.degrees_of_freedom):
            score *= np.sqrt(self.degrees_of_freedom / rng.chisquare(self.degrees_of_freedom, days))[:, None]
        return np.asarray(score, dtype=np.float64)

    def tail(self, score: NDArray[np.float64]) -> NDArray[np.float64]:
        """Probability above a score, the shape given. [-]"""
        return np.asarray(t.sf(score, self.degrees_of_freedom), dtype=np.float64)

    def score(self, exceeded_with: NDArray[np.float64]) -> NDArray[np.float64]:
        """Score that is exceeded with each probability, the shape given. [-]"""
        if np.isinf(self.degrees_of_freedom):
            return np.asarray(-ndtri(exceeded_with), dtype=np.float64)
        score = -stdtrit(self.degrees_of_freedom, exceeded_with)
        # at zero, and below 1e-200 or so, the quantile comes as an infinity of the wrong sign
        return np.asarray(np.where(np.asarray(exceeded_with) < 0.5, np.abs(score), score), dtype=np.float64)

    def drawn_score(self, exceeded_with: NDArray[np.float64]) -> NDArray[np.float64]:
        """The same for random draws, from a table that is right to 1e-4 of the score. [-]"""
        if np.isinf(self.degrees_of_freedom) or exceeded_with.min(initial=1.0) < np.exp(LOWEST_LOG):
            return self.score(exceeded_with)
        return np.asarray(np.sinh(np.interp(np.log(exceeded_with), *self._table)), dtype=np.float64)

    @cached_property
    def _table(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Logarithm of a probability, and the inverse hyperbolic sine of its score."""
        log_p = np.linspace(LOWEST_LOG, 0.0, TABLE)
        return log_p, np.arcsinh(self.score(np.minimum(np.exp(log_p), 1.0 - 1e-12)))


def normal_scores(sums_kw: NDArray[np.float64]) -> NDArray[np.float64]:
    """Normal scores of each interval's readings among the days of their class.

    Parameters
    ----------
    sums_kw : (D, I) float64
        Time-aligned sums, or any quantity that rises with them; NaN where a customer is missing. [kW]

    Returns
    -------
    (D, I) float64
        Standard normal quantile of (rank - 1/2)/days, tied readings sharing their mean rank; NaN kept. [-]
    """
    known = np.isfinite(sums_kw)
    days = np.maximum(known.sum(axis=0), 1)
    rank = rankdata(np.where(known, sums_kw, np.inf), axis=0, method="average")
    return np.where(known, norm.ppf((np.minimum(rank, days) - 0.5) / days), np.nan)


def weather_free_sums(demand: GroupDemand) -> tuple[NDArray[np.float64], ...]:
    """Observed sums less the model's response to the day's temperature, B (D, I) float64; what a copula is fitted to.

    The paths draw a day's temperature and its demand given that temperature; what moves with the temperature must not
    be counted a second time in the dependence between intervals. Days of unknown temperature are NaN. [kW]
    """
    found = []
    for block, row, sums in zip(demand.blocks, demand.hours, demand.sums_kw, strict=True):
        free = np.array(sums)
        for i, hour in enumerate(row):
            if hour is not None and hour.response is not None and block.temperature_c is not None:
                known = np.isfinite(block.temperature_c)
                warmth = np.where(known, block.temperature_c, 0.0)
                shift, stretch = hour.response.shift_kw(warmth), hour.response.stretch(warmth)
                centre = hour.response.level_kw
                free[:, i] = np.where(known, centre + (free[:, i] - shift - centre) / stretch, np.nan)
        read_only(free)
        found.append(free)
    return tuple(found)


def fit_copula(
    sums_kw: Sequence[NDArray[np.float64]],
    *,
    degrees_of_freedom: float = np.inf,
    shrinkage: float = SHRINKAGE,
    pooled_days: float = POOLED_DAYS,
) -> DayCopula:
    """Copula over the intervals of the day, from the time-aligned sums of the group.

    Parameters
    ----------
    sums_kw : sequence of B (D, I) float64
        Observed sums, or what is left of them at the day's temperature; NaN where a customer is missing. [kW]
    degrees_of_freedom : float
        Of the t copula; infinity is the Gaussian copula. [-]
    shrinkage : float
        Weight of the identity. [-]
    pooled_days : float
        Weight, in days, of the mean matrix of all classes in each class's own. [d]

    Notes
    -----
    Each class's products of scores are added to those of all classes with a weight of ``pooled_days`` days, scaled
    to a unit diagonal, freed of negative eigenvalues (which pairs with unlike missing days can cause) and mixed
    with the identity. Intervals without readings are left independent of all others.
    """
    if not 0.0 < shrinkage < 1.0:
        raise ValueError(f"shrinkage must lie between 0 and 1, got {shrinkage}")
    intervals = sums_kw[0].shape[1]
    products, pairs, days = [], [], []
    for block in sums_kw:
        score = normal_scores(block)
        known = np.isfinite(score).astype(np.float64)
        filled = np.nan_to_num(score)
        products.append(filled.T @ filled)
        pairs.append(known.T @ known)
        days.append(int(known.any(axis=1).sum()))
    together = sum(pairs)
    pooled = np.divide(sum(products), together, out=np.zeros((intervals, intervals)), where=together > 0)
    matrices = []
    for product, pair in zip(products, pairs, strict=True):
        matrices.append(_correlation((product + pooled_days * pooled) / (pair + pooled_days), shrinkage))
    return DayCopula(
        correlation=np.array(matrices), degrees_of_freedom=degrees_of_freedom, days=np.array(days, dtype=np.int64)
    )


def choose_copula(
    sums_kw: Sequence[NDArray[np.float64]], week: Sequence[NDArray[np.int64]], *, folds: int = 2
) -> tuple[DayCopula, dict[float, float]]:
    """The copula whose degrees of freedom score best on weeks left out, and the score of each candidate.

    Parameters
    ----------
    sums_kw : sequence of B (D, I) float64
        Observed sums. [kW]
    week : sequence of B (D,) int64
        Week of each day; weeks are dealt to the folds in turn. [-]
    folds : int
        Number of folds. [-]

    Returns
    -------
    DayCopula
        Refitted on all days with the degrees of freedom chosen.
    dict of float to float
        Mean log density of the copula on a left-out day, by degrees of freedom. [nat]
    """
    total = dict.fromkeys(CANDIDATES, 0.0)
    count = 0
    for fold in range(folds):
        fitted = fit_copula([block[own % folds != fold] for block, own in zip(sums_kw, week, strict=True)])
        for b, (block, own) in enumerate(zip(sums_kw, week, strict=True)):
            level = norm.sf(normal_scores(block)[own % folds == fold])
            whole = level[np.isfinite(level).all(axis=1)]
            count += whole.shape[0]
            for freedom in CANDIDATES:
                total[freedom] += float(log_density(whole, fitted.correlation[b], freedom).sum())
    scores = {freedom: value / max(count, 1) for freedom, value in total.items()}
    best = max(scores, key=lambda freedom: scores[freedom])
    return fit_copula(sums_kw, degrees_of_freedom=best), scores


def log_density(
    exceeded_with: NDArray[np.float64], correlation: NDArray[np.float64], degrees_of_freedom: float
) -> NDArray[np.float64]:
    """Log density of a Gaussian or t copula.

    Parameters
    ----------
    exceeded_with : (D, I) float64
        Exceedance probability of each reading under its own law. [-]
    correlation : (I, I) float64
        Correlation matrix. [-]
    degrees_of_freedom : float
        Infinity for the Gaussian copula. [-]

    Returns
    -------
    (D,) float64
        Log density of each day. [nat]
    """
    if exceeded_with.size == 0:
        return np.zeros(0)
    score = t.isf(exceeded_with, degrees_of_freedom)
    root = np.linalg.cholesky(correlation)
    distance = (np.linalg.solve(root, score.T) ** 2).sum(axis=0)
    log_root = float(np.log(np.diag(root)).sum())
    size = score.shape[1]
    if np.isinf(degrees_of_freedom):
        joint = -0.5 * (distance + size * np.log(2.0 * np.pi)) - log_root
    else:
        nu = degrees_of_freedom
        joint = (
            gammaln(0.5 * (nu + size))
            - gammaln(0.5 * nu)
            - 0.5 * size * np.log(nu * np.pi)
            - log_root
            - 0.5 * (nu + size) * np.log1p(distance / nu)
        )
    return np.asarray(joint - t.logpdf(score, degrees_of_freedom).sum(axis=1), dtype=np.float64)


def _correlation(raw: NDArray[np.float64], shrinkage: float) -> NDArray[np.float64]:
    spread = np.sqrt(np.diag(raw))
    empty = spread <= 0.0
    scale = np.where(empty, 1.0, spread)
    matrix = raw / np.outer(scale, scale)
    matrix[empty] = matrix[:, empty] = 0.0
    np.fill_diagonal(matrix, 1.0)
    value, vector = np.linalg.eigh(matrix)
    matrix = (vector * np.maximum(value, SMALLEST_EIGENVALUE)) @ vector.T
    scale = np.sqrt(np.diag(matrix))
    matrix = (1.0 - shrinkage) * matrix / np.outer(scale, scale) + shrinkage * np.eye(raw.shape[0])
    np.fill_diagonal(matrix, 1.0)
    return np.asarray(0.5 * (matrix + matrix.T), dtype=np.float64)
