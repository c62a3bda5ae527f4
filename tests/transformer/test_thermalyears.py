"""Long runs of load: highest temperatures, ageing inside the interval, warm-up, speed."""

import math
import time
from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

from loadsum.transformer.ageing import relative_ageing_rate
from loadsum.transformer.thermal import ThermalData, temperatures
from loadsum.transformer.thermalyears import parts_of, run_figures, start_left_k, warm_up_days

# Thermal data of invented units: the figures of the test cases of tests/reference/transformer.json.
IEEE = ThermalData(
    top_oil_rise_k=53.0, hot_spot_gradient_k=27.0, loss_ratio=5.0, oil_exponent=0.8, winding_exponent=0.8,
    oil_time_constant_min=180.0, winding_time_constant_min=5.0,
)  # fmt: skip
IEC = ThermalData(
    top_oil_rise_k=45.0, hot_spot_gradient_k=35.0, loss_ratio=8.0, oil_exponent=0.8, winding_exponent=1.3,
    oil_time_constant_min=150.0, winding_time_constant_min=7.0, k11=0.5, k21=2.0, k22=2.0,
)  # fmt: skip
UNITS = [(IEEE, "IEEE C57.91"), (IEC, "IEC 60076-7")]
BOTH = pytest.mark.parametrize(("data", "guide"), UNITS, ids=["ieee", "iec"])


def ten_days(seed: int, runs: int = 1):
    rng = np.random.default_rng(seed)
    hour = np.arange(240) % 24
    load = np.clip(
        14.0 + 9.0 * np.sin((hour - 13) / 24 * 2 * np.pi) + 3.0 * rng.standard_normal((runs, 240)), 1.0, None
    )
    return load, np.broadcast_to(25.0 + 6.0 * np.sin((hour - 9) / 24 * 2 * np.pi), (runs, 240)).copy()


@BOTH
def test_the_slow_twin_subdivided_to_the_minute_agrees(data, guide):
    load, air = ten_days(1, runs=2)
    found = run_figures(load, air, 60.0, np.array([15.0, 25.0]), data, guide, "kraft", parts=60)
    for s in range(2):
        for r, rating in enumerate((15.0, 25.0)):
            oil, hot = temperatures(np.repeat(load[s] / rating, 60), np.repeat(air[s], 60), 1.0, data, guide)
            assert found.hot_spot_c[s, r] == pytest.approx(hot.max(), abs=1e-3)
            assert found.top_oil_c[s, r] == pytest.approx(oil.max(), abs=1e-3)
            # ends of minutes against Simpson's rule over minutes: the twin is the coarser of the two
            assert found.ageing_pu[s, r] == pytest.approx(relative_ageing_rate(hot, "kraft").mean(), rel=0.02)


@BOTH
@pytest.mark.parametrize("interval_min", [15.0, 30.0, 60.0])
def test_ageing_inside_the_interval_is_integrated_within_one_per_cent(data, guide, interval_min):
    load, air = ten_days(2)
    ratings = np.array([20.0])
    coarse, fine = (
        run_figures(load, air, interval_min, ratings, data, guide, "kraft", parts=parts).ageing_pu[0, 0]
        for parts in (parts_of(interval_min, data), 400)
    )
    assert coarse == pytest.approx(fine, rel=0.01)


