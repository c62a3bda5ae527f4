"""The normal family against published and recomputed values, and its use beside the exact sum."""

import numpy as np
import pytest
from scipy.stats import norm

from loadsum.demand.bounds import bennett_bound, bernstein_bound, chernoff_bound, hoeffding_bound
from loadsum.demand.convolution import DemandSum
from loadsum.demand.lattice import LatticeMass, lattice_mass, normal_mass
from loadsum.demand.normal import (
    berry_esseen_bound,
    berry_esseen_bound_of_like_terms,
    cornish_fisher_kw,
    edgeworth_exceedance,
    normal_comparison,
    normal_exceedance,
)
from loadsum.demand.normalreach import customers_until_normal
from loadsum.demand.saddlepoint import lattice_saddlepoint, lugannani_rice
from tests.demand.exactsum import lattice
from tests.reference.sums import expected


def gamma_sum(n):
    """Mean, variance, skewness and excess kurtosis of the sum of n exponential variables of mean one."""
    return float(n), float(n), 2.0 / np.sqrt(n), 6.0 / n


@pytest.mark.parametrize(("level", "probability"), expected("Q").items())
def test_the_normal_tail_agrees_with_forty_digit_arithmetic(level, probability):
    assert normal_exceedance(float(level), 0.0, 1.0) == pytest.approx(float(probability), rel=1e-13)


@pytest.mark.parametrize(("share", "level"), expected("z").items())
def test_normal_quantiles_agree_with_forty_digit_arithmetic(share, level):
    assert cornish_fisher_kw(1.0 - float(share), 0.0, 1.0, 0.0) == pytest.approx(float(level), rel=1e-10)


@pytest.mark.parametrize("rho", expected("equicorr"))
def test_the_normal_law_with_covariance_agrees_with_the_equicorrelated_group(rho):
    variance = 20 * 1.2**2 * (1.0 + 19 * float(rho))
    value = normal_exceedance(45.0, 20 * 1.5, variance)
    assert value == pytest.approx(float(expected("equicorr")[rho]["P(S>45)"]), rel=1e-9)


@pytest.mark.parametrize("case", expected("gamma_tails"))
def test_cumulant_corrections_and_the_saddlepoint_agree_with_recomputed_values(case):
    n, level = (float(part[2:]) for part in case.split(","))
    mean, variance, skewness, kurtosis = gamma_sum(n)
    values = {name: float(value) for name, value in expected("gamma_tails")[case].items()}
    assert normal_exceedance(level, mean, variance) == pytest.approx(values["normal"], rel=1e-8)
    assert edgeworth_exceedance(level, mean, variance, skewness) == pytest.approx(values["edgeworth1"], rel=1e-8)
    both = edgeworth_exceedance(level, mean, variance, skewness, kurtosis)
    assert both == pytest.approx(values["edgeworth2"], rel=1e-8)
    s = 1.0 - n / level  # K(s) = -n log(1 - s)
    found = lugannani_rice(s, -n * np.log(1.0 - s), level, n / (1.0 - s) ** 2, 2.0 * n / (1.0 - s) ** 3)
    assert found == pytest.approx(values["LR"], rel=1e-9)


@pytest.mark.parametrize("case", expected("cornish_fisher"))
def test_levels_from_cumulants_agree_with_recomputed_values(case):
    n, share = (float(part[2:]) for part in case.split(","))
    mean, variance, skewness, kurtosis = gamma_sum(n)
    values = expected("cornish_fisher")[case]
    assert cornish_fisher_kw(1.0 - share, mean, variance, 0.0) == pytest.approx(float(values["normal"]), rel=1e-9)
    assert cornish_fisher_kw(1.0 - share, mean, variance, skewness) == pytest.approx(float(values["CF2"]), rel=1e-9)
    third = cornish_fisher_kw(1.0 - share, mean, variance, skewness, kurtosis)
    assert third == pytest.approx(float(values["CF3"]), rel=1e-9)


