"""The same thermal data in the terms of the other guide."""

import numpy as np
import pytest

from loadsum.transformer.thermal import Guide, ThermalData, steady_gradient, steady_top_oil_rise
from loadsum.transformer.thermalkeys import data_for_other, other_guide
from loadsum.transformer.thermalyears import run_figures

IEEE = ThermalData(
    top_oil_rise_k=53.0,
    hot_spot_gradient_k=27.0,
    loss_ratio=5.0,
    oil_exponent=0.8,
    winding_exponent=0.8,
    oil_time_constant_min=180.0,
    winding_time_constant_min=5.0,
)


@pytest.mark.parametrize("guide", ["IEEE C57.91", "IEC 60076-7"])
def test_steady_temperatures_are_the_same_in_the_terms_of_either_guide(guide: Guide) -> None:
    other, data = other_guide(guide), data_for_other(IEEE, guide)
    loads = np.array([0.3, 1.0, 1.4])
    assert steady_gradient(loads, data, other) == pytest.approx(steady_gradient(loads, IEEE, guide))
    assert steady_top_oil_rise(loads, data) == pytest.approx(steady_top_oil_rise(loads, IEEE))
    assert data_for_other(data, other) == IEEE
    assert other_guide(other) == guide


def test_simple_lags_differ_only_in_how_the_oil_follows_the_ambient() -> None:
    # with all constants of IEC 60076-7 at 1 both guides are simple lags; one lets the oil follow the ambient slowly
    load = np.random.default_rng(2).uniform(5.0, 40.0, (1, 240))
    steady, swinging = np.full(load.shape, 20.0), 20.0 + 10.0 * np.sin(np.arange(240) * np.pi / 12.0)[None, :]
    data = data_for_other(IEEE, "IEEE C57.91")
    for air, apart in ((steady, False), (swinging, True)):
        one, other = (
            run_figures(load, air, 60.0, np.array([25.0]), own, guide, "thermally upgraded", parts=12)
            for own, guide in ((IEEE, "IEEE C57.91"), (data, "IEC 60076-7"))
        )
        if not apart:
            assert one.hot_spot_c[0, 0] == pytest.approx(other.hot_spot_c[0, 0], abs=1e-3)
        assert bool(abs(one.ageing_pu[0, 0] / other.ageing_pu[0, 0] - 1.0) > 0.02) is apart
