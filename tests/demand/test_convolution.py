"""Sums of independent demands against exact whole-number arithmetic and published values."""

from fractions import Fraction

import numpy as np
import pytest

from loadsum.demand.convolution import BracketedSum, DemandSum, sum_distribution
from loadsum.demand.lattice import LatticeMass, kernel_mass, lattice_mass, mixture, normal_mass
from tests.demand.exactsum import ExactSum, lattice, of_floats, relative_error, sparse
from tests.reference.sums import expected

TOLERANCE = 1e-10
SMALLEST = 1e-15


def household(rng, step_kw=0.01):
    """Counts of 90 invented readings: a lognormal body and appliance spikes."""
    kw = rng.lognormal(np.log(0.4), 0.8, 90) + (rng.random(90) < 0.2) * rng.choice([1.5, 2.0, 2.4], 90)
    return np.bincount(np.rint(kw / step_kw).astype(int)).tolist()


def check_against_exact(weights, counts, how_many=14):
    """Every tail between 0.5 and 1e-15 agrees to 1e-10 and no error estimate is exceeded; the same downwards."""
    exact = ExactSum(weights, counts)
    points = exact.points_between(SMALLEST, 0.5, how_many)
    assert points
    total = DemandSum(terms=tuple(lattice(row) for row in weights), counts=tuple(counts))
    levels = (np.array(points) - 1.0) * 0.01
    mirrored = DemandSum(terms=tuple(lattice(row[::-1], -len(row) + 1) for row in weights), counts=tuple(counts))
    for tails in (total._above(levels).probability[0], mirrored.below_many(-levels)):
        worst = max(relative_error(p, exact.at_least(point)) for p, point in zip(tails, points, strict=True))
        assert worst <= TOLERANCE
    found = total._above(levels)
    for p, estimate, point in zip(found.probability[0], found.relative_error[0], points, strict=True):
        assert relative_error(p, exact.at_least(point)) <= estimate


@pytest.mark.parametrize("customers", [1, 2, 8, 40, pytest.param(200, marks=pytest.mark.slow)])
def test_tails_of_unlike_customers_agree_with_whole_number_arithmetic(customers):
    rng = np.random.default_rng(customers)
    check_against_exact([household(rng) for _ in range(customers)], [1] * customers)


@pytest.mark.parametrize("copies", [10, 100, pytest.param(1000, marks=pytest.mark.slow)])
def test_tails_of_like_customers_agree_with_whole_number_arithmetic(copies):
    rng = np.random.default_rng(copies)
    weights = household(rng, 0.01 if copies <= 10 else 0.05 if copies <= 100 else 0.2)
    check_against_exact([weights], [copies])


@pytest.mark.parametrize("weights", [[99, 1], pytest.param([5, 3, 0, 1], marks=pytest.mark.slow)])
def test_tails_of_ten_thousand_like_customers_agree_with_whole_number_arithmetic(weights):
    check_against_exact([weights], [10_000], 6)


def dwarfs(count, median=12):
    rng = np.random.default_rng(7)
    return [np.bincount(np.rint(rng.lognormal(np.log(median), 0.6, 60)).astype(int)).tolist() for _ in range(count)]


ADVERSARIAL = {
    "a giant among dwarfs": ([*dwarfs(12), sparse({0: 89, 9000: 1})], [1] * 13),
    "a giant that is almost never on": ([*dwarfs(12), sparse({0: 10**9 - 1, 9000: 1})], [1] * 13),
    "two rare giants of unlike size": (
        [*dwarfs(10), sparse({0: 10**5 - 1, 9000: 1}), sparse({0: 10**4 - 1, 4000: 1})],
        [1] * 12,
    ),
    "like customers with a rare giant": ([sparse({0: 5 * 10**7, 3: 5 * 10**7 - 1, 900: 1})], [40]),
    "like customers with a giant that is almost never on": ([sparse({0: 5 * 10**9, 3: 5 * 10**9 - 1, 200: 1})], [60]),
    "sizes in powers of four": ([sparse({0: 1, 4**i: 1}) for i in range(8)], [1] * 8),
    "rare sizes in powers of three": ([sparse({0: 999, 3**i: 1}) for i in range(9)], [1] * 9),
    "a comb with one tooth far out": ([sparse({0: 1, 2: 1, 4: 1, 401: 1})], [20]),
    "one wide flat term and many small ones": ([[1] * 6000, [1, 1]], [1, 60]),
    "two bumps each": ([sparse({0: 70, 1: 10, 299: 2, 300: 8})], [20]),
    "a heavy tail": ([[int(1e12 / (i + 1) ** 2.5) for i in range(800)]], [12]),
    "masses over hundreds of decades": ([[max(1, int(2.0 ** (900 - 9 * i))) for i in range(90)]], [12]),
    "skewed to the left": ([sparse({0: 1, 300: 899, 301: 100})], [25]),
    "multiples of seven and one odd reading": (
        [sparse({7 * i: i + 1 for i in range(30)}), sparse({0: 999_999, 1: 1})],
        [20, 1],
    ),
    "a second reading once in a million": ([sparse({0: 999_999, 1: 1})], [50]),
    "two customers of whom one is rare and large": ([dwarfs(1)[0], sparse({0: 999_999, 700: 1})], [1, 1]),
    "a gap of twenty thousand steps": ([*dwarfs(3), sparse({0: 50, 20_000: 1})], [1, 1, 1, 2]),
    "constants among the terms": (
        [sparse({5: 1}), sparse({0: 1, 10: 3}), sparse({100: 1}), *dwarfs(6)],
        [10, 5, 1] + [1] * 6,
    ),
    "three sparse giants among dwarfs": (
        dwarfs(10) + [sparse({int(p): 1 for p in np.random.default_rng(s).integers(0, 5000, 40)}) for s in range(3)],
        [1] * 13,
    ),
}


