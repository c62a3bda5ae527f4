"""Losses from the mean squared load, and what they are worth."""

import itertools

import numpy as np
import pytest

from loadsum.demand.group import group_demand
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock
from loadsum.transformer.losses import annuity, losses, mean_square_pu_hours

PLAIN = ModelSettings(
    temperature=False, common_component=False, shrinkage=False, mean_uncertainty=False, lattice_kw=0.05, resamples=0
)


def three_customers():
    """Three independent customers with four days of readings each, some of them exporting. [kW]"""
    kw = np.round(np.random.default_rng(7).uniform(-1.0, 6.0, (3, 4, 24)) / 0.05) * 0.05
    block = DayBlock(season="all", day_type="all days", days_per_year=365.0, day=np.arange(4), kw=kw)
    return kw, group_demand([block], interval_min=60, power_factor=0.9, settings=PLAIN)


KW, DEMAND = three_customers()


def test_mean_squared_load_is_exact_against_enumeration_of_every_combination_of_days():
    for i in range(24):
        every = [sum(readings) for readings in itertools.product(*KW[:, :, i])]
        exact = np.mean(np.square(every)) / 0.9**2
        assert DEMAND.hours[0][i].mean_square_kva2() == pytest.approx(exact, rel=1e-9)


def test_loss_energy_equals_brute_force_over_paths():
    """64 000 drawn days: the standard error of the mean square is about 0.2 %."""
    rng = np.random.default_rng(8)
    drawn = sum(KW[c, rng.integers(0, 4, (64_000, 24)), np.arange(24)] for c in range(3))
    energy = 300.0 * ((drawn / 0.9 / 10.0) ** 2).mean() * 8760.0 / 1000.0
    found = losses(DEMAND, [10.0], [50.0], [300.0]).by_rating[0]
    assert found.load_kwh == pytest.approx(energy, rel=0.01)
    assert found.no_load_kwh == pytest.approx(50.0 * 8.76)


def test_load_losses_fall_with_the_square_of_the_rating():
    assert mean_square_pu_hours(DEMAND, 10.0) == pytest.approx(4.0 * mean_square_pu_hours(DEMAND, 20.0))


@pytest.mark.parametrize(
    ("rate_pct", "years", "factor"),
    # computed_from_formula: 1/1.05 + 1/1.05^2; no discount; (1 - 1.08^-30)/0.08.
    [(5.0, 2, 1 / 1.05 + 1 / 1.05**2), (0.0, 20, 20.0), (8.0, 30, 11.257783343)],
)
def test_present_worth_of_equal_payments(rate_pct, years, factor):
    assert annuity(rate_pct, years) == pytest.approx(factor, abs=5e-10)


def test_price_and_discount_rate_give_the_worth_of_the_energy_lost():
    row = losses(
        DEMAND, [10.0], [50.0], [300.0],
        energy_price_per_kwh=0.2, discount_rate_pct=5.0, worth_years=2, prices=[1000.0], currency="Cr",
    ).by_rating[0]  # fmt: skip
    assert row.present_worth == pytest.approx(0.2 * (row.no_load_kwh + row.load_kwh) * annuity(5.0, 2))
    assert row.owning_cost == pytest.approx(1000.0 + row.present_worth)


def test_the_worth_of_a_watt_gives_the_owning_cost():
    row = losses(DEMAND, [10.0], [100.0], [400.0], a_per_w=5.0, b_per_w=1.5, prices=[1200.0]).by_rating[0]
    assert (row.present_worth, row.owning_cost) == (1100.0, 2300.0)


def test_without_factors_or_price_no_money_is_stated():
    row = losses(DEMAND, [10.0], [50.0], [300.0], prices=[1000.0]).by_rating[0]
    assert row.present_worth is None and row.owning_cost is None
    assert losses(DEMAND, [10.0], [], []) is None