def lattice_case(case):
    """The sum and the least k of a case of the reference values."""
    name, least = case.rsplit(",k=", 1)
    if name.startswith("PB"):
        return DemandSum(terms=tuple(lattice([20 - i, i], step_kw=1.0) for i in range(1, 11)), counts=(1,) * 10), int(
            least
        )
    count, share = name[4:-1].split(",")
    term = LatticeMass(step_kw=1.0, offset=0, mass=np.array([1.0 - float(share), float(share)]))
    return DemandSum(terms=(term,), counts=(int(count),)), int(least)


@pytest.mark.parametrize("case", expected("lattice_LR"))
def test_the_lattice_saddlepoint_and_the_bounds_agree_with_recomputed_values(case):
    total, least = lattice_case(case)
    values = {name: float(value) for name, value in expected("lattice_LR")[case].items()}
    level = least - 1.0
    assert total.above(level) == pytest.approx(values["exact"], rel=1e-12)
    assert lattice_saddlepoint(total, level, order=1) == pytest.approx(values["daniels1"], rel=1e-8)
    assert lattice_saddlepoint(total, level, order=2) == pytest.approx(values["daniels2"], rel=1e-8)
    assert chernoff_bound(total, level) == pytest.approx(values["chernoff"], rel=1e-7)
    assert hoeffding_bound(total, level) == pytest.approx(values["hoeffding"], rel=1e-7)
    # the recomputed values take the whole range, 1, as the largest rise
    assert bernstein_bound(total, level, largest_rise_kw=1.0) == pytest.approx(values["bernstein"], rel=1e-7)
    assert bennett_bound(total, level, largest_rise_kw=1.0) == pytest.approx(values["bennett"], rel=1e-7)


def test_bounds_lie_above_the_exact_probability_and_the_tighter_below_the_looser():
    rng = np.random.default_rng(3)
    total = DemandSum(
        terms=tuple(lattice_mass(np.round(rng.gamma(1.0, 1.0, 50), 1), 0.1, "exact") for _ in range(12)),
        counts=(1,) * 12,
    )
    for level in (16.0, 22.0, 28.0):
        exact = total.above(level)
        chernoff, bennett, bernstein = (f(total, level) for f in (chernoff_bound, bennett_bound, bernstein_bound))
        assert exact < chernoff <= min(bennett, hoeffding_bound(total, level))
        assert bennett <= bernstein
    with pytest.raises(ValueError, match="level above the mean"):
        chernoff_bound(total, 1.0)


def test_the_saddlepoint_serves_below_the_mean_and_at_it():
    total = DemandSum(terms=(LatticeMass(step_kw=1.0, offset=0, mass=np.array([0.7, 0.3])),), counts=(40,))
    for level in (4.0, 8.0, 11.0, 12.0, 13.0):
        assert lattice_saddlepoint(total, level) == pytest.approx(total.above(level), rel=2e-3)
    assert np.isnan(lattice_saddlepoint(total, 60.0))


def test_the_saddlepoint_knows_a_coarser_lattice_inside_the_lattice():
    fine = DemandSum(terms=(LatticeMass(step_kw=0.1, offset=0, mass=np.array([0.7, 0, 0, 0, 0, 0.3])),), counts=(40,))
    coarse = DemandSum(terms=(LatticeMass(step_kw=0.5, offset=0, mass=np.array([0.7, 0.3])),), counts=(40,))
    assert lattice_saddlepoint(fine, 9.0) == pytest.approx(lattice_saddlepoint(coarse, 9.0), rel=1e-10)