@pytest.mark.parametrize("shape", ADVERSARIAL)
def test_tails_of_awkward_shapes_agree_with_whole_number_arithmetic(shape):
    weights, counts = ADVERSARIAL[shape]
    check_against_exact(weights, counts, 8)


def random_shape(rng):
    """Up to eight terms of random kinds, some of them many times."""
    weights, counts = [], []
    for _ in range(rng.integers(1, 9)):
        kind = rng.integers(6)
        if kind == 0:
            body = rng.lognormal(rng.uniform(0.0, 4.5), rng.uniform(0.1, 1.2), 90)
            row = np.bincount(np.rint(body).astype(int).clip(0, 2000)).tolist()
        elif kind == 1:
            row = sparse({0: int(10 ** rng.uniform(0, 14)), int(rng.integers(1, 2000)): int(10 ** rng.uniform(0, 3))})
        elif kind == 2:
            row = [int(w) + 1 for w in 10 ** rng.uniform(0, 12, int(rng.integers(2, 200)))]
        elif kind == 3:
            places = rng.integers(0, 1500, 20).tolist()
            row = sparse({p: int(w) for p, w in zip(places, 10 ** rng.uniform(0, 8, 20), strict=True)})
        elif kind == 4:
            row = [1] * int(rng.integers(2, 900))
        else:
            step = int(rng.integers(2, 60))
            row = sparse({step * int(p): 1 + int(w) for p, w in zip(range(8), rng.integers(0, 100, 8), strict=True)})
        weights.append(row)
        counts.append(int(rng.choice([1, 1, 1, 2, 5, 20])))
    return weights, counts


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(150))
def test_tails_of_random_shapes_agree_with_whole_number_arithmetic(seed):
    weights, counts = random_shape(np.random.default_rng(seed))
    weights.append([1, 2, 1])  # so that there is a tail to look at
    check_against_exact(weights, [*counts, 10], 6)


def adopted_model():
    """Customers with borrowed readings, a smoothed common component and an uncertain mean."""
    rng = np.random.default_rng(5)
    step = 0.05
    customers = []
    for _ in range(6):
        own = lattice_mass(rng.lognormal(-0.7, 0.8, 40), step, "down")
        lent = lattice_mass(rng.lognormal(-0.6, 0.9, 300), step, "down")
        customers.append(mixture([own, lent], [0.85, 0.15]))
    common = kernel_mass(rng.normal(0.0, 0.6, 40), np.ones(40), 0.25, step, "down")
    return DemandSum(terms=(*customers, common, normal_mass(0.0, 0.2, step, "down")), counts=(1,) * 8)


def test_the_adopted_model_agrees_with_its_slow_twin_at_high_precision():
    total = adopted_model()
    exact, bottom = of_floats(total), sum(term.offset for term in total.terms)
    points = exact.points_between(SMALLEST, 0.5, 20)
    tails = total.above_many((np.array(points) - 0.5 + bottom) * total.step_kw)
    assert max(relative_error(p, exact.at_least(q)) for p, q in zip(tails, points, strict=True)) <= TOLERANCE


# Published values ------------------------------------------------------------------------------------------------


