import numpy as np
import pytest
from scipy.stats import gamma

from loadsum.demand.commonterm import (
    MOST_SKEWED,
    missing_skewness,
    skewed_mass,
    skewness_along_day,
    variance_uncertainty_kw2,
    with_common_term,
)
from loadsum.demand.convolution import BracketedSum, DemandSum, plain_distributions
from loadsum.demand.lattice import lattice_mass


@pytest.mark.parametrize("skewness", [-1.5, -0.3, 0.0, 0.2, 1.0, 2.4])
def test_the_term_has_the_moments_asked_for(skewness):
    down, up = skewed_mass(3.0, skewness, 0.001)
    for term in (down, up):
        assert term.mean_kw() == pytest.approx(0.0, abs=0.03)
        assert term.central_moment(2) == pytest.approx(9.0, rel=0.005)
        assert term.central_moment(3) / 27.0 == pytest.approx(skewness, abs=0.02)


@pytest.mark.parametrize("skewness", [-1.5, -0.3, 0.2, 1.0, 2.4])
@pytest.mark.parametrize("level_kw", [-9.3, -2.51, 0.07, 4.44, 12.0, 40.0])
def test_the_term_rounded_down_and_up_brackets_the_gamma_law(skewness, level_kw):
    k, lean = 4.0 / skewness**2, np.sign(skewness)
    away = k + k**0.5 * lean * level_kw / 3.0
    exact = gamma.sf(away, k) if lean > 0 else gamma.cdf(away, k)
    down, up = skewed_mass(3.0, skewness, 0.01)
    assert down.above(level_kw) <= exact * (1 + 1e-9) + 1e-24
    assert exact <= up.above(level_kw) * (1 + 1e-9) + 1e-24
    if exact > 1e-12:
        assert up.above(level_kw) == pytest.approx(exact, rel=0.25)


def test_a_sum_with_the_term_has_the_groups_skewness_where_the_term_is_large():
    rng = np.random.default_rng(4)
    customers = [lattice_mass(np.rint(rng.gamma(2.0, 0.4, 200) / 0.01) * 0.01, 0.01, "exact") for _ in range(30)]
    counts = (1,) * len(customers)
    alone = DemandSum(terms=tuple(customers), counts=counts)
    held = sum(term.central_moment(2) for term in customers)
    total = with_common_term(BracketedSum(down=alone, up=alone), counts, 20.0 * held, 19.0 * held, 0.8)
    for law in plain_distributions(total):
        assert law.central_moment(2) == pytest.approx(20.0 * held, rel=0.01)
        assert law.central_moment(3) / law.central_moment(2) ** 1.5 == pytest.approx(0.8, abs=0.03)


def test_nothing_is_added_where_nothing_is_missing():
    one = lattice_mass(np.array([1.0, 2.0]), 1.0, "exact")
    alone = DemandSum(terms=(one,), counts=(1,))
    total = BracketedSum(down=alone, up=alone)
    assert with_common_term(total, (1,), 0.25, 0.0, 1.0) is total


def test_what_is_missing_of_a_small_term_is_drawn_towards_the_groups_skewness():
    assert missing_skewness(0.5, 1.0, 1.0, 0.0) == pytest.approx(0.5)
    # 1 % of the variance: the third moment would ask for a skewness of 400, the group's own is 0.5
    assert missing_skewness(0.5, 1.0, 0.01, 0.1) == MOST_SKEWED
    small = missing_skewness(0.5, 1.0, 0.01, 0.4999)
    assert 0.5 > small > 0.4
    assert missing_skewness(0.5, 1.0, 0.0, 0.1) == 0.0


def test_the_skewness_of_few_days_is_corrected():
    rng = np.random.default_rng(8)
    found = [skewness_along_day(rng.gamma(4.0, 1.0, (20, 48)), 0.0).mean() for _ in range(40)]
    plain = []
    rng = np.random.default_rng(8)
    for _ in range(40):
        z = rng.gamma(4.0, 1.0, (20, 48))
        z = (z - z.mean(axis=0)) / z.std(axis=0)
        plain.append((z**3).mean())
    assert abs(np.mean(found) - 1.0) < abs(np.mean(plain) - 1.0)  # the law's skewness is 2 / sqrt(4) = 1
    assert np.mean(found) == pytest.approx(0.85, abs=0.1)


def test_too_few_days_or_no_movement_have_no_skewness():
    sums = np.full((10, 2), np.nan)
    sums[:3, 0] = [1.0, 2.0, 9.0]
    sums[:, 1] = 7.0
    assert np.array_equal(skewness_along_day(sums, 0.0), [0.0, 0.0])


def test_one_customers_variance_is_as_unknown_as_students_law_says():
    assert variance_uncertainty_kw2([4.0], 4.0, 13) == pytest.approx(4.0 * 2 / 10)


def test_the_own_part_of_alike_customers_is_known_better_by_their_number():
    assert variance_uncertainty_kw2([1.0] * 25, 25.0, 13) == pytest.approx(25.0 * 0.2 / 25)
    assert variance_uncertainty_kw2([1.0] * 25, 100.0, 13) == pytest.approx(100.0 * 0.2 * (0.75 + 0.25 / 25))
    assert variance_uncertainty_kw2([], 9.0, 13) == pytest.approx(1.8)
