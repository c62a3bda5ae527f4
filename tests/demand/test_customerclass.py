import numpy as np
import pytest

from loadsum.demand.customerclass import borrowed, class_pool, weighted_variance


def test_a_customer_borrows_from_all_others_equally_and_keeps_its_mean():
    kw = np.array([[1.0, 3.0, np.nan, np.nan], [2.0, 2.0, 2.0, 6.0], [5.0, 15.0, 10.0, 10.0]])
    pool = class_pool(kw)
    values, weights = borrowed(pool, 0, 2.0)
    assert weights.sum() == pytest.approx(1.0)
    assert values @ weights == pytest.approx(2.0)
    assert values.tolist() == pytest.approx([4 / 3, 4 / 3, 4 / 3, 4.0, 1.0, 3.0, 2.0, 2.0])
    assert weights.tolist() == pytest.approx([0.125] * 8)


def test_members_with_unequal_numbers_of_days_count_equally():
    pool = class_pool(np.array([[1.0, 1.0, 1.0, 1.0], [2.0, np.nan, np.nan, np.nan], [3.0, 1.0, 3.0, 1.0]]))
    _, weights = borrowed(pool, 0, 1.0)
    assert weights.tolist() == pytest.approx([0.5, 0.125, 0.125, 0.125, 0.125])


def test_nobody_alone_or_at_zero_borrows():
    pool = class_pool(np.array([[1.0, 2.0], [0.0, 0.0], [-1.0, -2.0]]))
    assert [place.size for place, _ in pool.own] == [2, 0, 0] and pool.lenders == 1
    assert borrowed(pool, 0, 1.5)[0].size == 0
    assert borrowed(pool, 1, 0.0)[0].size == 0


def test_a_large_pool_is_gathered_without_moving_its_mean_or_its_tail():
    rng = np.random.default_rng(3)
    kw = np.round(rng.lognormal(-1.0, 1.0, (40, 100)), 3)
    kw[5, 20:] = np.nan
    whole, gathered = class_pool(kw), class_pool(kw, most_values=100)
    assert gathered.value.size < 0.8 * whole.value.size
    for customer in (0, 5):
        every, gathers = (borrowed(pool, customer, 1.7) for pool in (whole, gathered))
        assert gathers[1].sum() == pytest.approx(1.0) and gathers[1].min() > 0.0
        assert gathers[0] @ gathers[1] == pytest.approx(1.7, rel=1e-3)
        assert weighted_variance(*gathers) == pytest.approx(weighted_variance(*every), rel=1e-3)
        for level in (0.5, 2.0, 8.0, 15.0):
            above = [weights[values > level].sum() for values, weights in (every, gathers)]
            assert above[1] == pytest.approx(above[0], abs=2e-4)


def test_the_weighted_variance_is_that_of_the_discrete_law():
    assert weighted_variance(np.array([0.0, 1.0]), np.array([0.75, 0.25])) == pytest.approx(0.1875)