def test_ageing_of_one_interval_agrees_with_adaptive_quadrature():
    load, air = np.array([[10.0, 30.0]]), np.full((1, 2), 20.0)
    found = run_figures(load, air, 60.0, np.array([20.0]), IEEE, "IEEE C57.91", "kraft", warm_up=1, parts=60)
    oil_1, winding_1 = (53.0 * ((1.0 + 5.0 * 1.0) / 6.0) ** 0.8, 27.0)  # mean load 20 kVA: steady at 1 pu
    lag = lambda start, end, t, tau: end + (start - end) * math.exp(-t / tau)  # noqa: E731
    rise = [53.0 * ((1.0 + 5.0 * K**2) / 6.0) ** 0.8 for K in (0.5, 1.5)]
    gradient = [27.0 * K**1.6 for K in (0.5, 1.5)]
    oil_1, winding_1 = lag(oil_1, rise[0], 60.0, 180.0), lag(winding_1, gradient[0], 60.0, 5.0)

    def rate(t: float) -> float:
        hot = 20.0 + lag(oil_1, rise[1], t, 180.0) + lag(winding_1, gradient[1], t, 5.0)
        return 2.0 ** ((hot - 98.0) / 6.0)

    assert found.ageing_pu[0, 0] == pytest.approx(quad(rate, 0.0, 60.0)[0] / 60.0, rel=1e-6)


def test_end_of_hour_values_would_overstate_ageing_by_a_tenth_and_more():
    load, air = ten_days(1)
    _, hot = temperatures(load[0] / 20.0, air[0], 60.0, IEEE, "IEEE C57.91")
    inside = run_figures(load, air, 60.0, np.array([20.0]), IEEE, "IEEE C57.91", "thermally upgraded", parts=12)
    assert relative_ageing_rate(hot, "thermally upgraded").mean() > 1.1 * inside.ageing_pu[0, 0]


def test_an_overshoot_inside_the_interval_is_seen():
    quick = replace(IEC, k21=3.0, top_oil_rise_k=5.0)
    load, air = np.array([[5.0] * 48 + [30.0]]), np.full((1, 49), 20.0)
    found = run_figures(load, air, 60.0, np.array([20.0]), quick, "IEC 60076-7", "kraft", parts=20)
    _, hot = temperatures(load[0] / 20.0, air[0], 60.0, quick, "IEC 60076-7")
    assert found.hot_spot_c[0, 0] - hot.max() > 0.5


@BOTH
def test_after_the_warm_up_the_start_no_longer_matters(data, guide):
    days = warm_up_days(data, guide)
    assert start_left_k(data, guide, days) <= 0.05
    load = np.random.default_rng(3).uniform(0.2, 1.5, 24 * (days + 1))
    air = np.full(load.size, 20.0)
    cold, warm = (
        temperatures(load, air, 60.0, data, guide, start_pu=np.array(start))[1][24 * days - 1] for start in (0.0, 1.0)
    )
    assert abs(warm - cold) <= start_left_k(data, guide, days) * 1.000001
    if guide == "IEEE C57.91":
        assert abs(warm - cold) == pytest.approx(start_left_k(data, guide, days), rel=1e-3)


def test_a_sluggish_tank_gets_a_longer_warm_up():
    slow = ThermalData(
        top_oil_rise_k=53.0, hot_spot_gradient_k=27.0, loss_ratio=5.0, oil_exponent=0.8, winding_exponent=0.8,
        oil_time_constant_min=720.0, winding_time_constant_min=5.0,
    )  # fmt: skip
    assert warm_up_days(IEEE, "IEEE C57.91") == 1
    assert warm_up_days(slow, "IEEE C57.91") == 4


@BOTH
def test_steady_load_ends_at_the_steady_state_and_ages_at_its_rate(data, guide):
    load, air = np.full((1, 480), 20.0), np.full((1, 480), 20.0)
    found = run_figures(load, air, 60.0, np.array([20.0]), data, guide, "kraft", parts=2)
    hot = 20.0 + data.top_oil_rise_k + data.hot_spot_gradient_k
    assert found.hot_spot_c[0, 0] == pytest.approx(hot, abs=1e-3)
    assert found.ageing_pu[0, 0] == pytest.approx(2.0 ** ((hot - 98.0) / 6.0), rel=1e-5)


