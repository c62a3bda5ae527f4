"""The whole demand model: against a slow twin in exact and high-precision arithmetic, and against known truth."""

import itertools
from dataclasses import replace
from fractions import Fraction

import mpmath
import numpy as np
import pytest

from loadsum.demand.group import Group, group_demand
from loadsum.demand.planned import Planned
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock
from tests.benchmarks.calibration import blocks_by_season, synthetic

STEP = 0.1
SETTINGS = ModelSettings(temperature=False, lattice_kw=STEP)


def block(kw, temperature_c=None):
    return DayBlock(
        season="winter",
        day_type="workday",
        days_per_year=100.0,
        day=np.arange(18263, 18263 + kw.shape[1]),
        kw=kw,
        temperature_c=temperature_c,
    )


def demand_of(kw, settings=SETTINGS, **given):
    return group_demand([block(kw)], interval_min=60, power_factor=0.95, settings=settings, **given)


def in_steps(kw):
    return [round(float(v) / STEP) for v in kw]


def convolved(a, b):
    out = {}
    for i, p in a.items():
        for j, q in b.items():
            out[i + j] = out.get(i + j, 0) + p * q
    return out


def twin_rounded(cdf, reach, up):
    """A continuous term on the lattice: mass of each cell at its upper or lower end."""
    edges = [cdf(i * STEP) for i in range(-reach, reach + 1)]
    cells = {i - reach + up: above - below for i, (below, above) in enumerate(itertools.pairwise(edges))}
    return {place: mass for place, mass in cells.items() if mass > 1e-22}


def twin(kw, up):
    """Law of the adopted model of one interval, term by term as docs/methods/dependence.md says."""
    customers, days = kw.shape
    mean = [sum(Fraction(s, 10) for s in in_steps(row)) / days for row in kw]
    share = Fraction(10) / (10 + days)
    total, held, third, own = {0: Fraction(1)}, Fraction(0), Fraction(0), []
    for c in range(customers):
        law = {}
        for s in in_steps(kw[c]):
            law[s] = law.get(s, 0) + (1 - share) / days
        for other in set(range(customers)) - {c}:
            for s in in_steps(kw[other]):
                place = round(float(Fraction(s, 10) / mean[other] * mean[c] / Fraction(1, 10)))
                law[place] = law.get(place, 0) + share / days / (customers - 1)
        first = sum(Fraction(s, 10) * p for s, p in law.items())
        held += sum((Fraction(s, 10) - first) ** 2 * p for s, p in law.items())
        third += sum((Fraction(s, 10) - first) ** 3 * p for s, p in law.items())
        own.append(float(kw[c].var(ddof=1)))
        total = convolved(total, law)
    sums = kw.sum(axis=0)
    pairs = sum(v**0.5 for v in own) ** 2 - sum(own)
    correlation = max((sums.var(ddof=1) - sum(own)) / pairs, 0.0)
    target = sum(own) + correlation * pairs
    missing = target - float(held)
    assert missing > 0.2 * target  # or the case would not test the common term
    z = (sums - sums.mean()) / sums.std()
    skewness = float((z**3).mean()) * (days * (days - 1)) ** 0.5 / (days - 2)
    needed = (skewness * target**1.5 - float(third)) / missing**1.5
    lean = min(max(skewness + missing / target * (needed - skewness), -2.5), 2.5)
    k = mpmath.mpf(4) / lean**2
    spread = mpmath.sqrt(missing)

    def common(x):
        y = k + mpmath.sqrt(k) * x / spread * mpmath.sign(lean)
        below = mpmath.gammainc(k, 0, max(y, mpmath.mpf(0)), regularized=True)
        return below if lean > 0 else 1 - below

    total = convolved(total, twin_rounded(common, 500, up))
    week = (np.arange(18263, 18263 + days) + 3) // 7
    away = sums - sums.mean()
    by_week = [away[week == w].sum() for w in np.unique(week)]
    weeks = len(by_week)
    of_mean = max(
        sum(b**2 for b in by_week) / days**2 * weeks / (weeks - 1), float((away**2).sum()) / days / (days - 1)
    )
    common_share = 1.0 - sum(own) / target
    alike = sum(v**2 for v in own) / sum(own) ** 2
    unknown = target * 2.0 / (days - 3) * (common_share + (1.0 - common_share) * alike)
    width = mpmath.sqrt(of_mean + unknown)
    return convolved(total, twin_rounded(lambda x: mpmath.ncdf(x / width), 160, up))


@pytest.mark.parametrize("seed", [1, 2])
def test_the_adopted_model_agrees_with_a_slow_twin_in_high_precision(seed):
    rng = np.random.default_rng(seed)
    mood = rng.gamma(2.0, 0.5, 12)
    kw = np.rint((rng.gamma(2.0, 0.2, (3, 12)) + mood) * 10) / 10
    demand = demand_of(kw[:, :, None], replace(SETTINGS, smoothing_h=0.0))
    hour = demand.hours[0][0]
    with mpmath.workdps(30):
        laws = [twin(kw, up) for up in (False, True)]
        for level in (3.0, 6.0, 9.0, 15.0):
            slow = [float(sum(p for s, p in law.items() if s > round(level / STEP))) for law in laws]
            fast = hour.total.above(level)
            assert fast == pytest.approx(slow, rel=1e-9)
            found = hour.exceedance(level)
            assert (found.lower, found.upper) == pytest.approx(slow, rel=1e-7)
            assert found.lower <= found.value <= found.upper


