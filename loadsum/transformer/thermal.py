"""Top-oil and hot-spot temperature by the two loading guides, over long series of loading and ambient.

Both guides' equations are linear in the temperatures once the loading of an interval is given, so each interval is
solved exactly by its exponential: no step is too long for the winding time constant, and nothing is subdivided. What a
long interval does hide is the overload inside it, which the report says.
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

Guide = Literal["IEEE C57.91", "IEC 60076-7"]


@dataclass(frozen=True, slots=True, kw_only=True)
class ThermalData:
    """Thermal data of a transformer, per unit of its own rating.

    Parameters
    ----------
    top_oil_rise_k : float
        Top-oil rise over ambient at rated load. [K]
    hot_spot_gradient_k : float
        Hot-spot rise over top oil at rated load. [K]
    loss_ratio : float
        Load losses at rated load over no-load losses, R. [-]
    oil_exponent : float
        n (IEEE) or x (IEC). [-]
    winding_exponent : float
        m (IEEE, used as 2 m) or y (IEC). [-]
    oil_time_constant_min, winding_time_constant_min : float
        At rated load. [min]
    k11, k21, k22 : float
        Constants of IEC 60076-7; 1 leaves simple lags. [-]
    """

    top_oil_rise_k: float
    hot_spot_gradient_k: float
    loss_ratio: float
    oil_exponent: float
    winding_exponent: float
    oil_time_constant_min: float
    winding_time_constant_min: float
    k11: float = 1.0
    k21: float = 1.0
    k22: float = 1.0


def oil_time_constant_h(
    core_and_coil_lb: float, tank_lb: float, oil_gal: float, rise_k: float, losses_w: float
) -> float:
    """Top-oil time constant at rated load of a unit with natural or forced air, oil not directed. [lb, gal, K, W -> h]

    References
    ----------
    .. [1] IEEE C57.91, clause 7, as published openly with the 2024 edition (source_read).
    """
    capacity = 0.06 * core_and_coil_lb + 0.04 * tank_lb + 1.33 * oil_gal
    return capacity * rise_k / losses_w


def steady_top_oil_rise(loading_pu: NDArray[np.float64], data: ThermalData) -> NDArray[np.float64]:
    """Top-oil rise over ambient that a steady loading ends at. [pu -> K]"""
    K, R = np.abs(loading_pu), data.loss_ratio
    return np.asarray(data.top_oil_rise_k * ((K**2 * R + 1.0) / (R + 1.0)) ** data.oil_exponent, dtype=np.float64)


def steady_gradient(loading_pu: NDArray[np.float64], data: ThermalData, guide: Guide) -> NDArray[np.float64]:
    """Hot-spot rise over top oil that a steady loading ends at. [pu -> K]"""
    power = 2.0 * data.winding_exponent if guide == "IEEE C57.91" else data.winding_exponent
    return np.asarray(data.hot_spot_gradient_k * np.abs(loading_pu) ** power, dtype=np.float64)


def temperatures(
    loading_pu: NDArray[np.float64],
    ambient_c: NDArray[np.float64],
    interval_min: float,
    data: ThermalData,
    guide: Guide,
    *,
    start_pu: NDArray[np.float64] | None = None,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Top-oil and hot-spot temperature at the end of each interval.

    Parameters
    ----------
    loading_pu : (..., T) float64
        Loading of each interval, magnitude of apparent power over rating. [pu]
    ambient_c : (..., T) float64
        Ambient temperature of the same intervals. [°C]
    interval_min : float
        Length of an interval. [min]
    data : ThermalData
        Thermal data of the transformer.
    guide : {"IEEE C57.91", "IEC 60076-7"}
        Whose equations.
    start_pu : (...) float64 or None
        Steady loading before the first interval; the mean loading when None. [pu]

    Returns
    -------
    top_oil_c, hot_spot_c : (..., T) float64
        Temperatures. [°C]

    References
    ----------
    .. [1] IEEE C57.91, clause 7 (exponential equations, as published openly with the 2024 edition).
    .. [2] IEC 60076-7, difference equations, in the limit of short steps (parameters read in a restatement).
    """
    before = np.asarray(loading_pu.mean(axis=-1) if start_pu is None else start_pu, dtype=np.float64)[..., None]
    rise = steady_top_oil_rise(loading_pu, data)
    gradient = steady_gradient(loading_pu, data, guide)
    rise_0, gradient_0 = steady_top_oil_rise(before, data), steady_gradient(before, data, guide)
    if guide == "IEEE C57.91":
        oil = ambient_c + _lagged(rise, rise_0, interval_min / data.oil_time_constant_min)
        hot = oil + _lagged(gradient, gradient_0, interval_min / data.winding_time_constant_min)
        return oil, hot
    tau_o, tau_w = data.oil_time_constant_min, data.winding_time_constant_min
    oil = _lagged(rise + ambient_c, rise_0 + ambient_c[..., :1], interval_min / (data.k11 * tau_o))
    quick = _lagged(data.k21 * gradient, data.k21 * gradient_0, interval_min / (data.k22 * tau_w))
    slow = _lagged((data.k21 - 1.0) * gradient, (data.k21 - 1.0) * gradient_0, interval_min * data.k22 / tau_o)
    return oil, oil + quick - slow


def _lagged(ultimate: NDArray[np.float64], initial: NDArray[np.float64], lengths: float) -> NDArray[np.float64]:
    """First-order lag towards the ultimate value of each interval, interval length in time constants."""
    keep = np.exp(-lengths)
    return np.asarray(lfilter([1.0 - keep], [1.0, -keep], ultimate, axis=-1, zi=keep * initial)[0], dtype=np.float64)
