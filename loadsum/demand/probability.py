"""A probability with all that is known about it."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Probability:
    """Probability that the demand of one demand interval lies beyond a level.

    Parameters
    ----------
    value : float
        Predictive probability, the figure that criteria use. [-]
    lower, upper : float
        Arithmetic bracket: the probability of the model lies between them whatever the lattice rounded;
        equal to ``value`` where the lattice holds every reading exactly. [-]
    low, high : float or None
        Interval for the long-run probability by resampling weeks; None where none was asked for. [-]
    floor : float
        Smallest probability that the record supports; below it the report prints "< floor". [-]
    method : str
        How it was computed, in words.
    """

    value: float
    lower: float
    upper: float
    low: float | None = None
    high: float | None = None
    floor: float = 0.0
    method: str = "exact convolution with common component"

    def __post_init__(self) -> None:
        if not 0.0 <= self.lower <= self.value <= self.upper <= 1.0 + 1e-12:
            raise ValueError(f"need 0 <= lower <= value <= upper <= 1, got {self.lower}, {self.value}, {self.upper}")

    @property
    def supported(self) -> bool:
        """Whether the record supports a figure this small."""
        return self.value >= self.floor


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Probabilities:
    """Probabilities beyond several levels in one demand interval, each as in :class:`Probability`.

    Parameters
    ----------
    lower, upper : (L,) float64
        Arithmetic bracket; the middle is the predictive value. [-]
    low, high : (L,) float64
        Interval for the long-run probability; NaN where none was asked for. [-]
    """

    lower: NDArray[np.float64]
    upper: NDArray[np.float64]
    low: NDArray[np.float64]
    high: NDArray[np.float64]

    @property
    def value(self) -> NDArray[np.float64]:
        """Predictive probability, (L,) float64. [-]"""
        return 0.5 * (self.lower + self.upper)
