"""Highest temperatures and ageing of long runs of load, for many ratings at once."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

from loadsum.intake.readings import read_only
from loadsum.transformer.ageing import Paper, relative_ageing_rate
from loadsum.transformer.thermal import Guide, ThermalData, steady_top_oil_rise

NEGLIGIBLE_K = 0.05  # what the start may still change after the warm-up [K]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RunFigures:
    """What each run of load does to each rating, warm-up left out.

    Parameters
    ----------
    top_oil_c, hot_spot_c : (S, R) float64
        Highest temperature of run s at rating r. [°C]
    ageing_pu : (S, R) float64
        Mean relative ageing rate. [-]
    """

    top_oil_c: NDArray[np.float64]
    hot_spot_c: NDArray[np.float64]
    ageing_pu: NDArray[np.float64]

    def __post_init__(self) -> None:
        for array in (self.top_oil_c, self.hot_spot_c, self.ageing_pu):
            read_only(array)


def parts_of(interval_min: float, data: ThermalData) -> int:
    """Parts of an interval at whose ends temperatures are looked at: even, none longer than the winding's constant.

    Temperatures are exact at any instant, whatever the parts; ageing is integrated over them by Simpson's rule.
    """
    return 2 * int(np.ceil(interval_min / (2.0 * data.winding_time_constant_min)))


def warm_up_days(data: ThermalData, guide: Guide) -> int:
    """Whole days after which the start changes the hot spot by no more than 0.05 K. [d]"""
    days = 1
    while start_left_k(data, guide, days) > NEGLIGIBLE_K:
        days += 1
    return days


def start_left_k(data: ThermalData, guide: Guide, days: float) -> float:
    """Most that a start at no load or at rated load can still change the hot spot after so many days. [d -> K]

    The lags are linear, so that the difference between two starts decays whatever the load does meanwhile; the parts of
    the difference are added in magnitude.
    """
    apart = data.top_oil_rise_k - float(steady_top_oil_rise(np.zeros(1), data)[0])
    oil_min = data.oil_time_constant_min * (1.0 if guide == "IEEE C57.91" else data.k11)
    left = apart * np.exp(-1440.0 * days / oil_min)
    for gain, constant_min in _winding_lags(data, guide):
        left += abs(gain) * data.hot_spot_gradient_k * np.exp(-1440.0 * days / constant_min)
    return float(left)


def run_figures(
    kva: NDArray[np.float64],
    ambient_c: NDArray[np.float64],
    interval_min: float,
    ratings_kva: NDArray[np.float64],
    data: ThermalData,
    guide: Guide,
    paper: Paper,
    *,
    warm_up: int = 0,
    parts: int = 2,
) -> RunFigures:
    """Highest top oil and hot spot, and mean ageing, of every run at every rating.

    Parameters
    ----------
    kva : (S, T) float64
        Apparent power of each run, continuous from its first interval to its last. [kVA]
    ambient_c : (S, T) float64
        Ambient temperature of the same intervals. [°C]
    interval_min : float
        Length of an interval. [min]
    ratings_kva : (R,) float64
        Ratings that count, after any derating. [kVA]
    data : ThermalData
        Thermal data, the same per unit for every rating.
    guide, paper : str
        Loading guide and insulation paper.
    warm_up : int
        Intervals at the start that count for nothing; the start itself is the steady state of the mean load. [-]
    parts : int
        Even number of parts of each interval at whose ends temperatures are looked at. [-]

    Raises
    ------
    ValueError
        Shapes disagree, parts are odd, or the warm-up leaves nothing.

    Notes
    -----
    The gradient of the winding goes by a power of the load, so that its lags are worked out once for all ratings and
    scaled; only the oil is worked out for each.
    """
    if kva.shape != ambient_c.shape or kva.ndim != 2:
        raise ValueError(f"load {kva.shape} and ambient {ambient_c.shape} must be runs x intervals alike")
    if parts < 2 or parts % 2 or not 0 <= warm_up < kva.shape[1]:
        raise ValueError(f"need an even number of parts and a warm-up shorter than the run, got {parts}, {warm_up}")
    runs, sizes = kva.shape[0], ratings_kva.size
    found = {name: np.empty((runs, sizes)) for name in ("top_oil_c", "hot_spot_c", "ageing_pu")}
    for s in range(runs):
        for r, row in enumerate(
            _one_run(kva[s], ambient_c[s], interval_min, ratings_kva, data, guide, paper, warm_up, parts)
        ):
            found["top_oil_c"][s, r], found["hot_spot_c"][s, r], found["ageing_pu"][s, r] = row
    return RunFigures(**found)


def _one_run(
    kva: NDArray[np.float64],
    air: NDArray[np.float64],
    interval_min: float,
    ratings_kva: NDArray[np.float64],
    data: ThermalData,
    guide: Guide,
    paper: Paper,
    warm_up: int,
    parts: int,
) -> list[tuple[float, float, float]]:
    ieee = guide == "IEEE C57.91"
    power = 2.0 * data.winding_exponent if ieee else data.winding_exponent
    load_power = np.abs(kva) ** power
    kept = slice(warm_up, None)
    steps = np.arange(parts + 1) / parts
    weights = np.where(np.arange(parts + 1) % 2 == 1, 4.0, 2.0)
    weights[[0, -1]] = 1.0
    weights /= 3.0 * parts
    mean = float(np.abs(kva).mean())
    winding = [np.zeros(kva[kept].size) for _ in steps]  # per unit of rated gradient, times rating to the power
    for gain, constant_min in _winding_lags(data, guide):
        _add_lag(winding, gain * load_power, gain * mean**power, interval_min / constant_min, steps, kept)
    oil_lengths = interval_min / (data.oil_time_constant_min * (1.0 if ieee else data.k11))
    outside = air[kept] if ieee else np.zeros(1)
    rows = []
    for rating in ratings_kva.tolist():
        ultimate = steady_top_oil_rise(kva / rating, data)
        initial = float(steady_top_oil_rise(np.array([mean / rating]), data)[0])
        if not ieee:
            ultimate, initial = ultimate + air, initial + float(air[0])
        before = _starts(ultimate, initial, oil_lengths)
        last, away = ultimate[kept], (before - ultimate)[kept]
        scale = data.hot_spot_gradient_k / rating**power
        top_oil = hot_spot = -np.inf
        ageing = 0.0
        for n, step in enumerate(steps.tolist()):
            oil = last + away * np.exp(-step * oil_lengths) + outside
            hot = oil + scale * winding[n]
            top_oil, hot_spot = max(top_oil, float(oil.max())), max(hot_spot, float(hot.max()))
            ageing += weights[n] * float(relative_ageing_rate(hot, paper).mean())
        rows.append((top_oil, hot_spot, ageing))
    return rows


def _winding_lags(data: ThermalData, guide: Guide) -> list[tuple[float, float]]:
    """Lags whose sum is the gradient of the hot spot over top oil: gain and time constant. [-, min]"""
    if guide == "IEEE C57.91":
        return [(1.0, data.winding_time_constant_min)]
    lags = [
        (data.k21, data.k22 * data.winding_time_constant_min),
        (1.0 - data.k21, data.oil_time_constant_min / data.k22),
    ]
    return [lag for lag in lags if lag[0] != 0.0]


def _starts(ultimate: NDArray[np.float64], initial: float, lengths: float) -> NDArray[np.float64]:
    """A first-order lag at the start of each interval, interval length in time constants."""
    keep = float(np.exp(-lengths))
    before = np.empty_like(ultimate)
    before[0] = initial
    before[1:] = lfilter([1.0 - keep], [1.0, -keep], ultimate[:-1], zi=[keep * initial])[0]
    return before


def _add_lag(
    into: list[NDArray[np.float64]],
    ultimate: NDArray[np.float64],
    initial: float,
    lengths: float,
    steps: NDArray[np.float64],
    kept: slice,
) -> None:
    """Adds a lag at each step through the interval."""
    before = _starts(ultimate, initial, lengths)
    last, away = ultimate[kept], (before - ultimate)[kept]
    for n, step in enumerate(steps.tolist()):
        into[n] += last + away * np.exp(-step * lengths)
