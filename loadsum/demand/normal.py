"""The normal law for a sum of demands, its refinements, and how far it can be from the truth."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.stats import norm

from loadsum.demand.convolution import DemandSum
from loadsum.demand.saddlepoint import lattice_saddlepoint

BERRY_ESSEEN = 0.5600  # Shevtsova (2010), unlike terms; read in the source
BERRY_ESSEEN_LIKE = (
    (0.4690, 0.0),
    (0.3322, 0.429),
    (0.3031, 0.646),
)  # Shevtsova (2013), like terms; so


def normal_exceedance(level_kw: float, mean_kw: float, variance_kw2: float) -> float:
    """Probability above a level by the central limit theorem. [-]

    Parameters
    ----------
    level_kw, mean_kw : float
        Level and mean of the sum. [kW]
    variance_kw2 : float
        Variance of the sum: the customers' variances added, or with their covariances. [kW²]
    """
    if variance_kw2 == 0.0:
        return float(mean_kw > level_kw)
    return float(norm.sf((level_kw - mean_kw) / np.sqrt(variance_kw2)))


def edgeworth_exceedance(
    level_kw: float, mean_kw: float, variance_kw2: float, skewness: float, excess_kurtosis: float | None = None
) -> float:
    """Probability above a level with the third, and where given the fourth cumulant. [-]

    Parameters
    ----------
    level_kw, mean_kw, variance_kw2 : float
        Level, mean and variance of the sum. [kW, kW, kW²]
    skewness : float
        Skewness of the sum. [-]
    excess_kurtosis : float or None
        Excess kurtosis of the sum; None stops at the third cumulant. [-]

    Notes
    -----
    Not a distribution: the value can leave the range from 0 to 1 and is returned as it is.
    """
    z = (level_kw - mean_kw) / np.sqrt(variance_kw2)
    correction = skewness / 6.0 * (z**2 - 1.0)
    if excess_kurtosis is not None:
        correction += excess_kurtosis / 24.0 * (z**3 - 3.0 * z) + skewness**2 / 72.0 * (z**5 - 10.0 * z**3 + 15.0 * z)
    return float(norm.sf(z) + norm.pdf(z) * correction)


def cornish_fisher_kw(
    exceeded_with: float, mean_kw: float, variance_kw2: float, skewness: float, excess_kurtosis: float | None = None
) -> float:
    """Level exceeded with a probability, from the first three or four cumulants. [kW]

    Parameters
    ----------
    exceeded_with : float
        Probability above the level. [-]
    mean_kw, variance_kw2 : float
        Mean and variance of the sum. [kW, kW²]
    skewness : float
        Skewness of the sum. [-]
    excess_kurtosis : float or None
        Excess kurtosis of the sum; None stops at the third cumulant. [-]

    References
    ----------
    .. [1] E. A. Cornish, R. A. Fisher, "Moments and cumulants in the specification of distributions", 1938.
    """
    z = float(norm.isf(exceeded_with))
    w = z + (z**2 - 1.0) * skewness / 6.0
    if excess_kurtosis is not None:
        w += (z**3 - 3.0 * z) * excess_kurtosis / 24.0 - (2.0 * z**3 - 5.0 * z) * skewness**2 / 36.0
    return float(mean_kw + w * np.sqrt(variance_kw2))


def berry_esseen_bound(total: DemandSum, constant: float = BERRY_ESSEEN) -> float:
    """Largest possible distance between the distribution of a sum and the normal law with its mean and variance. [-]

    Parameters
    ----------
    total : DemandSum
        Sum of independent terms, like or unlike.
    constant : float
        Constant of the inequality for unlike terms. [-]

    Notes
    -----
    The bound is absolute: where the probabilities of interest are below it, it says nothing about them.

    References
    ----------
    .. [1] I. G. Shevtsova, 2010: constant 0.5600. A smaller one, 0.5583 (2013), is known from memory only.
    """
    third = second = 0.0
    for term, count in zip(total.terms, total.counts, strict=True):
        away = term.points_kw - term.mean_kw()
        second += count * float(away**2 @ term.mass)
        third += count * float(np.abs(away) ** 3 @ term.mass)
    if second == 0.0:
        raise ValueError("the sum is a constant; no normal law has its variance")
    return float(constant * third / second**1.5)


def berry_esseen_bound_of_like_terms(count: int, third_ratio: float) -> float:
    """The same bound for independent copies of one term. [-]

    Parameters
    ----------
    count : int
        Number of copies. [-]
    third_ratio : float
        ``E|X - mean|^3 / sd^3`` of one copy. [-]

    References
    ----------
    .. [1] I. G. Shevtsova, Inform. Primen. 7(1), 2013, 124-125.
    """
    return min(a * (third_ratio + b) for a, b in BERRY_ESSEEN_LIKE) / float(np.sqrt(count))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class NormalComparison:
    """Probabilities above levels: exact, and by the normal law and its refinements.

    Parameters
    ----------
    levels_kw : (L,) float64
        Levels. [kW]
    exact : (L,) float64
        By exact convolution. [-]
    normal_independent : (L,) float64
        By the normal law with the customers' variances added. [-]
    normal_covariance : (L,) float64
        By the normal law with the variance of the model, covariances included. [-]
    cumulant_corrected : (L,) float64
        With the third and fourth cumulant of the model; can be negative. [-]
    saddlepoint : (L,) float64
        By the lattice form of the saddlepoint formula; NaN beyond the largest possible demand. [-]
    normal_too_small : (L,) float64
        How many times the exact probability is that of the normal law with covariance. [-]
    largest_distance : float
        Berry-Esseen bound on the distance between the two distributions, for independent terms. [-]
    """

    levels_kw: NDArray[np.float64]
    exact: NDArray[np.float64]
    normal_independent: NDArray[np.float64]
    normal_covariance: NDArray[np.float64]
    cumulant_corrected: NDArray[np.float64]
    saddlepoint: NDArray[np.float64]
    normal_too_small: NDArray[np.float64]
    largest_distance: float

    def __post_init__(self) -> None:
        for name in self.__slots__[:-1]:
            getattr(self, name).flags.writeable = False


def normal_comparison(
    total: DemandSum, levels_kw: NDArray[np.float64], independent_variance_kw2: float
) -> NormalComparison:
    """Exact probabilities above levels beside those of the normal family.

    Parameters
    ----------
    total : DemandSum
        The adopted sum, common component included.
    levels_kw : (L,) float64
        Levels. [kW]
    independent_variance_kw2 : float
        Variance of the sum if the customers were independent. [kW²]
    """
    mean, variance = total.mean_kw(), total.variance_kw2()
    skewness, kurtosis = total.skewness(), total.excess_kurtosis()
    levels = np.asarray(levels_kw, dtype=np.float64).copy()
    exact = total.above_many(levels)
    with_covariance = np.array([normal_exceedance(float(level), mean, variance) for level in levels])
    with np.errstate(divide="ignore", invalid="ignore"):
        too_small = exact / with_covariance
    return NormalComparison(
        levels_kw=levels,
        exact=exact,
        normal_independent=np.array([normal_exceedance(float(x), mean, independent_variance_kw2) for x in levels]),
        normal_covariance=with_covariance,
        cumulant_corrected=np.array(
            [edgeworth_exceedance(float(x), mean, variance, skewness, kurtosis) for x in levels]
        ),
        saddlepoint=np.array([lattice_saddlepoint(total, float(level)) for level in levels]),
        normal_too_small=too_small,
        largest_distance=berry_esseen_bound(total),
    )
