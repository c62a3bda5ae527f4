"""The copula over the day's intervals, and the probability that any interval passes."""

import numpy as np
import pytest
from scipy.stats import multivariate_normal

from loadsum.peak.anyinterval import any_interval, drawn_days, runs_of_at_least
from loadsum.peak.copula import DayCopula, choose_copula, fit_copula, log_density, normal_scores
from tests.peak.samples import moody_days, reference

DAILY = reference("peak")["daily_peak"]["expected"]


def equal(correlation, intervals=24, freedom=np.inf):
    matrix = np.full((1, intervals, intervals), correlation)
    matrix[0][np.diag_indices(intervals)] = 1.0
    return DayCopula(correlation=matrix, degrees_of_freedom=freedom, days=np.array([100]))


# 24 hours of p = 0.001 under a one-factor normal law (computed_from_formula: Boole, independence, one-factor normal).
@pytest.mark.parametrize("correlation", ["0", "0.5", "0.9", "0.99"])
def test_a_day_of_24_equal_hours_agrees_with_the_published_orthant(correlation):
    day = any_interval(
        np.full(24, 1e-3), drawn_days(equal(float(correlation)), 0, np.random.default_rng(7), draws=40_000)
    )
    truth = float(DAILY["gaussian_equicorr"][correlation])
    assert abs(day.value - truth) < 4.0 * day.standard_error
    assert day.standard_error < 0.01 * truth
    assert day.at_least == DAILY["max_bound"] <= truth <= day.at_most
    assert day.at_most == pytest.approx(DAILY["union"])
    assert day.if_independent == pytest.approx(float(DAILY["indep"]), abs=1e-9)


def test_unequal_intervals_agree_with_quadrature_of_the_normal_orthant():
    score = np.random.default_rng(0).standard_normal((40, 4))
    correlation = np.corrcoef(score + score[:, :1], rowvar=False)
    p = np.array([0.2, 0.01, 0.05, 0.1])
    copula = DayCopula(correlation=correlation[None], degrees_of_freedom=np.inf, days=np.array([40]))
    day = any_interval(p, drawn_days(copula, 0, np.random.default_rng(1), draws=60_000))
    below = multivariate_normal(cov=correlation, abseps=1e-9, releps=1e-9).cdf(copula.score(p))
    assert abs(day.value - (1.0 - below)) < 4.0 * day.standard_error + 1e-5


@pytest.mark.parametrize("freedom", [np.inf, 5.0])
@pytest.mark.parametrize("correlation", [0.0, 0.3, 0.95])
def test_bounds_contain_the_simulated_truth_and_the_estimate_agrees_with_it(correlation, freedom):
    copula = equal(correlation, 12, freedom)
    p = np.linspace(0.001, 0.05, 12)
    day = any_interval(p, drawn_days(copula, 0, np.random.default_rng(2)))
    drawn = copula.draw(0, 200_000, np.random.default_rng(3)) > copula.score(p)
    truth = drawn.any(axis=1).mean()
    assert day.at_least <= truth <= day.at_most
    assert abs(day.value - truth) < 4.0 * np.hypot(day.standard_error, np.sqrt(truth / 200_000))
    simulated = [runs.mean() for runs in runs_of_at_least(drawn)]
    assert day.runs_per_day == pytest.approx(simulated, rel=0.15, abs=2e-4)
    assert day.expected_intervals == pytest.approx(p.sum())


def test_the_relative_error_does_not_grow_as_the_probability_shrinks():
    copula = equal(0.9)
    errors = []
    for p in (1e-2, 1e-6, 1e-12):
        day = any_interval(np.full(24, p), drawn_days(copula, 0, np.random.default_rng(4)))
        assert day.at_least <= day.value <= day.at_most
        errors.append(day.standard_error / day.value)
    assert max(errors) < 0.03


def test_an_interval_without_readings_has_no_part_in_the_day():
    p = np.full(24, 1e-3)
    p[5] = np.nan
    day = any_interval(p, drawn_days(equal(0.0), 0, np.random.default_rng(5)))
    assert day.at_most == pytest.approx(0.023)
    assert any_interval(np.full(24, np.nan), drawn_days(equal(0.0), 0, np.random.default_rng(5))).value == 0.0


def test_runs_are_counted_once_at_each_length():
    above = np.array([[0, 1, 1, 0, 1, 0, 1, 1, 1, 1]], dtype=bool)
    assert [int(runs[0]) for runs in runs_of_at_least(above)] == [3, 2, 1, 1]


def test_normal_scores_depend_on_ranks_only_and_keep_gaps():
    sums = np.random.default_rng(0).random((30, 2))
    sums[3, 1] = np.nan
    score = normal_scores(sums)
    assert np.array_equal(score, normal_scores(np.exp(5.0 * sums)), equal_nan=True)
    assert np.isnan(score[3, 1])
    assert np.nanmean(score) == pytest.approx(0.0, abs=1e-12)


def test_the_fitted_correlation_finds_the_drift_of_an_invented_day():
    days = moody_days(4000, 40, np.random.default_rng(1)).sum(axis=0)
    copula = fit_copula([days], pooled_days=1e-9)
    near = [copula.correlation[0, i, i + 1] for i in range(23)]
    far = [copula.correlation[0, i, i + 12] for i in range(12)]
    scores = np.corrcoef(normal_scores(days), rowvar=False)
    assert near == pytest.approx([0.9 * scores[i, i + 1] for i in range(23)], abs=0.005)
    assert max(far) < min(near)


def test_few_days_and_gaps_still_make_a_proper_correlation():
    rng = np.random.default_rng(2)
    sums = rng.random((6, 48))
    sums[rng.random(sums.shape) < 0.2] = np.nan
    empty = np.full((0, 48), np.nan)
    copula = fit_copula([sums, empty])
    for matrix in copula.correlation:
        assert np.linalg.eigvalsh(matrix).min() > 0.05
        assert np.diag(matrix) == pytest.approx(1.0)
    assert copula.days.tolist() == [6, 0]


def test_the_density_of_independent_intervals_is_one_and_the_t_density_nears_the_gaussian():
    u = np.random.default_rng(3).random((50, 6))
    assert log_density(u, np.eye(6), np.inf) == pytest.approx(0.0, abs=1e-12)
    matrix = equal(0.4, 6).correlation[0]
    assert log_density(u, matrix, 1e6) == pytest.approx(log_density(u, matrix, np.inf), abs=1e-3)


@pytest.mark.parametrize(("freedom", "heavy"), [(np.inf, False), (4.0, True)])
def test_hold_out_tells_a_heavy_tailed_copula_from_a_gaussian_one(freedom, heavy):
    days = equal(0.6, 12, freedom).draw(0, 700, np.random.default_rng(5))
    chosen, scores = choose_copula([days], [np.arange(700) // 7])
    assert (chosen.degrees_of_freedom <= 8.0) is heavy
    assert scores[chosen.degrees_of_freedom] == max(scores.values())


@pytest.mark.parametrize("freedom", [3.0, 30.0, np.inf])
def test_scores_fall_from_plus_infinity_and_the_table_for_draws_agrees_with_them(freedom):
    copula = equal(0.5, freedom=freedom)
    asked = np.array([0.0, 1e-100, 1e-30, 1e-6, 0.1, 0.5, 0.9])
    score = copula.score(asked)
    assert score[0] == np.inf
    assert np.all(np.diff(score) < 0.0)
    assert copula.drawn_score(asked[2:5]) == pytest.approx(score[2:5], rel=1e-4)
    assert copula.tail(score[3:]) == pytest.approx(asked[3:], rel=1e-9)
