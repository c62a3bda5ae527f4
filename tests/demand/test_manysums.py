"""Many small sums computed together, against each on its own."""

import numpy as np
import pytest

from loadsum.demand.convolution import DemandSum
from loadsum.demand.lattice import lattice_mass, normal_mass
from loadsum.demand.manysums import PackedSums, exceedance_of_many, packed_readings


def readings(groups, terms, days=40):
    rng = np.random.default_rng(groups)
    kw = rng.lognormal(-0.7, 0.8, (groups, terms, days)) + (rng.random((groups, terms, days)) < 0.1) * 2.4
    return np.round(kw, 2) - 0.5


def levels_of(kw, spread_kw):
    mean = kw.mean(axis=2).sum(axis=1)
    sd = np.sqrt(kw.var(axis=2).sum(axis=1) + spread_kw**2)
    return mean[:, None] + sd[:, None] * np.array([-1.0, 0.5, 2.0, 4.0])


def alone(kw, spread_kw, way):
    terms = [lattice_mass(row, 0.01, way) for row in kw]
    if spread_kw:
        terms.append(normal_mass(0.0, spread_kw, 0.01, way))
    return DemandSum(terms=tuple(terms), counts=(1,) * len(terms))


@pytest.mark.parametrize("terms", [1, 2, 8, 20])
def test_sums_of_readings_on_the_lattice_agree_with_each_on_its_own(terms):
    kw = readings(25, terms)
    none = np.zeros(25)
    levels = levels_of(kw, none)
    lower, upper = packed_readings(kw, 0.01, none, none).above(levels)
    assert lower is upper
    for g in range(25):
        assert lower[g] == pytest.approx(alone(kw[g], 0.0, "down").above_many(levels[g]), rel=1e-10, abs=1e-300)


def test_sums_with_a_normal_term_agree_with_each_on_its_own_and_hold_the_truth():
    kw = readings(12, 6)
    spread = np.linspace(0.05, 0.6, 12)
    levels = levels_of(kw, spread)
    lower, upper = packed_readings(kw, 0.01, np.zeros(12), spread).above(levels)
    for g in range(12):
        assert lower[g] == pytest.approx(alone(kw[g], spread[g], "down").above_many(levels[g]), rel=1e-10)
        assert upper[g] == pytest.approx(alone(kw[g], spread[g], "up").above_many(levels[g]), rel=1e-10)
        assert np.all(lower[g] <= upper[g])


def test_readings_off_the_lattice_are_bracketed():
    kw = readings(6, 4) + 0.0037
    none = np.zeros(6)
    levels = levels_of(kw, none)
    lower, upper = packed_readings(kw, 0.01, none, none).above(levels)
    for g in range(6):
        truth = alone(np.round(kw[g], 4) / 0.0001 * 0.01, 0.0, "down").above_many(levels[g] * 100.0)
        assert np.all(lower[g] <= truth * (1.0 + 1e-10)) and np.all(truth <= upper[g] * (1.0 + 1e-10))
        assert np.any(lower[g] < upper[g])


def test_sums_of_any_shape_agree_with_each_on_its_own():
    rng = np.random.default_rng(2)
    sums, levels = [], []
    for terms in (1, 3, 3, 3, 7):
        kw = readings(terms + 1, terms)[0]
        parts = [lattice_mass(row, 0.01, "exact") for row in kw]
        counts = tuple(int(n) for n in rng.integers(1, 5, terms))
        sums.append(DemandSum(terms=tuple(parts), counts=counts))
        levels.append(sums[-1].mean_kw() + np.sqrt(sums[-1].variance_kw2()) * np.array([0.0, 2.5]))
    found = exceedance_of_many(sums, np.array(levels))
    for total, row, level in zip(sums, found, levels, strict=True):
        assert row == pytest.approx(total.above_many(level), rel=1e-10)


def test_a_giant_among_dwarfs_is_computed_in_a_crowd_as_well():
    kw = readings(5, 6)
    kw[2, 0] = 0.0
    kw[2, 0, 0] = 90.0
    none = np.zeros(5)
    levels = np.tile(np.array([5.0, 20.0, 60.0, 89.0]), (5, 1))
    found = packed_readings(kw, 0.01, none, none).above(levels)[0]
    assert found[2] == pytest.approx(alone(kw[2], 0.0, "down").above_many(levels[2]), rel=1e-10)
    assert found[2, 2] == pytest.approx(1.0 / 40.0, rel=1e-10)


def test_a_normal_term_too_narrow_for_the_lattice_is_refused():
    kw = readings(3, 2)
    with pytest.raises(ValueError, match="got one of 2"):
        packed_readings(kw, 0.01, np.zeros(3), np.full(3, 0.02))


def test_rows_that_do_not_begin_with_the_largest_outcome_are_refused():
    one = np.zeros(1)
    with pytest.raises(ValueError, match="must begin with its largest outcome"):
        PackedSums(
            step_kw=0.1,
            mass=np.array([[[0.0, 1.0]]]),
            top=np.zeros(1, dtype=np.int64),
            counts=np.ones((1, 1), dtype=np.int64),
            normal_mean_kw=one,
            normal_sd_kw=one,
            rounded=np.zeros(1, dtype=np.int64),
        )
