"""Ageing of winding insulation by its hot spot."""

from typing import Literal

import numpy as np
from numpy.typing import NDArray

Paper = Literal["kraft", "thermally upgraded"]


def relative_ageing_rate(hot_spot_c: NDArray[np.floating], paper: Paper) -> NDArray[np.floating]:
    r"""Rate of insulation ageing relative to the rate at the rated hot spot.

    Parameters
    ----------
    hot_spot_c : (...) float64 or float32
        Winding hot-spot temperature. [°C]
    paper : {"kraft", "thermally upgraded"}
        Insulation paper of the windings.

    Returns
    -------
    (...) of the same precision
        Relative ageing rate; 1 at 98 °C (plain kraft) or 110 °C (thermally upgraded). [-]

    Notes
    -----
    Kraft: :math:`2^{(\theta_h - 98)/6}`. Thermally upgraded: :math:`e^{15000/383 - 15000/(\theta_h + 273)}`, with 273
    as printed beside 383.

    References
    ----------
    .. [1] IEC 60076-7, relative ageing rate; IEEE C57.91, ageing acceleration factor. Formulas read in
       restatements; clauses to be confirmed on a licensed copy.
    """
    rate = np.array(hot_spot_c)
    if paper == "kraft":
        rate -= 98.0
        rate /= 6.0
        return np.exp2(rate, out=rate)
    rate += 273.0
    np.divide(-15000.0, rate, out=rate)
    rate += 15000.0 / 383.0
    return np.exp(rate, out=rate)
