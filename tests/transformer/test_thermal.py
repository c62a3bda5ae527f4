"""Temperatures and ageing against published formulas; provenance of each value in tests/reference/transformer.json.

Not used: iec_example (its 41 pairs of loading and ambient were not at hand), efficiency tables (the program computes no
efficiency), kva_iec_r10 and the derating rule (the program ships neither).
"""

import json
from pathlib import Path

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from loadsum.transformer.ageing import relative_ageing_rate
from loadsum.transformer.losses import owning_cost
from loadsum.transformer.ratings import SERIES
from loadsum.transformer.thermal import (
    ThermalData,
    oil_time_constant_h,
    steady_gradient,
    steady_top_oil_rise,
    temperatures,
)

VALUES = {
    value["id"]: value
    for value in json.loads((Path(__file__).parents[1] / "reference" / "transformer.json").read_text("utf-8"))["values"]
}
IEEE = ThermalData(
    top_oil_rise_k=53.0, hot_spot_gradient_k=27.0, loss_ratio=5.0, oil_exponent=0.8, winding_exponent=0.8,
    oil_time_constant_min=180.0, winding_time_constant_min=5.0,
)  # fmt: skip
IEC = ThermalData(
    top_oil_rise_k=55.0, hot_spot_gradient_k=23.0, loss_ratio=5.0, oil_exponent=0.8, winding_exponent=1.6,
    oil_time_constant_min=180.0, winding_time_constant_min=4.0, k11=1.0, k21=1.0, k22=2.0,
)  # fmt: skip


@pytest.mark.parametrize(("celsius", "factor"), VALUES["FAA"]["expected"].items())
def test_ageing_of_upgraded_paper_agrees_with_the_published_formula(celsius: str, factor: str) -> None:
    found = relative_ageing_rate(np.array([float(celsius)]), "thermally upgraded")[0]
    assert found == pytest.approx(float(factor), rel=2e-9)


@pytest.mark.parametrize(("celsius", "rates"), VALUES["iec_V"]["expected"].items())
def test_ageing_of_both_papers_agrees_with_the_published_formulas(celsius: str, rates: dict[str, str]) -> None:
    kraft, upgraded = rates.values()
    hot = np.array([float(celsius)])
    assert relative_ageing_rate(hot, "kraft")[0] == pytest.approx(float(kraft), rel=1e-9)
    assert relative_ageing_rate(hot, "thermally upgraded")[0] == pytest.approx(float(upgraded), rel=2e-9)


def test_a_step_of_loading_heats_as_the_exponential_equations_say() -> None:
    oil, hot = temperatures(np.full(4, 1.5), np.full(4, 30.0), 60.0, IEEE, "IEEE C57.91", start_pu=np.array(0.5))
    for n, row in enumerate(VALUES["c57_91_step"]["expected"]):
        assert oil[n] == pytest.approx(row["top_oil"], abs=5e-7)
        assert hot[n] == pytest.approx(row["hot_spot"], abs=5e-7)


def test_a_daily_cycle_at_every_hour() -> None:
    given, expected = VALUES["c57_91_cycle"]["inputs"], VALUES["c57_91_cycle"]["expected"]
    loads = np.tile(np.array(given["loads_pu"]), given["cycles_to_periodic"])
    oil, hot = temperatures(loads, np.full(loads.size, 30.0), 60.0, IEEE, "IEEE C57.91")
    oil, hot = oil[-24:], hot[-24:]
    ageing = relative_ageing_rate(hot, "thermally upgraded")
    for n, row in enumerate(expected["hourly"]):
        assert oil[n] == pytest.approx(row["top_oil"], abs=5e-6)
        assert hot[n] == pytest.approx(row["hot_spot"], abs=5e-6)
        assert ageing[n] == pytest.approx(row["FAA"], abs=5e-8)
    assert ageing.mean() == pytest.approx(expected["F_EQA"], abs=5e-10 * 10)
    assert 100.0 * ageing.mean() * 24.0 / 180_000.0 == pytest.approx(expected["pct_LOL_day"], abs=5e-10)


@pytest.mark.parametrize(("loading", "steady"), VALUES["iec_dist_steady"]["expected"].items())
def test_steady_states_of_a_distribution_transformer(loading: str, steady: dict[str, float]) -> None:
    K = np.array([float(loading)])
    assert steady_top_oil_rise(K, IEC)[0] == pytest.approx(steady["top_oil_rise"], abs=5e-7)
    assert steady_gradient(K, IEC, "IEC 60076-7")[0] == pytest.approx(steady["hs_grad"], abs=5e-7)
    long = np.full(500, K[0])
    _, hot = temperatures(long, np.full(500, 20.0), 60.0, IEC, "IEC 60076-7", start_pu=np.array(0.0))
    assert hot[-1] == pytest.approx(steady["hs_at_20C"], abs=5e-7)


def test_the_oil_time_constant_example() -> None:
    e = VALUES["tau_to"]["expected"]
    found = oil_time_constant_h(e["W_cc_lb"], e["W_tank_lb"], e["gal"], e["dTO_R"], e["P_T_W"])
    assert found == pytest.approx(e["tau_h"], abs=1e-9)


def test_the_cost_examples() -> None:
    e = VALUES["TOC"]["expected"]
    assert owning_cost(24_000.0, 3 * 4.5, 250.0, 3 * 2.0, 4000.0) == pytest.approx(e["maker_handbook"])
    assert owning_cost(1200.0, 5.0, 100.0, 1.5, 400.0) == pytest.approx(e["example_A5_B1.5"])


