import numpy as np
import pytest

from loadsum.demand.degrees import degrees
from loadsum.demand.temperature import take_out_temperature


def heated(rng, customers=6, days=120, slope_kw_per_k=0.3):
    temperature = rng.normal(5.0, 6.0, days)
    need = np.maximum(15.0 - temperature, 0.0)
    size = np.linspace(0.5, 1.5, customers)[:, None]
    kw = size * (1.0 + slope_kw_per_k * need) + rng.gamma(2.0, 0.3, (customers, days))
    return temperature, kw, size.sum() * slope_kw_per_k


def test_degrees_count_from_their_bases():
    assert degrees(np.array([5.0, 17.0, 26.0])).tolist() == [[10.0, 0.0], [0.0, 0.0], [0.0, 6.0]]


def test_the_groups_response_is_found_and_taken_out_of_every_customer():
    rng = np.random.default_rng(1)
    temperature, kw, slope = heated(rng)
    adjusted, response = take_out_temperature(kw, temperature, np.ones(6))
    assert response.columns == (0,)
    error = float(response.covariance[0, 0]) ** 0.5
    assert abs(float(response.slope_kw_per_k[0]) - slope) < 3.0 * error
    assert response.explained > 0.9
    need = np.maximum(15.0 - temperature, 0.0)
    for before, after in zip(kw, adjusted, strict=True):
        assert abs(np.corrcoef(before, need)[0, 1]) > 0.7
        assert abs(np.corrcoef(after, need)[0, 1]) < 0.05
        assert after.mean() == pytest.approx(before.mean(), rel=1e-6)


def test_a_response_by_chance_is_shrunk():
    rng = np.random.default_rng(2)
    kept = []
    for _ in range(40):
        temperature = rng.normal(5.0, 6.0, 40)
        _, response = take_out_temperature(rng.gamma(2.0, 1.0, (5, 40)), temperature, np.ones(5))
        kept.append(0.0 if response is None else response.explained)
    assert np.mean(kept) < 0.02


def test_the_slopes_uncertainty_is_honest():
    rng = np.random.default_rng(3)
    away = []
    for _ in range(150):
        temperature, kw, slope = heated(rng, customers=3, days=40)
        _, response = take_out_temperature(kw, temperature, np.ones(3))
        away.append((float(response.slope_kw_per_k[0]) - slope) / float(response.covariance[0, 0]) ** 0.5)
    assert np.std(away) == pytest.approx(1.0, abs=0.2)


def test_days_of_unknown_temperature_lend_no_reading_and_a_flat_record_makes_no_response():
    rng = np.random.default_rng(4)
    temperature, kw, _ = heated(rng)
    temperature[:7] = np.nan
    adjusted, response = take_out_temperature(kw, temperature, np.ones(6))
    assert response is not None and np.isnan(adjusted[:, :7]).all() and np.isfinite(adjusted[:, 7:]).all()
    assert take_out_temperature(kw, np.full(120, 17.0), np.ones(6))[1] is None
    assert take_out_temperature(kw[:, :9], temperature[:9], np.ones(6))[1] is None
