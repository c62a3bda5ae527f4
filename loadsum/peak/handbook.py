"""Handbook formulas of diversity: definitions, and the laws that planners draw."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray


def coincidence_factor(group_maximum_kw: float, individual_maxima_kw: Sequence[float]) -> float:
    """Maximum of the group over the sum of its customers' own maxima in the same period, F_c; at most 1. [-]

    References
    ----------
    .. [1] IEC 60050-691, 691-10-04 (number as quoted in an open restatement).
    """
    return float(group_maximum_kw / np.sum(individual_maxima_kw))


def diversity_factor(group_maximum_kw: float, individual_maxima_kw: Sequence[float]) -> float:
    """Sum of the customers' own maxima over the maximum of the group, F_D = 1/F_c; at least 1. [-]

    References
    ----------
    .. [1] T. Gonen, Electric Power Distribution System Engineering, ch. 2.
    """
    return 1.0 / coincidence_factor(group_maximum_kw, individual_maxima_kw)


def load_diversity_kw(group_maximum_kw: float, individual_maxima_kw: Sequence[float]) -> float:
    """Sum of the customers' own maxima less the maximum of the group, LD. [kW]"""
    return float(np.sum(individual_maxima_kw) - group_maximum_kw)


def load_factor(energy_kwh: float, maximum_kw: float, period_h: float) -> float:
    """Average demand over maximum demand in the same period, F_LD. [-]"""
    return energy_kwh / period_h / maximum_kw


def loss_factor(demand_kw: NDArray[np.float64]) -> float:
    """Average loss over loss at maximum demand, F_LS, with loss as the square of demand. [-]"""
    return float(np.mean(np.square(demand_kw)) / np.max(np.abs(demand_kw)) ** 2)


def loss_factor_from(load_factor: float, linear: float = 0.3) -> float:
    """Loss factor by the customary mix k F_LD + (1 - k) F_LD². [-]

    References
    ----------
    .. [1] T. Gonen, Electric Power Distribution System Engineering, ch. 2, example 2.9: k = 0.3.
    """
    return linear * load_factor + (1.0 - linear) * load_factor**2


def utilisation_factor(maximum_kva: float, rating_kva: float) -> float:
    """Maximum demand over rated capacity. [-]"""
    return maximum_kva / rating_kva


def contribution_factors(
    at_group_maximum_kw: NDArray[np.float64], individual_maxima_kw: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Demand of each customer at the group's maximum over its own maximum, c_i, (C,) float64; NaN without load. [-]

    The coincidence factor is their mean weighted with the maxima (T. Gonen, ch. 2; from memory).
    """
    own = np.asarray(individual_maxima_kw, dtype=np.float64)
    share = np.divide(at_group_maximum_kw, own, out=np.full(own.shape, np.nan), where=own > 0.0)
    return np.asarray(share, dtype=np.float64)


def diversified_kw(individual_kw: float, customers: int, demand_factor: float, diversity_factor: float) -> float:
    """Maximum of a group from connected load: n P f_d / F_D (T. Gonen, ch. 2, example 2.3). [kW]"""
    return customers * individual_kw * demand_factor / diversity_factor


def appliance_kw(
    customers: int, each_kw: Sequence[float], saturation: Sequence[float], hourly_share: Sequence[float]
) -> float:
    """Demand of a group at one hour from average maxima of appliances: n sum P_a s_a v_a.

    Parameters
    ----------
    customers : int
        Number of customers. [-]
    each_kw : sequence of float
        Average maximum diversified demand of each appliance. [kW]
    saturation : sequence of float
        Share of the customers that have it. [-]
    hourly_share : sequence of float
        Share of its maximum at the hour; 1 for the maximum itself. [-]

    References
    ----------
    .. [1] T. Gonen, Electric Power Distribution System Engineering, ch. 2, residential example.
    """
    return customers * float(np.sum(np.prod([each_kw, saturation, hourly_share], axis=0)))


def rusck_coincidence(customers: NDArray[np.float64] | float, coincidence_of_many: float) -> NDArray[np.float64]:
    """Square-root law: c_n = c + (1 - c)/sqrt(n). [-]

    References
    ----------
    .. [1] S. Rusck, "The simultaneous demand in distribution network supplying domestic consumers", ASEA Journal 29
       (1956) 59-61 (from memory).
    """
    return np.asarray(coincidence_of_many + (1.0 - coincidence_of_many) / np.sqrt(customers), dtype=np.float64)


def velander_kw(
    energy_kwh: NDArray[np.float64] | float, k1_kw_per_kwh: float, k2_kw_per_sqrt_kwh: float
) -> NDArray[np.float64]:
    """Two-term law: P = k1 W + k2 sqrt(W) with the energy W per year. [kW]

    References
    ----------
    .. [1] S. Velander, Teknisk Tidskrift (1952) (from memory). Coefficients are the user's: none is known from a
       source that could be read.
    """
    return np.asarray(k1_kw_per_kwh * energy_kwh + k2_kw_per_sqrt_kwh * np.sqrt(energy_kwh), dtype=np.float64)


def normal_law_kw(customers: int, mean_kw: float, spread_kw: float, z: float, correlation: float = 0.0) -> float:
    """Quantile of the sum of like customers by the normal law: N mu + z sigma sqrt(N + N(N-1) rho). [kW]

    Without correlation the square-root and the two-term law are both exactly this, with
    c = mu/(mu + z sigma) and k1 = mu/E, k2 = z sigma/sqrt(E).
    """
    return float(customers * mean_kw + z * spread_kw * np.sqrt(customers + customers * (customers - 1) * correlation))


def table_factor(customers: int, smallest: Sequence[int], factor: Sequence[float]) -> float:
    """Factor of the row of a table in which a number of customers falls; NaN below its first row. [-]"""
    row = int(np.searchsorted(smallest, customers, side="right")) - 1
    return float("nan") if row < 0 else float(factor[row])


def within_years(one_year_in: float, years: int) -> float:
    """Probability that a level passed in 1 year of T is passed within n years, independent of each other. [-]"""
    return 1.0 - (1.0 - 1.0 / one_year_in) ** years
