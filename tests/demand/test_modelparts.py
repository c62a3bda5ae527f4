from dataclasses import replace

import numpy as np
import pytest

from loadsum.demand.group import group_demand
from loadsum.demand.modelparts import part_effects
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock


def block(rng, correlation):
    mood = rng.gamma(4.0, 0.5, (60, 24)) - 2.0
    kw = rng.gamma(2.0, 0.5, (20, 60, 24)) + correlation * mood
    return DayBlock(season="all year", day_type="all days", days_per_year=365.0, day=np.arange(60), kw=kw)


def fit(blocks, settings):
    return group_demand(blocks, interval_min=60, power_factor=1.0, settings=settings)


def effects(correlation, settings, rating_kva=36.0):
    given = [block(np.random.default_rng(3), correlation)]
    return {one.part: one.with_h / one.without_h for one in part_effects(given, fit, settings, rating_kva)}


def test_a_common_component_multiplies_exceedance_where_customers_move_together_and_hardly_where_not():
    settings = ModelSettings()
    assert effects(0.5, settings)["common_component"] > 20.0
    assert effects(0.0, settings)["common_component"] < 3.0


def test_parts_that_are_off_or_have_no_temperature_to_go_by_are_not_compared():
    settings = replace(ModelSettings(), shrinkage=False)
    assert set(effects(0.3, settings)) == {"common_component", "mean_uncertainty"}


def test_nothing_can_be_said_of_a_rating_that_is_out_of_reach():
    one = replace(ModelSettings(), common_component=False, mean_uncertainty=False)
    kw = np.ones((2, 30, 4))
    given = [DayBlock(season="all year", day_type="all days", days_per_year=365.0, day=np.arange(30), kw=kw)]
    (found,) = part_effects(given, fit, one, 50.0)
    assert found.words() == "hardly any exceedance of 50 kVA with or without it"
    assert part_effects(given, fit, replace(one, shrinkage=False), 50.0) == ()


def test_the_effect_is_in_expected_exceedance_hours_per_year():
    settings = ModelSettings(shrinkage=False, mean_uncertainty=False, lattice_kw=0.02)
    given = block(np.random.default_rng(4), 0.4)
    (found,) = part_effects([given], fit, settings, 34.0)
    hours = [
        sum(hour.exceedance_kva(34.0).value for hour in fit([given], one).hours[0])
        for one in (settings, replace(settings, common_component=False))
    ]
    assert (found.with_h, found.without_h) == pytest.approx(tuple(365.0 * np.array(hours)))
    assert found.words() == (
        f"expected exceedance of 34 kVA about {found.with_h:.2g} h a year with it, {found.without_h:.2g} h without "
        "(quick comparison)"
    )
