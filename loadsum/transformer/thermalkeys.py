"""Thermal data of a transformer from the study file, and the ambient it stands in."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from loadsum.peak.paths import DemandPaths
from loadsum.study.thermalchecks import NEEDED, missing_thermal
from loadsum.study.unittables import Transformer
from loadsum.transformer.thermal import Guide, ThermalData

NO_AMBIENT = -100.0


def thermal_data(unit: Transformer) -> ThermalData | None:
    """Thermal data that the study file states; None where the guide or any figure is left out."""
    if not unit.loading_guide or missing_thermal(unit):
        return None
    return ThermalData(**{name: getattr(unit, name) for name in NEEDED}, k11=unit.k11, k21=unit.k21, k22=unit.k22)


def other_guide(guide: Guide) -> Guide:
    """The guide that was not asked for."""
    return "IEC 60076-7" if guide == "IEEE C57.91" else "IEEE C57.91"


def data_for_other(data: ThermalData, guide: Guide) -> ThermalData:
    """Thermal data stated for one guide in the terms of the other.

    The gradient goes by the loading to the power of 2 m in one and y in the other; the oil exponents n and x mean the
    same. Constants of IEC 60076-7 that were not stated leave simple lags.
    """
    factor = 2.0 if guide == "IEEE C57.91" else 0.5
    return replace(data, winding_exponent=data.winding_exponent * factor)


def ambient_of(unit: Transformer, paths: DemandPaths) -> tuple[NDArray[np.float64] | None, str]:
    """Ambient temperature of drawn days, (P, I) float64, and what it rests on; None where there is none. [°C]"""
    if paths.ambient_c is not None and np.all(np.isfinite(paths.ambient_c)):
        return paths.ambient_c, "ambient: outdoor temperature of the same days"
    if unit.ambient_c > NO_AMBIENT:
        return np.full(paths.kw.shape, unit.ambient_c), f"ambient: a constant {unit.ambient_c:g} °C, stated"
    return None, "no ambient temperature: give [weather] or transformer.ambient_c"
