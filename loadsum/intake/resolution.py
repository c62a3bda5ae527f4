"""The resolution of a meter, told from its readings."""

import numpy as np
from numpy.typing import NDArray


def resolution(kw: NDArray[np.float64]) -> float:
    """Meter resolution told from the readings: the coarsest step of 1, 2 or 5 that every one is a multiple of. [kW]

    0 where the readings are finer than a millionth of a kilowatt.
    """
    known = kw[np.isfinite(kw)]
    known = known[known != 0.0]
    if known.size == 0:
        return 0.0
    for exponent in range(0, -7, -1):
        for digit in (5, 2, 1):
            step = digit * 10.0**exponent
            ratio = known / step
            if np.all(np.abs(ratio - np.rint(ratio)) < 1e-6 * np.maximum(1.0, np.abs(ratio) * 1e-6)):
                return step
    return 0.0