def test_preferred_series_are_those_of_the_two_restatements() -> None:
    assert list(SERIES["single-phase 60 Hz"]) == VALUES["kva_single_phase"]["expected"]
    assert list(SERIES["three-phase 60 Hz"]) == VALUES["kva_three_phase"]["expected"]


@pytest.mark.parametrize("seed", [1, 2, 3])
@pytest.mark.parametrize("guide", ["IEEE C57.91", "IEC 60076-7"])
def test_an_independent_integration_agrees_within_a_twentieth_of_a_kelvin(guide: str, seed: int) -> None:
    rng = np.random.default_rng(seed)
    loads, air = rng.uniform(0.2, 1.6, 24), 20.0 + 10.0 * rng.random(24)
    data = IEEE if guide == "IEEE C57.91" else ThermalData(
        top_oil_rise_k=45.0, hot_spot_gradient_k=35.0, loss_ratio=8.0, oil_exponent=0.8, winding_exponent=1.3,
        oil_time_constant_min=150.0, winding_time_constant_min=7.0, k11=0.5, k21=2.0, k22=2.0,
    )  # fmt: skip
    oil, hot = temperatures(loads, air, 15.0, data, guide, start_pu=np.array(0.5))

    def at(t: float, values: np.ndarray) -> float:
        return float(values[min(int(t / 15.0), 23)])

    def slopes(t: float, y: np.ndarray) -> list[float]:
        K = np.array([at(t, loads)])
        rise, gradient = steady_top_oil_rise(K, data)[0], steady_gradient(K, data, guide)[0]
        if guide == "IEEE C57.91":
            return [
                (rise - y[0]) / data.oil_time_constant_min,
                (gradient - y[1]) / data.winding_time_constant_min,
                0.0,
            ]
        return [
            (rise + at(t, air) - y[0]) / (data.k11 * data.oil_time_constant_min),
            (data.k21 * gradient - y[1]) / (data.k22 * data.winding_time_constant_min),
            ((data.k21 - 1.0) * gradient - y[2]) * data.k22 / data.oil_time_constant_min,
        ]

    K0 = np.array([0.5])
    rise, gradient = steady_top_oil_rise(K0, data)[0], steady_gradient(K0, data, guide)[0]
    iec = guide == "IEC 60076-7"
    y = [
        rise + (air[0] if iec else 0.0),
        (data.k21 if iec else 1.0) * gradient,
        (data.k21 - 1.0) * gradient if iec else 0.0,
    ]
    for n in range(24):
        span = (15.0 * n, 15.0 * (n + 1))
        y = solve_ivp(lambda t, x: slopes(min(t, span[1] - 1e-9), x), span, y, rtol=1e-9, atol=1e-9).y[:, -1]  # noqa: B023
        oil_here = y[0] + (0.0 if iec else air[n])
        assert oil[n] == pytest.approx(oil_here, abs=0.05)
        assert hot[n] == pytest.approx(oil_here + y[1] - y[2], abs=0.05)


def test_more_load_or_a_warmer_day_never_cools() -> None:
    rng = np.random.default_rng(4)
    loads, air = rng.uniform(0.0, 1.5, (20, 96)), rng.uniform(-10.0, 35.0, (20, 96))
    base = temperatures(loads, air, 15.0, IEEE, "IEEE C57.91", start_pu=np.zeros(20))
    more = temperatures(loads * 1.1, air, 15.0, IEEE, "IEEE C57.91", start_pu=np.zeros(20))
    warmer = temperatures(loads, air + 1.0, 15.0, IEEE, "IEEE C57.91", start_pu=np.zeros(20))
    assert np.all(more[1] >= base[1])
    assert warmer[1] == pytest.approx(base[1] + 1.0, abs=1e-9)


def test_a_run_over_many_days_is_several_times_faster_than_a_plain_loop() -> None:
    import math
    import time

    rng = np.random.default_rng(5)
    loads, air = rng.uniform(0.2, 1.4, (10, 1000 * 96)), np.full((10, 1000 * 96), 20.0)
    began = time.perf_counter()
    _, hot_spot = temperatures(loads, air, 15.0, IEEE, "IEEE C57.91", start_pu=np.zeros(10))
    relative_ageing_rate(hot_spot, "thermally upgraded")
    fast = time.perf_counter() - began
    few = loads[0, :20_000].tolist()
    began = time.perf_counter()
    oil, winding, ageing, hot = 53.0 / 6.0**0.8, 0.0, 0.0, 0.0
    for K in few:
        oil += (53.0 * ((K * K * 5.0 + 1.0) / 6.0) ** 0.8 - oil) * (1.0 - math.exp(-15.0 / 180.0))
        winding += (27.0 * K**1.6 - winding) * (1.0 - math.exp(-15.0 / 5.0))
        hot = 20.0 + oil + winding
        ageing += math.exp(15000.0 / 383.0 - 15000.0 / (hot + 273.0))
    slow = (time.perf_counter() - began) * loads.size / len(few)
    assert hot == pytest.approx(hot_spot[0, len(few) - 1], abs=1e-9)
    print(f"thermal run: {slow / fast:.0f} times faster than a plain loop")
    assert slow / fast > 2.0