@pytest.mark.parametrize("correlation", [0.0, 0.05, 0.2])
def test_the_models_variance_is_the_true_one_when_only_the_group_is_metered(correlation):
    settings = ModelSettings(temperature=False, mean_uncertainty=False, lattice_kw=0.05)
    ratios = []
    for seed in range(6):
        short = synthetic(17, 91, np.random.default_rng(seed), correlation=correlation)
        (one,) = [b for b in blocks_by_season(short, 18263, [range(1, 13)], slice(0, 24)) if b.day_type == "workday"]
        made = group_demand([one], interval_min=60, power_factor=1.0, settings=settings)
        model = sum(hour.variance_kw2() for hour in made.hours[0])
        long = synthetic(17, 1500, np.random.default_rng(seed), correlation=correlation)
        ratios.append(model / float(long.sum(axis=0).var(axis=0, ddof=1).sum()))
    assert np.mean(ratios) == pytest.approx(1.0, abs=0.12)  # 6 replications; docs/validation.md has the full table


def test_each_part_can_be_switched_off_and_then_leaves_the_independent_sum():
    kw = np.rint(np.random.default_rng(5).gamma(2.0, 5.0, (4, 30, 2))) / 10
    plain = replace(SETTINGS, common_component=False, shrinkage=False, mean_uncertainty=False)
    hour = demand_of(kw, plain).hours[0][1]
    for level in (2.0, 4.0, 6.5):
        assert hour.exceedance(level).value == pytest.approx(hour.independent_exceedance(level), rel=1e-9, abs=1e-14)
    assert hour.mean_kw() == pytest.approx(kw[:, :, 1].mean(axis=1).sum())
    assert hour.variance_kw2() == pytest.approx(kw[:, :, 1].var(axis=1).sum())


def test_more_common_component_means_more_in_the_tail():
    kw = np.rint(np.random.default_rng(6).gamma(2.0, 5.0, (10, 40, 3))) / 10
    tails = [
        demand_of(kw, replace(SETTINGS, correlation=rho)).hours[0][0].exceedance(17.0).value for rho in (0.0, 0.1, 0.4)
    ]
    assert tails[0] < tails[1] < tails[2]


def test_a_street_without_meters_stands_on_its_class():
    kw = np.rint(np.random.default_rng(7).gamma(2.0, 5.0, (8, 40, 2))) / 10
    group = Group(
        served=np.zeros(8, dtype=bool), classes=("house",) * 8, planned=(Planned(customer_class="house", count=20),)
    )
    hour = demand_of(kw, group=group).hours[0][0]
    assert hour.mean_kw() == pytest.approx(20 * kw[:, :, 0].mean(), rel=0.01)
    with pytest.raises(ValueError, match="nobody"):
        demand_of(kw, group=replace(group, planned=()))


def test_reactive_power_follows_the_groups_power_factor_and_exports_count_in_both_directions():
    rng = np.random.default_rng(8)
    kw = np.rint(rng.normal(0.0, 12.0, (3, 40, 1))) / 10
    hour = demand_of(kw).hours[0][0]
    both, out, back = (hour.exceedance_kva(3.0, way).value for way in ("both", "delivered", "exported"))
    assert both == pytest.approx(out + back)
    assert back > 0.0
    assert out == pytest.approx(hour.exceedance(3.0 * 0.95).value)
    assert hour.mean_square_kva2() == pytest.approx((hour.variance_kw2() + hour.mean_kw() ** 2) / 0.95**2)


@pytest.mark.parametrize("direction", ["both", "delivered", "exported"])
def test_many_levels_at_once_have_the_probabilities_brackets_and_intervals_of_one_by_one(direction):
    kw = np.rint(np.random.default_rng(8).normal(0.2, 12.0, (3, 40, 1))) / 10
    hour = demand_of(kw, replace(SETTINGS, resamples=60, lattice_kw=0.03), rng=np.random.default_rng(1)).hours[0][0]
    levels = np.array([0.5, 2.0, 4.0])
    found = hour.exceedances_kva(levels, direction)
    single = [hour.exceedance_kva(level, direction) for level in levels]
    for part in ("value", "lower", "upper", "low", "high"):
        assert getattr(found, part) == pytest.approx([getattr(one, part) for one in single], rel=1e-9)
    assert np.all(found.lower < found.upper)


def test_a_cold_day_has_more_demand_and_a_record_of_cold_days_too():
    rng = np.random.default_rng(9)
    temperature = rng.normal(4.0, 6.0, 80)
    need = np.maximum(15.0 - temperature, 0.0)
    kw = np.rint((rng.gamma(2.0, 0.5, (6, 80, 2)) * (1.0 + 0.1 * need[:, None])) * 10) / 10
    settings = replace(SETTINGS, temperature=True)

    def made(record):
        return group_demand(
            [block(kw, temperature)],
            interval_min=60,
            power_factor=1.0,
            settings=settings,
            record_c=None if record is None else {("winter", "workday"): record},
        ).hours[0][0]

    hour = made(None)
    mild, cold = hour.at_temperature(14.0), hour.at_temperature(-6.0)
    assert cold.mean_kw() > hour.mean_kw() > mild.mean_kw()
    assert cold.variance_kw2() > mild.variance_kw2()  # the spread grows with the level
    assert made(temperature - 4.0).exceedance(18.0).value > hour.exceedance(18.0).value
    assert hour.mean_kw() == pytest.approx(kw[:, :, 0].sum(axis=0).mean(), rel=0.01)


def test_intervals_need_a_generator_and_hold_the_figure_of_the_middle():
    kw = np.rint(np.random.default_rng(10).gamma(2.0, 5.0, (6, 91, 1))) / 10
    settings = replace(SETTINGS, resamples=100)
    with pytest.raises(ValueError, match="generator"):
        demand_of(kw, settings)
    found = demand_of(kw, settings, rng=np.random.default_rng(1)).hours[0][0].exceedance(8.0)
    assert found.low < found.value < found.high
    assert found.floor == pytest.approx(1 / 92)