def test_heat_stored_and_given_off_equals_the_losses():
    """Energy balance with a linear oil (n = 1): the rise's time integral equals that of its ultimate value."""
    linear = ThermalData(
        top_oil_rise_k=50.0, hot_spot_gradient_k=20.0, loss_ratio=5.0, oil_exponent=1.0, winding_exponent=0.8,
        oil_time_constant_min=180.0, winding_time_constant_min=5.0,
    )  # fmt: skip
    day = np.random.default_rng(6).uniform(0.2, 1.4, 96)
    load = np.tile(day, 40)
    oil, _ = temperatures(load, np.zeros(load.size), 15.0, linear, "IEEE C57.91")
    ultimate = 50.0 * (day**2 * 5.0 + 1.0) / 6.0
    ends = oil[-97:]
    # within an interval the mean of the lag is the ultimate value plus the departure times tau/dt (1 - e^(-dt/tau))
    inside = ultimate + (ends[:-1] - ultimate) * 180.0 / 15.0 * (1.0 - math.exp(-15.0 / 180.0))
    assert inside.mean() == pytest.approx(ultimate.mean(), rel=1e-9)


@BOTH
def test_a_larger_rating_is_never_hotter_and_never_ages_faster(data, guide):
    load, air = ten_days(4, runs=3)
    found = run_figures(load, air, 60.0, np.array([15.0, 20.0, 25.0, 37.5]), data, guide, "kraft", parts=12)
    for figures in (found.top_oil_c, found.hot_spot_c, found.ageing_pu):
        assert np.all(np.diff(figures, axis=1) < 0.0)


@pytest.mark.parametrize(("parts", "warm_up"), [(3, 0), (2, 240), (0, 0)])
def test_impossible_runs_are_refused(parts, warm_up):
    load, air = ten_days(5)
    with pytest.raises(ValueError, match="even number of parts"):
        run_figures(load, air, 60.0, np.array([20.0]), IEEE, "IEEE C57.91", "kraft", parts=parts, warm_up=warm_up)


def plain_loop(load: list[float], rating: float) -> float:
    """The same equations, one interval after the other."""
    mean = sum(load) / len(load) / rating
    oil, winding, ageing = 53.0 * ((mean**2 * 5.0 + 1.0) / 6.0) ** 0.8, 27.0 * mean**1.6, 0.0
    for kva in load:
        K = kva / rating
        rise, gradient = 53.0 * ((K * K * 5.0 + 1.0) / 6.0) ** 0.8, 27.0 * K**1.6
        oil_0, winding_0 = oil, winding
        for step, weight in ((0.0, 1.0 / 6.0), (0.5, 4.0 / 6.0), (1.0, 1.0 / 6.0)):
            oil = rise + (oil_0 - rise) * math.exp(-step * 15.0 / 180.0)
            winding = gradient + (winding_0 - gradient) * math.exp(-step * 15.0 / 5.0)
            ageing += weight * math.exp(15000.0 / 383.0 - 15000.0 / (20.0 + oil + winding + 273.0))
    return ageing / len(load)


def test_a_thousand_days_at_ten_ratings_are_many_times_faster_than_a_plain_loop():
    load = np.random.default_rng(5).uniform(5.0, 40.0, (1, 1000 * 96))
    air, ratings = np.full(load.shape, 20.0), np.linspace(20.0, 60.0, 10)
    few = load[:, :9600]
    began = time.perf_counter()
    slow_answer = plain_loop(few[0].tolist(), 20.0)
    slow = (time.perf_counter() - began) * 10 * ratings.size
    fast = math.inf
    for _ in range(3):
        began = time.perf_counter()
        run_figures(load, air, 15.0, ratings, IEEE, "IEEE C57.91", "thermally upgraded", parts=2)
        fast = min(fast, time.perf_counter() - began)
    answer = run_figures(few, air[:, :9600], 15.0, ratings[:1], IEEE, "IEEE C57.91", "thermally upgraded", parts=2)
    assert answer.ageing_pu[0, 0] == pytest.approx(slow_answer, rel=1e-5)
    print(f"thermal run: {slow / fast:.0f} times faster than a plain loop")
    assert slow / fast > 30.0
