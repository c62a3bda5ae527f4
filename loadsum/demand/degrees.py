"""Heating and cooling degrees."""

import numpy as np
from numpy.typing import NDArray

HEATING_BASE_C = 15.0  # common practice without a source; the fit only needs the kink to lie near the true ones
COOLING_BASE_C = 20.0  # common practice without a source


def degrees(temperature_c: NDArray[np.float64]) -> NDArray[np.float64]:
    """Heating and cooling degrees of a temperature, (n, 2) float64. [K]"""
    return np.stack(
        [np.maximum(HEATING_BASE_C - temperature_c, 0.0), np.maximum(temperature_c - COOLING_BASE_C, 0.0)], axis=1
    )
