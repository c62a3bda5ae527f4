"""Lattice masses: roundings that bracket, continuous terms rounded outward, and the choice of the step."""

import itertools
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import ndtr

from loadsum.demand.convolution import BracketedSum, DemandSum
from loadsum.demand.lattice import (
    CUT,
    LatticeMass,
    continuous_mass,
    kernel_mass,
    lattice_mass,
    mixture,
    normal_mass,
)
from loadsum.demand.latticestep import lattice_step, refined, resolution_kw
from tests.reference.sums import expected

SLOP = 1e-12  # floating-point arithmetic, outward


def rounded_both_ways(columns, step_kw):
    down, up = (tuple(lattice_mass(np.array(c), step_kw, way) for c in columns) for way in ("down", "up"))
    counts = (1,) * len(columns)
    return BracketedSum(down=DemandSum(terms=down, counts=counts), up=DemandSum(terms=up, counts=counts))


def small_case(rng):
    """Readings with three decimals of two to four customers, a step that does not divide them, and a level."""
    thousandths = [rng.integers(-800, 3000, rng.integers(2, 5)).tolist() for _ in range(rng.integers(2, 5))]
    step = int(rng.choice([7, 30, 64, 110, 250]))
    level = int(rng.integers(-500, 6000))
    return thousandths, step, level


def check_bracket(thousandths, step, level):
    sums = [sum(combination) for combination in itertools.product(*thousandths)]
    above = Fraction(sum(total > level for total in sums), len(sums))
    below = Fraction(sum(total < level for total in sums), len(sums))
    bracket = rounded_both_ways([np.array(c) / 1000.0 for c in thousandths], step / 1000.0)
    for (lower, upper), truth in ((bracket.above(level / 1000.0), above), (bracket.below(level / 1000.0), below)):
        assert lower - SLOP <= truth <= upper + SLOP


def test_the_truth_lies_in_the_bracket_in_ten_thousand_random_small_cases():
    rng = np.random.default_rng(21)
    for _ in range(10_000):
        check_bracket(*small_case(rng))


@given(
    st.lists(st.lists(st.integers(-400, 900), min_size=1, max_size=4), min_size=1, max_size=4),
    st.integers(1, 90),
    st.integers(-1500, 3500),
)
@settings(max_examples=100, deadline=None)
def test_the_truth_lies_in_the_bracket_whatever_the_readings(thousandths, step, level):
    check_bracket(thousandths, step, level)


def uniform(step_kw, rounding):
    return continuous_mass(
        lambda x: np.clip(x, 0.0, 1.0), lambda x: np.clip(1.0 - x, 0.0, 1.0), 0.0, 1.0, step_kw, rounding
    )


@pytest.mark.parametrize("parts", [10, 20, 50, 100])
def test_the_bracket_of_twelve_uniform_demands_agrees_with_exact_enumeration(parts):
    values = expected("bracket")
    down, up = (DemandSum(terms=(uniform(1.0 / parts, way),), counts=(12,)) for way in ("down", "up"))
    assert down.above(9.0) == pytest.approx(values[f"1/{parts}"]["lower"], rel=1e-10)
    assert up.above(9.0) == pytest.approx(values[f"1/{parts}"]["upper"], rel=1e-10)
    assert down.above(9.0) < values["exact"] < up.above(9.0)


@pytest.mark.parametrize("case", expected("irwin_hall_sf"))
def test_the_bracket_of_uniform_demands_holds_the_closed_form(case):
    n, level = (float(part[2:]) for part in case.split(","))
    lower, upper = (
        DemandSum(terms=(uniform(1.0 / 512.0, way),), counts=(int(n),)).above(level) for way in ("down", "up")
    )
    truth = float(expected("irwin_hall_sf")[case]["dec"])
    assert lower <= truth <= upper
    assert upper - lower < 0.4 * truth