def test_berry_esseen_bounds_agree_with_the_published_constants():
    values = {name: float(value) for name, value in expected("berry_esseen").items()}
    total = DemandSum(terms=(LatticeMass(step_kw=1.0, offset=0, mass=np.array([0.9, 0.1])),), counts=(20,))
    like = berry_esseen_bound_of_like_terms(20, values["rho/sigma^3"])
    assert like == pytest.approx(values["bound_0.3031(r+0.646)"], rel=1e-8)
    # 0.5583 is from memory and only a check here; the program's own constant is 0.5600 (read in the source)
    assert berry_esseen_bound(total, 0.5583) == pytest.approx(values["noniid_0.5583"], rel=1e-8)
    assert berry_esseen_bound(total) == pytest.approx(values["noniid_0.5583"] * 0.56 / 0.5583, rel=1e-8)
    whole = np.array([total.below(k + 0.5) for k in range(21)])
    left = np.array([total.below(float(k)) for k in range(21)])
    z = norm.cdf((np.arange(21) - 2.0) / np.sqrt(1.8))
    actual = max(np.abs(whole - z).max(), np.abs(left - z).max())
    assert actual == pytest.approx(values["actual_sup"], rel=1e-8)
    assert actual < like
    with pytest.raises(ValueError, match="is a constant"):
        berry_esseen_bound(DemandSum(terms=(lattice([1]),), counts=(3,)))


def customer():
    rng = np.random.default_rng(0)
    return lattice_mass(np.round(rng.lognormal(-0.5, 0.8, 90), 2), 0.01, "exact")


def test_the_comparison_shows_by_how_much_the_normal_law_is_off():
    one = customer()
    total = DemandSum(terms=(one, normal_mass(0.0, 0.5, 0.01, "down")), counts=(8, 1))
    levels = np.array([9.0, 12.0, 15.0])
    found = normal_comparison(total, levels, 8 * one.central_moment(2))
    assert found.exact == pytest.approx(total.above_many(levels))
    assert np.all(found.normal_independent < found.normal_covariance)
    assert found.normal_too_small == pytest.approx(found.exact / found.normal_covariance)
    assert np.all(np.diff(found.normal_too_small) > 0.0) and found.normal_too_small[-1] > 5.0
    assert found.saddlepoint == pytest.approx(found.exact, rel=0.05)
    assert found.largest_distance > 0.1
    with pytest.raises(ValueError, match="read-only"):
        found.exact[0] = 0.0


@pytest.mark.parametrize("exceeded_with", [0.01, 0.001])
def test_the_number_of_customers_from_which_the_normal_law_would_do_is_found(exceeded_with):
    found = customers_until_normal(customer(), exceeded_with)
    assert found.customers is not None and found.answer == f"from {found.customers} customers"

    def error(n):
        total = DemandSum(terms=(customer(),), counts=(n,))
        level = total.quantile_kw(exceeded_with)
        return normal_exceedance(level + 0.005, total.mean_kw(), total.variance_kw2()) / total.above(level) - 1.0

    assert abs(error(found.customers)) <= 0.10 < abs(error(found.customers - 1))
    assert abs(error(2 * found.customers)) <= 0.10


def test_more_customers_are_needed_further_out():
    near, far = (customers_until_normal(customer(), p).customers for p in (0.01, 0.001))
    assert 100 < near < far


def test_the_normal_law_never_does_where_skewed_weather_is_shared():
    rng = np.random.default_rng(1)
    common = lattice_mass(np.round(rng.gamma(2.0, 0.1, 90), 2), 0.01, "exact")
    assert customers_until_normal(customer(), 0.01, common=common).answer == "never, because of shared weather"


def test_the_normal_law_of_independent_customers_never_does_where_anything_is_shared():
    common = normal_mass(0.0, 0.15, 0.01, "down")
    unaware = customers_until_normal(customer(), 0.01, common=common, covariance_known=False)
    assert unaware.customers is None and unaware.answer == "never, because of shared weather"
    aware = customers_until_normal(customer(), 0.01, common=common, largest=80)
    assert aware.customers is not None and aware.customers < 80


def test_a_number_beyond_the_largest_tried_is_not_made_up():
    found = customers_until_normal(customer(), 0.001, largest=50)
    assert found.customers is None and found.answer == "not up to 50 customers"
