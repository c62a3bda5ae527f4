"""Sums of independent demands."""

import numpy as np
import pytest

from loadsum.demand.convolution import BracketedSum, DemandSum
from loadsum.demand.lattice import lattice_mass

# Computed from the published formula: exact rational convolution of 10 customers of one kind and 5 of another.
FIFTEEN_CUSTOMERS = {30.0: 0.16686038952946, 35.0: 0.050796974614807, 40.0: 0.009563649207436, 55.0: 0.000013180919698}


def fifteen_customers() -> DemandSum:
    first = lattice_mass(np.array([0.5, 2.0, 6.0]), 0.5, "exact", np.array([0.6, 0.3, 0.1]))
    second = lattice_mass(np.array([1.0, 4.0]), 0.5, "exact", np.array([0.7, 0.3]))
    return DemandSum(terms=(first, second), counts=(10, 5))


@pytest.mark.parametrize(("level_kw", "probability"), FIFTEEN_CUSTOMERS.items())
def test_the_sum_of_fifteen_customers_agrees_with_exact_fractions(level_kw, probability):
    assert fifteen_customers().above(level_kw) == pytest.approx(probability, rel=0, abs=1e-14)


def test_the_bracket_of_a_sum_that_was_not_rounded_has_no_width():
    total = fifteen_customers()
    bracket = BracketedSum(down=total, up=total)
    assert bracket.exact and bracket.above(40.0)[0] == bracket.above(40.0)[1]