@pytest.mark.parametrize("bandwidth_kw", [0.02, 0.3, 2.0])
def test_a_smoothed_term_is_ordered_against_the_true_one_at_every_level_tails_included(bandwidth_kw):
    centres = np.array([-1.3, 0.0, 0.4, 0.41, 2.2])
    down, up = (kernel_mass(centres, np.ones(5), bandwidth_kw, 0.05, way) for way in ("down", "up"))
    for level in np.linspace(-1.3 - 12.0 * bandwidth_kw, 2.2 + 12.0 * bandwidth_kw, 301):
        above = float(ndtr((centres - level) / bandwidth_kw).mean())
        below = float(ndtr((level - centres) / bandwidth_kw).mean())
        assert down.above(level) * (1.0 - SLOP) <= above <= up.above(level) * (1.0 + SLOP)
        assert up.below(level) * (1.0 - SLOP) <= below <= down.below(level) * (1.0 + SLOP)


def test_what_is_cut_off_a_tail_is_counted_on_the_outward_side():
    down, up = normal_mass(0.0, 1.0, 0.1, "down"), normal_mass(0.0, 1.0, 0.1, "up")
    assert 0.0 < down.beyond_below <= CUT and down.beyond_above == 0.0
    assert 0.0 < up.beyond_above <= CUT and up.beyond_below == 0.0
    assert up.above(50.0) == up.beyond_above
    assert down.below(-50.0) == down.beyond_below
    assert down.above(50.0) == up.below(-50.0) == 0.0
    assert DemandSum(terms=(up,), counts=(3,)).above(500.0) == 3.0 * up.beyond_above


def test_a_normal_term_rounded_down_and_up_lies_half_a_step_either_side_of_its_mean():
    down, up = normal_mass(1.0, 0.5, 0.1, "down"), normal_mass(1.0, 0.5, 0.1, "up")
    assert (down.mean_kw(), up.mean_kw()) == (pytest.approx(0.95), pytest.approx(1.05))
    assert down.central_moment(2) == pytest.approx(0.25 + 0.01 / 12.0)


def test_a_normal_term_without_spread_is_a_constant():
    assert normal_mass(0.3, 0.0, 0.1, "down").mass.tolist() == [1.0]


def test_the_weather_mixture_agrees_with_the_law_of_total_probability():
    values = expected("weather_mixture")
    truth = float(values["P_mixture"])
    lower, upper = (
        mixture(
            [normal_mass(m, s, 0.02, way) for m, s in zip(values["mu"], values["sd"], strict=True)], values["pi"]
        ).above(float(values["L"]))
        for way in ("down", "up")
    )
    assert lower < truth
    assert upper == pytest.approx(truth, rel=1e-10)  # the level is a lattice point, and rounding up keeps it
    assert lower == pytest.approx(truth, rel=1e-2)


def test_scaling_and_shifting_round_in_the_direction_asked():
    term = lattice_mass(np.array([0.1, 0.3, 0.4]), 0.1, "exact")
    assert term.scaled(0.55, "down").points_kw[-1] == pytest.approx(0.2)
    assert term.scaled(0.55, "up").points_kw[-1] == pytest.approx(0.3)
    assert term.scaled(2.0, "exact").points_kw[[0, -1]] == pytest.approx([0.2, 0.8])
    assert term.shifted(-0.25, "down").points_kw[0] == pytest.approx(-0.2)
    assert term.shifted(-0.25, "up").points_kw[0] == pytest.approx(-0.1)
    with pytest.raises(ValueError, match="must not be negative"):
        term.scaled(-1.0, "down")


def test_exact_rounding_refuses_readings_off_the_lattice():
    with pytest.raises(ValueError, match="off the lattice"):
        lattice_mass(np.array([0.1, 0.15]), 0.1, "exact")


def test_readings_that_are_not_finite_are_refused():
    with pytest.raises(ValueError, match="need finite readings"):
        lattice_mass(np.array([0.1, np.nan]), 0.1, "down")


def test_decimals_of_the_file_do_not_move_a_reading_to_the_next_lattice_point():
    kw = np.arange(2000) * 0.01
    assert lattice_mass(kw, 0.01, "down").mass.tolist() == lattice_mass(kw, 0.01, "up").mass.tolist()


