"""Highest temperatures and ageing of long runs of load, for many ratings at once."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

from loadsum.intake.readings import read_only
from loadsum.transformer.ageing import Paper, relative_ageing_rate
from loadsum.transformer.thermal import Guide, ThermalData, steady_top_oil_rise

LONGEST_STRETCH = 32
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
    """Figures of one run at each rating.

    Arrays are (L, n): n stretches of L intervals side by side, in single precision, few enough to stay in the
    processor's memory and written to again and again.
    """
    ieee = guide == "IEEE C57.91"
    power = 2.0 * data.winding_exponent if ieee else data.winding_exponent
    length = _stretch(kva.size, warm_up)
    kept = warm_up // length
    load = np.ascontiguousarray(np.abs(kva).reshape(-1, length).T, dtype=np.float32)
    outside = np.ascontiguousarray(air.reshape(-1, length).T, dtype=np.float32)
    steps = (np.arange(parts + 1) / parts).tolist()
    weights = np.where(np.arange(parts + 1) % 2 == 1, 4.0, 2.0)
    weights[[0, -1]] = 1.0
    weights /= 3.0 * parts
    mean = float(load.mean(dtype=np.float64))
    ultimate, before, now, scratch = (np.empty_like(load) for _ in range(4))

    # per unit of rated gradient, times rating to the power: the same for all ratings
    load_power = load ** np.float32(power)
    winding = [np.zeros_like(load) for _ in steps]
    for gain, constant_min in _winding_lags(data, guide):
        np.multiply(load_power, np.float32(gain), out=ultimate)
        lengths = interval_min / constant_min
        _run_through(ultimate, gain * mean**power, lengths, before, scratch)
        for step, rise in zip(steps, winding, strict=True):
            rise += _within(ultimate, before, step * lengths, now)
    oil_lengths = interval_min / (data.oil_time_constant_min * (1.0 if ieee else data.k11))
    rows = []
    for rating in ratings_kva.tolist():
        np.multiply(load, np.float32(1.0 / rating), out=ultimate)
        _to_oil_rise(ultimate, data)
        initial = float(steady_top_oil_rise(np.array([mean / rating]), data)[0])
        if not ieee:
            ultimate += outside
            initial += float(air[0])
        _run_through(ultimate, initial, oil_lengths, before, scratch)
        gradient = np.float32(data.hot_spot_gradient_k / rating**power)
        top_oil = hot_spot = -np.inf
        ageing = 0.0
        for weight, step, rise in zip(weights.tolist(), steps, winding, strict=True):
            _within(ultimate, before, step * oil_lengths, now)
            if ieee:
                now += outside
            top_oil = max(top_oil, float(now[:, kept:].max()))
            np.multiply(rise, gradient, out=scratch)
            now += scratch
            hot = now[:, kept:]
            hot_spot = max(hot_spot, float(hot.max()))
            ageing += weight * float(relative_ageing_rate(hot, paper).mean())
        rows.append((top_oil, hot_spot, ageing))
    return rows


def _stretch(intervals: int, warm_up: int) -> int:
    """Length of stretches that a run and its warm-up are whole numbers of. [intervals]"""
    whole = math.gcd(intervals, warm_up)
    return max(length for length in range(1, LONGEST_STRETCH + 1) if whole % length == 0)


def _to_oil_rise(loading_pu: NDArray[np.float32], data: ThermalData) -> None:
    """Turns loading into what :func:`steady_top_oil_rise` gives, in place."""
    R = data.loss_ratio
    loading_pu *= loading_pu
    loading_pu *= np.float32(R / (R + 1.0))
    loading_pu += np.float32(1.0 / (R + 1.0))
    np.power(loading_pu, np.float32(data.oil_exponent), out=loading_pu)
    loading_pu *= np.float32(data.top_oil_rise_k)


def _run_through(
    ultimate: NDArray[np.float32],
    initial: float,
    lengths: float,
    before: NDArray[np.float32],
    end: NDArray[np.float32],
) -> None:
    """Writes where a first-order lag stands at the start of each interval, interval length in time constants.

    Stretches run side by side from nothing; then what each starts with is found, and added as it fades.
    """
    keep = math.exp(-lengths)
    count = ultimate.shape[0]
    np.multiply(ultimate, np.float32(1.0 - keep), out=end)
    for last, now, carried in zip(end[:-1], end[1:], before[1:], strict=True):
        np.multiply(last, np.float32(keep), out=carried)
        now += carried
    first = np.concatenate([[initial], end[-1, :-1].astype(np.float64)])
    before[0] = lfilter([1.0], [1.0, -(keep**count)], first)
    faded = (keep ** np.arange(1, count)).astype(np.float32)
    np.multiply(faded[:, None], before[0], out=before[1:])
    before[1:] += end[:-1]


def _within(
    ultimate: NDArray[np.float32], before: NDArray[np.float32], lengths: float, out: NDArray[np.float32]
) -> NDArray[np.float32]:
    """Where the lag stands so many time constants after the start of each interval."""
    if lengths == 0.0:
        out[:] = before
        return out
    np.subtract(before, ultimate, out=out)
    out *= np.float32(math.exp(-lengths))
    out += ultimate
    return out


def _winding_lags(data: ThermalData, guide: Guide) -> list[tuple[float, float]]:
    """Lags whose sum is the gradient of the hot spot over top oil: gain and time constant. [-, min]"""
    if guide == "IEEE C57.91":
        return [(1.0, data.winding_time_constant_min)]
    lags = [
        (data.k21, data.k22 * data.winding_time_constant_min),
        (1.0 - data.k21, data.oil_time_constant_min / data.k22),
    ]
    return [lag for lag in lags if lag[0] != 0.0]