def test_the_sum_of_fifteen_customers_agrees_with_exact_fractions():
    first = lattice_mass(np.array([0.5, 2.0, 6.0]), 0.5, "exact", np.array([0.6, 0.3, 0.1]))
    second = lattice_mass(np.array([1.0, 4.0]), 0.5, "exact", np.array([0.7, 0.3]))
    total = DemandSum(terms=(first, second), counts=(10, 5))
    values = expected("hetero_lattice")
    assert total.mean_kw() == pytest.approx(values["mean_kW"], rel=1e-13)
    assert total.variance_kw2() == pytest.approx(values["var"], rel=1e-13)
    assert total.skewness() == pytest.approx(values["skew"], rel=1e-12)
    for level in (30, 35, 40, 45, 50, 55):
        printed = values[f"P(S>{level})"]["exact"]  # fifteen decimals
        assert total.above(float(level)) == pytest.approx(float(printed), rel=0, abs=0.5e-15)
    assert total.largest_kw == pytest.approx(values["max_kW"])
    assert total.above(79.9) == pytest.approx(float(values["P(S=80)"]), rel=1e-12)


@pytest.mark.parametrize("case", expected("dice"))
def test_dice_agree_with_exact_enumeration(case):
    count, least = int(case[2 : case.index(",")]), int(case[case.index(">=") + 2 : -1])
    die = LatticeMass(step_kw=1.0, offset=1, mass=np.full(6, 1.0 / 6.0))
    value = DemandSum(terms=(die,), counts=(count,)).above(least - 1.0)
    assert value == pytest.approx(float(expected("dice")[case]["dec"]), rel=1e-13)


@pytest.mark.parametrize("case", expected("binom"))
def test_binomial_tails_agree_with_exact_fractions(case):
    count, share, least = case.split(",")
    share, least = Fraction(share[2:]), int(least[least.index(">=") + 2 : -1])
    term = lattice([share.denominator - share.numerator, share.numerator], step_kw=1.0)
    value = DemandSum(terms=(term,), counts=(int(count[2:]),)).above(least - 1.0)
    assert value == pytest.approx(float(expected("binom")[case]), rel=1e-12)


def test_the_poisson_binomial_law_agrees_with_exact_fractions():
    values = expected("poisson_binomial")
    total = DemandSum(terms=tuple(lattice([20 - i, i], step_kw=1.0) for i in range(1, 11)), counts=(1,) * 10)
    assert total.distribution().mass == pytest.approx([float(p) for p in values["pmf"]], rel=1e-13)
    assert total.mean_kw() == pytest.approx(values["mean"])
    assert total.variance_kw2() == pytest.approx(values["var"])
    assert total.above(5.0) == pytest.approx(float(values["P>=6"]), rel=1e-13)
    assert total.above(7.0) == pytest.approx(float(values["P>=8"]), rel=1e-13)


@pytest.mark.parametrize(("count", "share", "least"), [(50, Fraction(1, 10), 30), (100, Fraction(1, 20), 60)])
def test_tails_far_below_the_rounding_of_the_whole_law_keep_their_digits(count, share, least):
    printed = expected("fft_tilt")[f"fft_tilt_Bin({count},{float(share)})>={least}"]["exact"]
    term = lattice([share.denominator - share.numerator, share.numerator], step_kw=1.0)
    value = DemandSum(terms=(term,), counts=(count,)).above(least - 1.0)
    assert value == pytest.approx(float(printed), rel=1e-13)


def test_two_short_rows_keep_the_digits_that_a_transform_of_the_whole_law_loses():
    row = np.array([1.0, 1e-15])
    law = DemandSum(terms=(LatticeMass(step_kw=1.0, offset=0, mass=row),), counts=(2,)).distribution()
    assert law.mass == pytest.approx(expected("fft_tilt")["fft_signalSE_example"]["direct"], rel=1e-15)


# Shapes that must work ---------------------------------------------------------------------------------------------


def test_customers_that_are_always_zero_never_exceed_zero():
    zero = lattice_mass(np.zeros(30), 0.01, "exact")
    total = DemandSum(terms=(zero, zero), counts=(1, 3))
    assert total.above(0.0) == 0.0
    assert total.below(0.0) == 0.0
    assert total.above(-0.01) == 1.0
    assert total.quantile_kw(0.01) == 0.0
    assert total.distribution().mass.tolist() == [1.0]
    assert (total.mean_kw(), total.variance_kw2(), total.skewness(), total.excess_kurtosis()) == (0.0, 0.0, 0.0, 0.0)


def test_constant_customers_shift_the_sum():
    varying = lattice_mass(np.array([0.2, 0.5, 1.1]), 0.1, "exact")
    constant = lattice_mass(np.full(5, 0.7), 0.1, "exact")
    alone = DemandSum(terms=(varying,), counts=(4,))
    shifted = DemandSum(terms=(varying, constant), counts=(4, 2))
    for level in (0.9, 2.0, 3.5, 4.3):
        assert shifted.above(level + 1.4) == pytest.approx(alone.above(level), rel=1e-13)