@given(
    st.lists(st.floats(-5.0, 5.0), min_size=1, max_size=20),
    st.lists(st.floats(-5.0, 5.0), min_size=1, max_size=20),
    st.sampled_from(["down", "up"]),
)
@settings(max_examples=60, deadline=None)
def test_mass_is_one_and_cumulants_add_and_exceedance_never_rises(first, second, rounding):
    terms = tuple(lattice_mass(np.array(readings), 0.25, rounding) for readings in (first, second))
    total = DemandSum(terms=terms, counts=(2, 1))
    assert total.distribution().mass.sum() == pytest.approx(1.0, abs=1e-12)
    assert total.mean_kw() == pytest.approx(2 * terms[0].mean_kw() + terms[1].mean_kw(), abs=1e-9)
    variance = 2 * terms[0].central_moment(2) + terms[1].central_moment(2)
    assert total.variance_kw2() == pytest.approx(variance, abs=1e-9)
    whole = total.distribution()
    assert whole.mean_kw() == pytest.approx(total.mean_kw(), abs=1e-9)
    assert whole.central_moment(2) == pytest.approx(variance, abs=1e-9)
    above = total.above_many(np.linspace(-16.0, 16.0, 41))
    assert np.all(np.diff(above) <= 0.0)
    assert total.above(0.3) + total.below(0.3) == pytest.approx(1.0 - whole.above(0.29) + whole.above(0.3), abs=1e-12)
    assert DemandSum(terms=terms[::-1], counts=(1, 2)).above(0.3) == pytest.approx(total.above(0.3), rel=1e-11)


@pytest.mark.parametrize(
    ("kw", "step_kw"),
    [
        ([0.492, 1.204, 0.004], 0.004),
        ([0.5, 1.25, -0.75], 0.25),
        ([2.0 / 3.0, 1.0 / 3.0], 1.0 / 3.0),
        ([0.1, np.nan, 0.35], 0.05),
        ([0.1234567891], None),
        ([0.0, 0.0], None),
    ],
)
def test_the_resolution_of_readings_is_found(kw, step_kw):
    found = resolution_kw(np.array(kw))
    assert found is None if step_kw is None else found == pytest.approx(step_kw, rel=1e-12)


def test_the_step_divides_the_resolution_and_nothing_is_rounded():
    choice = lattice_step([np.array([0.4, 2.0, 0.8]), np.array([1.2])], 0.03)
    assert choice.exact
    assert choice.step_kw == pytest.approx(0.4 / 14.0)
    lattice_mass(np.array([0.4, 2.0, 0.8]), choice.step_kw, "exact")
    assert choice.reason == "the step divides the readings' resolution of 400 W; nothing is rounded"


def test_a_resolution_that_cannot_be_afforded_is_rounded_and_said_so():
    choice = lattice_step([np.array([0.000001, 5.0])], 0.01)
    assert not choice.exact and choice.step_kw == 0.01
    assert choice.reason.endswith("would take 5e+06 points; they are rounded both ways")
    assert lattice_step([np.array([np.pi, 5.0])], 0.01).reason.startswith("the readings have no common resolution")
    assert lattice_step([np.zeros(4)], 0.01).exact


def group(step_kw):
    rng = np.random.default_rng(1)
    columns = [rng.lognormal(-0.5, 0.8, 60) for _ in range(10)]
    down, up = (
        DemandSum(
            terms=(*(lattice_mass(c, step_kw, way) for c in columns), normal_mass(0.0, 0.8, step_kw, way)),
            counts=(1,) * 11,
        )
        for way in ("down", "up")
    )
    return BracketedSum(down=down, up=up)


def test_the_lattice_is_refined_until_the_bracket_at_the_levels_is_within_one_percent():
    levels = np.array([12.0, 16.0, 20.0])
    coarse = group(0.05).above_many(levels)
    found = refined(group, levels, 0.05)
    assert np.max((coarse[1] - coarse[0]) / coarse[1]) > 0.01
    assert found.tight and found.widest <= 0.01
    assert np.all(found.lower <= found.upper)
    assert np.all(coarse[0] <= found.lower) and np.all(found.upper <= coarse[1])


def test_a_bracket_that_cannot_be_made_tight_says_so():
    found = refined(group, np.array([12.0]), 0.05, within=1e-9)
    assert not found.tight and found.widest > 1e-9


def test_masses_cannot_be_changed():
    term = LatticeMass(step_kw=0.1, offset=0, mass=np.ones(1))
    with pytest.raises(ValueError, match="read-only"):
        term.mass[0] = 2.0
