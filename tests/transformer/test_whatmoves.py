"""What moves the expected hours of a rating: against the study made again with that moved."""

import numpy as np
import pytest

from loadsum.demand.group import group_demand
from loadsum.demand.modelparts import PartEffect
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock
from loadsum.peak.exceedance import exceedance_hours
from loadsum.transformer.whatmoves import what_moves

PLAIN = ModelSettings(
    temperature=False, common_component=False, shrinkage=False, mean_uncertainty=False, lattice_kw=0.01, resamples=0
)


def demand_of(factor=1.0, power_factor=0.9):
    kw = np.rint(np.random.default_rng(3).gamma(2.0, 1.0, (3, 200, 4)) * 10.0) / 10.0 * factor
    block = DayBlock(season="all", day_type="all days", days_per_year=365.0, day=np.arange(200), kw=kw)
    return group_demand([block], interval_min=60, power_factor=power_factor, settings=PLAIN)


def hours(demand):
    return exceedance_hours(demand, {"x": 12.05})["x"].year.expected_h


PARTS = (
    PartEffect(part="shrinkage", rating_kva=12.05, with_h=10.0, without_h=2.0),
    PartEffect(part="temperature", rating_kva=99.0, with_h=1.0, without_h=5.0),
)


def test_each_move_agrees_with_the_study_made_again():
    found = what_moves(demand_of(), 12.05, [], PARTS, power_factor=0.9)
    by = {move.what: move for move in found.moves}
    assert found.base_h == pytest.approx(hours(demand_of()))
    assert by["demand"].low_h == pytest.approx(hours(demand_of(0.9)), rel=0.02)
    assert by["demand"].high_h == pytest.approx(hours(demand_of(1.1)), rel=0.02)
    assert by["power factor"].low_h == pytest.approx(hours(demand_of(power_factor=0.95)))
    assert by["power factor"].high_h == pytest.approx(hours(demand_of(power_factor=0.85)))
    assert by["shrinkage"].low_h == by["shrinkage"].high_h == pytest.approx(0.2 * found.base_h)
    assert "temperature" not in by  # compared at another rating


def test_the_strongest_stands_first_and_a_rating_out_of_reach_moves_by_nothing():
    found = what_moves(demand_of(), 12.05, [], PARTS, power_factor=0.9)
    reach = [
        max(move.high_h, move.low_h, found.base_h) / min(move.high_h, move.low_h, found.base_h) for move in found.moves
    ]
    assert reach == sorted(reach, reverse=True)
    assert what_moves(demand_of(), 900.0, [], PARTS, power_factor=0.9) is None
