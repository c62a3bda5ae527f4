import numpy as np
import pytest

from loadsum.demand.customerclass import borrowed, relative_readings, weighted_variance


def test_a_customer_borrows_from_all_others_equally_and_keeps_its_mean():
    kw = np.array([[1.0, 3.0, np.nan, np.nan], [2.0, 2.0, 2.0, 6.0], [5.0, 15.0, 10.0, 10.0]])
    relative = relative_readings(kw)
    values, weights = borrowed(relative, 0, 2.0)
    assert weights.sum() == pytest.approx(1.0)
    assert values @ weights == pytest.approx(2.0)
    assert values.tolist() == pytest.approx([4 / 3, 4 / 3, 4 / 3, 4.0, 1.0, 3.0, 2.0, 2.0])
    assert weights.tolist() == pytest.approx([0.125] * 8)


def test_members_with_unequal_numbers_of_days_count_equally():
    relative = relative_readings(np.array([[1.0, 1.0, 1.0, 1.0], [2.0, np.nan, np.nan, np.nan], [3.0, 1.0, 3.0, 1.0]]))
    _, weights = borrowed(relative, 0, 1.0)
    assert weights.tolist() == pytest.approx([0.5, 0.125, 0.125, 0.125, 0.125])


def test_nobody_alone_or_at_zero_borrows():
    relative = relative_readings(np.array([[1.0, 2.0], [0.0, 0.0], [-1.0, -2.0]]))
    assert [r.size for r in relative] == [2, 0, 0]
    assert borrowed(relative, 0, 1.5)[0].size == 0
    assert borrowed(relative, 1, 0.0)[0].size == 0


def test_the_weighted_variance_is_that_of_the_discrete_law():
    assert weighted_variance(np.array([0.0, 1.0]), np.array([0.75, 0.25])) == pytest.approx(0.1875)
