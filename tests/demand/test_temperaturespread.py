import numpy as np
import pytest

from loadsum.demand.convolution import BracketedSum, DemandSum, plain_distributions
from loadsum.demand.lattice import lattice_mass
from loadsum.demand.temperature import TemperatureResponse, stretched_mass, take_out_temperature
from loadsum.demand.temperaturespread import mixed_over, spread_taken_out


def response(power, unit=1.0):
    return TemperatureResponse(
        columns=(0,),
        centre=np.array([10.0]),
        slope_kw_per_k=np.array([2.0]),
        covariance=np.array([[0.01]]),
        lowest_c=-10.0,
        highest_c=15.0,
        explained=0.5,
        power=power,
        level_kw=30.0,
        unit=unit,
    )


def heated(power, rng, days=150, intervals=8):
    """Group of 8 whose spread is the level to a power."""
    temperature = rng.normal(5.0, 6.0, days)
    level = 1.0 + 0.3 * np.maximum(15.0 - temperature, 0.0)
    noise = rng.gamma(3.0, 1.0, (8, days, intervals)) - 3.0
    return temperature, level[:, None] * 2.0 + level[:, None] ** power * noise * 0.3


def fitted(power, seed):
    temperature, kw = heated(power, np.random.default_rng(seed))
    adjusted, responses = np.array(kw), []
    for i in range(kw.shape[2]):
        adjusted[:, :, i], found = take_out_temperature(kw[:, :, i], temperature, np.ones(8))
        responses.append(found)
    return temperature, adjusted, *spread_taken_out(adjusted, temperature, np.ones(8), responses)


def test_the_stretch_is_a_power_of_the_level_and_falls_no_further_than_its_floor():
    # level 30 kW at 10 K of heating: 40 kW at 15 K, 10 kW at none
    assert response(0.5).stretch(np.array([5.0, 0.0])) == pytest.approx([1.0, (4 / 3) ** 0.5])
    assert response(1.0, unit=2.0).stretch(np.array([15.0])) == pytest.approx([1 / 6])
    assert np.array_equal(response(0.0).stretch(np.array([-10.0, 15.0])), [1.0, 1.0])


def test_a_spread_that_grows_with_the_level_is_found_and_taken_out():
    temperature, before, after, responses = fitted(1.0, 1)
    power = responses[0].power
    assert 0.6 < power <= 1.0
    cold = temperature < np.quantile(temperature, 0.3)
    ratio = [kw[:, cold].sum(axis=0).std(axis=0).mean() / kw.sum(axis=0).std(axis=0).mean() for kw in (before, after)]
    assert ratio[0] > 1.2
    assert ratio[1] == pytest.approx(1.0, abs=0.12)
    stretch = responses[0].stretch(temperature)
    assert float((stretch**2).mean()) == pytest.approx(1.0)


def test_a_spread_that_does_not_grow_is_left_alone():
    found = [fitted(0.0, seed)[3][0].power for seed in range(12)]
    assert np.mean(found) < 0.03


def test_a_stretched_law_has_the_mean_and_spread_asked_for():
    rng = np.random.default_rng(2)
    law = lattice_mass(np.rint(rng.gamma(2.0, 1.0, 500) / 0.01) * 0.01, 0.01, "exact")
    for stretch in (0.5, 1.0, 1.7):
        made = stretched_mass(law, stretch, 3.217)
        assert made.mass.sum() == pytest.approx(1.0)
        assert made.mean_kw() == pytest.approx(law.mean_kw() + 3.217)
        assert made.central_moment(2) == pytest.approx(stretch**2 * law.central_moment(2), rel=1e-3)


@pytest.mark.parametrize("power", [0.0, 0.5, 1.0])
def test_the_mixture_over_a_record_agrees_with_day_by_day(power):
    rng = np.random.default_rng(3)
    law = lattice_mass(np.rint(rng.gamma(8.0, 2.0, 3000) / 0.05) * 0.05, 0.05, "exact")
    one = DemandSum(terms=(law,), counts=(1,))
    still = BracketedSum(down=one, up=one)
    days = rng.normal(3.0, 5.0, 300)
    made = response(power)
    down, up = plain_distributions(mixed_over(still, made, days))
    draws = np.repeat(days, 400)
    kw = law.mean_kw() + made.stretch(draws) * (rng.choice(law.points_kw, draws.size, p=law.mass) - law.mean_kw())
    kw += made.shift_kw(draws) + rng.standard_normal(draws.size) * np.sqrt(made.shift_variance_kw2(days).mean())
    for level in np.quantile(kw, [0.5, 0.9, 0.99]):
        middle = 0.5 * (down.above(level) + up.above(level))
        assert middle == pytest.approx(float((kw > level).mean()), rel=0.06)
        assert down.above(level) <= up.above(level)
    assert up.mean_kw() == pytest.approx(kw.mean(), abs=0.15)
