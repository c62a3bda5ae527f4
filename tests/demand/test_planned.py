import numpy as np
import pytest

from loadsum.demand.planned import Planned, planned_terms, pooled, total_variance, within

CLASSES = ("flat", "house", "flat")
ENERGY = np.array([2000.0, 5000.0, 4000.0])
KW = np.array([[1.0, 2.0, np.nan], [5.0, 6.0, 7.0], [2.0, 4.0, 6.0]])


def test_a_planned_customer_is_a_typical_member_every_member_counting_equally():
    (term,) = planned_terms([Planned(customer_class="flat", count=3)], CLASSES, ENERGY)
    values, weights = pooled(term, KW)
    assert values.tolist() == [1.0, 2.0, 2.0, 4.0, 6.0]
    assert weights.tolist() == pytest.approx([0.25, 0.25, 1 / 6, 1 / 6, 1 / 6])


def test_billed_energy_scales_every_member_to_it():
    (term,) = planned_terms([Planned(customer_class="flat", count=1, annual_kwh=3000.0)], CLASSES, ENERGY)
    assert term.scale.tolist() == pytest.approx([1.5, 0.75])
    values, _ = pooled(term, KW)
    assert values.tolist() == pytest.approx([1.5, 3.0, 1.5, 3.0, 4.5])


def test_nobody_can_stand_for_a_class_without_meters():
    with pytest.raises(ValueError, match="shop"):
        planned_terms([Planned(customer_class="shop", count=1)], CLASSES, ENERGY)


def test_members_without_energy_cannot_be_scaled():
    with pytest.raises(ValueError, match="house"):
        planned_terms([Planned(customer_class="house", count=1, annual_kwh=1000.0)], CLASSES, np.array([1.0, 0.0, 1.0]))


def test_what_tells_members_apart_does_not_move_with_the_days():
    (term,) = planned_terms([Planned(customer_class="flat", count=2)], CLASSES, ENERGY)
    steady = np.array([[1.0, 1.0], [0.0, 0.0], [3.0, 3.0]])
    assert within(term, steady) == 0.0
    assert within(term, KW) == pytest.approx((0.5**0.5 + 2.0) / 2)


def test_the_groups_variance_is_that_of_equicorrelated_customers():
    # N alike: N s^2 (1 + (N - 1) rho)
    assert total_variance([1.44] * 20, [], [], 0.05) == pytest.approx(20 * 1.44 * 1.95)
    (term,) = planned_terms([Planned(customer_class="flat", count=20)], CLASSES, ENERGY)
    assert total_variance([], [(term, 1.2)], [1.44], 0.05) == pytest.approx(20 * 1.44 * 1.95)
    assert total_variance([], [(term, 1.2)], [2.0], 0.0) == pytest.approx(40.0)
