"""Demand paths: random days and years drawn from the demand model, for the transformer stage."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.readings import read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DemandPaths:
    """Random days of coincident demand with the temperature of the same day.

    Parameters
    ----------
    interval_min : int
        Demand interval. [min]
    block : (P,) int64
        Class of each day: index into ``GroupDemand.blocks``. [-]
    day_of_year : (P,) int64
        Calendar position of the day, 0 to 364; years follow one another without a break. [d]
    kw : (P, I) float64
        Coincident demand. [kW]
    kvar : (P, I) float64
        Coincident reactive demand. [kvar]
    ambient_c : (P, I) float64 or None
        Outdoor temperature of the same day; None where no series was given. [°C]
    """

    interval_min: int
    block: NDArray[np.int64]
    day_of_year: NDArray[np.int64]
    kw: NDArray[np.float64]
    kvar: NDArray[np.float64]
    ambient_c: NDArray[np.float64] | None

    def __post_init__(self) -> None:
        if self.kw.shape != self.kvar.shape or self.kw.shape[0] != self.block.size:
            raise ValueError(f"kw {self.kw.shape}, kvar {self.kvar.shape} and block {self.block.shape} disagree")
        for array in (self.block, self.day_of_year, self.kw, self.kvar, self.ambient_c):
            if array is not None:
                read_only(array)

    def kva(self) -> NDArray[np.float64]:
        """Apparent power of the group: the magnitude of the sums, (P, I) float64. [kVA]"""
        return np.hypot(self.kw, self.kvar)
