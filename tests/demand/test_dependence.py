import numpy as np
import pytest

from loadsum.demand.dependence import common_component, correlation_interval, mean_variance, smoothing_weights


def test_the_mean_correlation_of_independent_customers_is_nought_on_average():
    rng = np.random.default_rng(1)
    found = [common_component(rng.gamma(2.0, 1.0, (10, 60, 24)), 3.0).correlation.mean() for _ in range(20)]
    assert np.mean(found) == pytest.approx(0.0, abs=0.004)


def test_the_mean_correlation_is_found_with_customers_of_unlike_size():
    rng = np.random.default_rng(2)
    size = np.geomspace(0.2, 5.0, 12)[:, None, None]
    mood = rng.standard_normal((400, 24))
    kw = size * (3.0 + np.sqrt(0.2) * mood + np.sqrt(0.8) * rng.standard_normal((12, 400, 24)))
    assert common_component(kw, 3.0).correlation.mean() == pytest.approx(0.2, abs=0.01)


def test_variance_and_covariance_add_up_to_the_observed_sum():
    rng = np.random.default_rng(3)
    kw = rng.gamma(2.0, 1.0, (4, 30, 6)) + rng.standard_normal((30, 6))
    found = common_component(kw, 0.0)
    rebuilt = found.independent_variance_kw2 + found.correlation * found.pairs_kw2
    assert rebuilt == pytest.approx(kw.sum(axis=0).var(axis=0, ddof=1))


def test_days_with_a_missing_customer_are_left_out_of_the_sum():
    rng = np.random.default_rng(5)
    kw = rng.gamma(2.0, 1.0, (3, 20, 2))
    gappy = kw.copy()
    gappy[1, :5, 0] = np.nan
    found, whole = common_component(gappy, 0.0), common_component(kw[:, 5:], 0.0)
    assert found.days.tolist() == [15, 20]
    assert found.observed_variance_kw2[0] == pytest.approx(whole.observed_variance_kw2[0])


def test_smoothing_goes_around_the_clock_and_keeps_the_mean():
    weight = smoothing_weights(24, 3.0)
    assert weight.sum(axis=1) == pytest.approx(1.0)
    assert weight.sum(axis=0) == pytest.approx(1.0)
    assert weight[0, 23] == pytest.approx(weight[12, 11])
    assert np.array_equal(smoothing_weights(5, 0.0), np.eye(5))


def test_the_mean_is_known_worse_where_weeks_differ():
    rng = np.random.default_rng(6)
    day = np.arange(18263, 18263 + 140)
    by_day = rng.standard_normal((140, 24))
    by_week = rng.standard_normal((22, 24))[(day + 3) // 7 - (day[0] + 3) // 7]
    plain = mean_variance(by_day, day).mean()
    assert plain == pytest.approx(1.0 / 140, rel=0.35)
    assert mean_variance(by_day + by_week, day).mean() > 3.0 * plain


def test_the_interval_of_the_mean_correlation_holds_the_truth_about_nine_times_in_ten():
    held, runs = 0, 60
    day = np.arange(70)
    for seed in range(runs):
        rng = np.random.default_rng(seed)
        kw = np.sqrt(0.2) * rng.normal(size=(1, 70, 6)) + np.sqrt(0.8) * rng.normal(size=(5, 70, 6))
        low, high = correlation_interval(kw, day, 1.5)
        held += low <= 0.2 <= high
    assert 0.8 <= held / runs <= 0.98


def test_too_few_weeks_give_the_mean_correlation_no_interval():
    kw = np.random.default_rng(1).normal(size=(5, 14, 6))
    assert np.isnan(correlation_interval(kw, np.arange(14), 1.5)).all()
