"""Thermal data, losses, money and temperature limits that cannot be: each has its message."""

import tomllib

import pytest

from loadsum.errors import InputError
from loadsum.study.load import study_from
from tests.study.test_load import GOOD

HOT_SPOT = '\n[[criterion]]\nquantity = "hot-spot temperature"\nlimit = {}\nprobability = {}\n'
MESSAGES = {
    "negative losses": ("no_load_losses_w = [-5, 50, 60]", "", "transformer.no_load_losses_w[1]: must be at least 0"),
    "too few losses": (
        "no_load_losses_w = [50]\nload_losses_w = [300, 400, 500]",
        "",
        "transformer.no_load_losses_w: must have one figure a rating: 3, got 1",
    ),
    "half the losses": (
        "no_load_losses_w = [40, 50, 60]",
        "",
        "transformer.load_losses_w: no-load and load losses must be given together",
    ),
    "one worth of a watt": (
        "loss_factor_a_per_w = 5",
        "",
        "transformer.loss_factor_b_per_w: both worths of a watt must be given together",
    ),
    "two ways to money": (
        "loss_factor_a_per_w = 5\nloss_factor_b_per_w = 2\nenergy_price_per_kwh = 0.2\nworth_years = 20",
        "",
        "transformer.energy_price_per_kwh: stands beside the worth of a watt; keep one of the two",
    ),
    "price without years": (
        "energy_price_per_kwh = 0.2",
        "",
        "transformer.worth_years: must be given together with energy_price_per_kwh; no horizon is assumed",
    ),
    "guide without data": (
        'loading_guide = "IEC 60076-7"\ntop_oil_rise_k = 55',
        "",
        "transformer.loading_guide: needs hot_spot_gradient_k, loss_ratio, oil_exponent",
    ),
    "guide without paper": (
        'loading_guide = "IEC 60076-7"\ntop_oil_rise_k = 55\nhot_spot_gradient_k = 23\nloss_ratio = 5\n'
        "oil_exponent = 0.8\nwinding_exponent = 1.6\noil_time_constant_min = 180\nwinding_time_constant_min = 4",
        "",
        "transformer.loading_guide: needs paper; none of these is ever assumed",
    ),
    "limit below ambient": (
        "ambient_c = 40",
        HOT_SPOT.format(30, 0.1),
        "criterion[1].limit: lies at or below the stated ambient temperature",
    ),
    "limit without probability": (
        "ambient_c = 40",
        HOT_SPOT.format(120, 0),
        "criterion[1].probability: state the probability per year with which it may be passed",
    ),
}


def faults_of(keys: str, tables: str) -> list[str]:
    with pytest.raises(InputError) as caught:
        study_from(tomllib.loads(GOOD + keys + "\n" + tables), "study.toml")
    return [str(fault) for fault in caught.value.faults]


@pytest.mark.parametrize(("keys", "tables", "message"), MESSAGES.values(), ids=MESSAGES)
def test_each_has_its_message(keys, tables, message):
    assert any(message in fault for fault in faults_of(keys, tables)), faults_of(keys, tables)
