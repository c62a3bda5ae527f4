"""Temperatures and ageing over drawn years, and the figures that criteria are held against."""

import numpy as np
import pytest

from loadsum.peak.paths import DemandPaths
from loadsum.study.unittables import Criterion, Transformer
from loadsum.transformer.criterionfigures import missing_for_life, temperature_figures
from loadsum.transformer.life import life
from loadsum.transformer.thermal import ThermalData
from loadsum.transformer.thermalkeys import ambient_of, thermal_data

# Figures of an invented unit, those of the test cases of tests/reference/transformer.json.
DATA = ThermalData(
    top_oil_rise_k=53.0, hot_spot_gradient_k=27.0, loss_ratio=5.0, oil_exponent=0.8, winding_exponent=0.8,
    oil_time_constant_min=180.0, winding_time_constant_min=5.0,
)  # fmt: skip
YEARS = 4


def four_years(ambient_c=None):
    """Four years with one hot evening each, of 20, 25, 30 and 35 kVA."""
    kw = np.full((YEARS * 365, 24), 8.0)
    for year in range(YEARS):
        kw[year * 365 + 200, 18] = 20.0 + 5.0 * year
    return DemandPaths(
        interval_min=60,
        block=np.zeros(YEARS * 365, dtype=np.int64),
        day_of_year=np.tile(np.arange(365), YEARS),
        kw=kw,
        kvar=np.zeros_like(kw),
        ambient_c=ambient_c,
    )


PATHS = four_years()
AIR = np.full(PATHS.kw.shape, 20.0)


def lived(**more):
    return life(PATHS, AIR, [20.0, 30.0], DATA, "IEEE C57.91", "thermally upgraded", **more)


def test_the_distribution_is_over_years():
    row = lived(hot_spot_limit_c=100.0).by_rating[0]
    quantiles = row.hot_spot_quantiles_c
    assert np.all(np.diff(quantiles) >= 0.0) and quantiles[-1] - quantiles[0] > 20.0
    assert row.probability_above_limit in (0.5, 0.75)
    assert row.hot_spot_yearly_high_c == pytest.approx(float(np.quantile(quantiles, 0.5)), abs=0.5)


def test_the_ambient_of_the_same_day_counts():
    warm = AIR.copy()
    for year in range(YEARS):
        warm[year * 365 + 200] += 10.0
    base = lived().by_rating[0].hot_spot_quantiles_c
    same_day = life(PATHS, warm, [20.0], DATA, "IEEE C57.91", "kraft").by_rating[0].hot_spot_quantiles_c
    other_day = life(PATHS, np.roll(warm, 24 * 50), [20.0], DATA, "IEEE C57.91", "kraft").by_rating[0]
    assert same_day == pytest.approx(base + 10.0, abs=1e-6)
    assert other_day.hot_spot_quantiles_c == pytest.approx(base, abs=0.05)


def test_derating_makes_a_unit_as_hot_as_a_smaller_one():
    derated = lived(derating_pu=2.0 / 3.0).by_rating[1]
    assert derated.hot_spot_quantiles_c == pytest.approx(lived().by_rating[0].hot_spot_quantiles_c)


def test_what_the_figures_rest_on_is_said():
    said = " ".join(lived(assumed=["ambient: stated"]).assumed)
    for words in ("ambient: stated", "warm-up: the first 1 d", "12 parts of each 60 min", "within 5 min"):
        assert words in said


def test_intervals_without_readings_have_no_temperature():
    kw = PATHS.kw.copy()
    kw[3, 4] = np.nan
    gap = DemandPaths(
        interval_min=60, block=PATHS.block, day_of_year=PATHS.day_of_year, kw=kw, kvar=PATHS.kvar, ambient_c=None
    )
    with pytest.raises(ValueError, match="without readings"):
        life(gap, AIR, [20.0], DATA, "IEEE C57.91", "kraft")


def test_missing_ambient_hours_are_not_filled():
    holed = AIR.copy()
    holed[5, 5] = np.nan
    ambient, words = ambient_of(Transformer(), four_years(holed))
    assert ambient is None and "give [weather] or transformer.ambient_c" in words
    constant, words = ambient_of(Transformer(ambient_c=40.0), four_years(holed))
    assert constant is not None and np.all(constant == 40.0) and "a constant 40 °C, stated" in words


def test_without_thermal_data_there_is_no_temperature_and_the_reason_names_them():
    unit = Transformer(loading_guide="IEEE C57.91", top_oil_rise_k=53.0)
    assert thermal_data(unit) is None
    reason = missing_for_life(unit)
    assert "hot_spot_gradient_k" in reason and "top_oil_rise_k" not in reason
    hottest = temperature_figures(None, reason)["hot-spot temperature"]
    figure = hottest(Criterion(quantity="hot-spot temperature", limit=120.0, probability=0.1), 20.0)
    assert np.isnan(figure.value) and figure.reason == reason


def test_a_temperature_criterion_is_held_against_the_level_passed_with_its_probability():
    found = lived()
    figures = temperature_figures(found, "")
    value = figures["hot-spot temperature"](
        Criterion(quantity="hot-spot temperature", limit=120.0, probability=0.5), 20.0
    ).value
    assert value == pytest.approx(found.by_rating[0].hot_spot_yearly_high_c, abs=0.5)
    oil = figures["top-oil temperature"](Criterion(quantity="top-oil temperature", limit=95.0, probability=0.5), 20.0)
    assert oil.value < value
    ageing = figures["ageing per year"](Criterion(quantity="ageing per year", limit=1.0), 20.0)
    assert ageing.value == found.by_rating[0].ageing_pu


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"probability": 0.001}, "answer no probability per year below 0.01"),
        ({"probability": 0.1, "season": "summer"}, "of the whole year"),
        ({"probability": 0.1, "direction": "exported"}, "in both directions"),
    ],
)
def test_what_the_drawn_years_do_not_answer_is_refused(changes, words):
    criterion = Criterion(quantity="hot-spot temperature", limit=120.0, **changes)
    figure = temperature_figures(lived(), "")["hot-spot temperature"](criterion, 20.0)
    assert np.isnan(figure.value) and words in figure.reason


def test_temperatures_beyond_what_the_guide_names_are_called_extrapolated():
    assert "extrapolate" not in " ".join(life(PATHS, AIR, [30.0], DATA, "IEEE C57.91", "kraft").assumed)
    small = life(PATHS, AIR, [12.0, 30.0], DATA, "IEEE C57.91", "kraft").assumed[-1]
    assert small.startswith("12 kVA: hot spots above 160 °C") and "extrapolate" in small
