"""Where the choice of rating turns when demand, power factor or ambient temperature move."""

import numpy as np
import pytest

from loadsum.demand.group import group_demand
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock
from loadsum.study.unittables import Criterion
from loadsum.transformer.selection import Figure, evaluate
from loadsum.transformer.sensitivity import ambient_effect, demand_effect, power_factor_effect, sensitivity

PLAIN = ModelSettings(
    temperature=False, common_component=False, shrinkage=False, mean_uncertainty=False, lattice_kw=0.05, resamples=0
)
RATINGS = (10.0, 15.0, 25.0)
HOURS = Criterion(quantity="exceedance hours per year", limit=8.0, of="nameplate", source="Loading rules, clause 4")


def peaking(peak_kw, power_factor=0.8):
    kw = np.ones((1, 100, 24))
    kw[0, :10, 18] = peak_kw
    block = DayBlock(season="all", day_type="all days", days_per_year=365.0, day=np.arange(100), kw=kw)
    return group_demand([block], interval_min=60, power_factor=power_factor, settings=PLAIN)


def turning(peak_kw, criteria=(HOURS,), **more):
    demand = peaking(peak_kw)
    chosen = evaluate(demand, RATINGS, criteria, [], **more)
    return sensitivity(demand, RATINGS, chosen, criteria, [], power_factor=0.8)


def test_the_choice_holds_until_the_peak_reaches_the_rating():
    """36.5 h a year at 10 kW, 12.5 kVA at 0.8: 15 kVA holds to 1.2 times, 10 kVA would serve 0.8 times."""
    found = turning(10.0)
    assert found.rating_kva == 15.0 and found.smaller_kva == 10.0
    assert found.holds_to_pu == pytest.approx(1.2, rel=0.006)
    assert found.smaller_from_pu == pytest.approx(0.8, rel=0.006)
    assert found.power_factor_to == pytest.approx(0.8 / 1.2, rel=0.006)


@pytest.mark.parametrize("factor", [0.99, 1.01])
def test_demand_that_is_really_made_higher_turns_the_choice_there(factor):
    at = turning(10.0).holds_to_pu * factor
    assert evaluate(peaking(10.0 * at), RATINGS, [HOURS], []).rating_kva == (15.0 if factor < 1.0 else 25.0)


def test_a_power_factor_that_is_really_lower_turns_the_choice_there():
    lowest = turning(10.0).power_factor_to
    for power_factor, rating in ((lowest * 1.01, 15.0), (lowest * 0.99, 25.0)):
        assert evaluate(peaking(10.0, power_factor), RATINGS, [HOURS], []).rating_kva == rating


def test_the_words_give_percentages():
    found = turning(10.0)
    assert demand_effect(found).startswith("15 kVA holds until demand is 19.")
    assert "10 kVA would serve if it were 20." in demand_effect(found)
    assert power_factor_effect(found).startswith("15 kVA holds down to 0.66")
    assert ambient_effect(found) == ""


def test_a_light_load_holds_however_far_it_was_looked_at():
    found = turning(2.0)
    assert found.holds_to_pu is None and found.smaller_kva is None
    assert demand_effect(found) == "10 kVA holds with demand up to 3 times as high (exceedance criteria)"
    assert power_factor_effect(found) == ""


def test_the_margin_of_a_temperature_criterion_is_the_room_of_the_ambient():
    hot = Criterion(quantity="hot-spot temperature", limit=120.0, probability=0.1, source="x")
    found = turning(10.0, (HOURS, hot), others={hot.quantity: lambda criterion, rating: Figure(value=113.5)})
    assert found.ambient_k == pytest.approx(6.5)
    assert ambient_effect(found) == "15 kVA meets the temperature criteria until the ambient is 6.5 K warmer"


def test_without_a_choice_or_an_exceedance_criterion_nothing_is_said():
    assert turning(90.0) is None
    ageing = Criterion(quantity="ageing per year", limit=1.0, source="x")
    assert turning(10.0, (ageing,), others={ageing.quantity: lambda criterion, rating: Figure(value=0.1)}) is None
    assert demand_effect(None) == power_factor_effect(None) == ambient_effect(None) == ""