def test_a_single_customer_is_its_own_readings():
    readings = np.array([0.1, 0.4, 0.4, 2.5])
    total = DemandSum(terms=(lattice_mass(readings, 0.1, "exact"),), counts=(1,))
    assert total.above(0.4) == 0.25
    assert total.above(0.39) == 0.75
    assert total.below(0.4) == 0.25
    assert total.above(2.5) == 0.0


def test_export_is_an_ordinary_demand_below_zero():
    rng = np.random.default_rng(11)
    exporters = [lattice_mass(np.round(rng.normal(0.2, 1.0, 60), 2), 0.01, "exact") for _ in range(15)]
    total = DemandSum(terms=tuple(exporters), counts=(1,) * 15)
    exact, bottom = of_floats(total), sum(term.offset for term in exporters)
    for level in (-9.0, -6.0, -3.0, 0.0, 6.0, 12.0):
        point = round(level / 0.01) - bottom
        below = 1 - exact.at_least(point)
        assert relative_error(total.below(level), below) <= TOLERANCE
        assert relative_error(total.above(level), exact.at_least(point + 1)) <= TOLERANCE


def test_levels_beyond_both_ends_have_probability_zero_and_one():
    total = DemandSum(terms=(lattice_mass(np.array([0.5, 1.0]), 0.5, "exact"),), counts=(3,))
    assert (total.least_kw, total.largest_kw) == (1.5, 3.0)
    assert total.above(3.0) == 0.0
    assert total.above(1.4) == pytest.approx(1.0, rel=1e-15)
    assert total.below(1.5) == 0.0
    assert total.below(3.1) == pytest.approx(1.0, rel=1e-15)


def test_the_quantile_is_the_smallest_level_exceeded_with_at_most_the_probability():
    rng = np.random.default_rng(2)
    for customers in (1, 3, 30):
        total = DemandSum(terms=tuple(lattice(household(rng)) for _ in range(customers)), counts=(1,) * customers)
        for p in (0.6, 0.1, 0.01, 1e-3, 1e-6, 1e-12):
            level = total.quantile_kw(p)
            assert total.above(level) <= p
            assert level == total.least_kw or total.above(level - 0.01) > p


def test_the_whole_law_is_not_negative_holds_all_mass_and_agrees_with_direct_convolution():
    rng = np.random.default_rng(4)
    terms = [lattice(household(rng)) for _ in range(45)]
    law = sum_distribution(terms)
    direct = np.ones(1)
    for term in terms:
        direct = np.convolve(direct, term.mass)
    start = law.offset - sum(term.offset for term in terms)
    same = direct[start : start + law.mass.size]
    assert law.mass.min() >= 0.0
    assert law.mass.sum() == pytest.approx(1.0, abs=1e-12)
    assert np.abs(law.mass - same).max() <= 1e-16
    deep = same > 1e-16
    assert np.abs(law.mass[deep] / same[deep] - 1.0).max() <= 1e-10
    assert direct[:start].sum() + direct[start + law.mass.size :].sum() < 1e-15


def test_levels_asked_together_and_one_by_one_give_the_same():
    rng = np.random.default_rng(6)
    total = DemandSum(terms=tuple(lattice(household(rng)) for _ in range(25)), counts=(1,) * 25)
    levels = np.linspace(5.0, 60.0, 23)
    alone = np.array([total.above(float(level)) for level in levels])
    assert total.above_many(levels) == pytest.approx(alone, rel=1e-10)


def test_the_tail_says_how_it_was_computed():
    rng = np.random.default_rng(8)
    tail = DemandSum(terms=tuple(lattice(household(rng)) for _ in range(30)), counts=(1,) * 30).tail(50.0)
    assert tail.tilts >= 1
    assert 0.0 < tail.relative_error < 1e-10


def test_terms_on_unlike_lattices_are_refused():
    with pytest.raises(ValueError, match="share one lattice step"):
        DemandSum(terms=(lattice([1, 1], step_kw=0.01), lattice([1, 1], step_kw=0.02)), counts=(1, 1))
    with pytest.raises(ValueError, match="positive count"):
        DemandSum(terms=(lattice([1, 1]),), counts=(0,))


def test_a_sum_that_was_not_rounded_has_a_bracket_without_width():
    total = DemandSum(terms=(lattice([3, 2, 1]),), counts=(9,))
    bracket = BracketedSum(down=total, up=total)
    assert bracket.exact
    assert bracket.above(0.1)[0] == bracket.above(0.1)[1] > 0.0
    assert bracket.below(0.1)[0] == bracket.below(0.1)[1] > 0.0
