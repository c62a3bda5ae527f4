"""Distributions of sums of independent demands."""

from collections.abc import Sequence

import numpy as np
from scipy.signal import fftconvolve

from loadsum.demand.lattice import LatticeMass


def sum_distribution(terms: Sequence[LatticeMass]) -> LatticeMass:
    """Distribution of the sum of independent demands that share one lattice."""
    steps = {term.step_kw for term in terms}
    if len(steps) != 1:
        raise ValueError(f"terms must share one lattice step, got {sorted(steps)}")
    queue = sorted((term.mass for term in terms), key=len)
    while len(queue) > 1:
        a, b = queue.pop(0), queue.pop(0)
        small = min(a.size, b.size) <= 4096
        queue.append(np.convolve(a, b) if small else np.maximum(fftconvolve(a, b), 0.0))
        queue.sort(key=len)
    return LatticeMass(step_kw=steps.pop(), offset=sum(term.offset for term in terms), mass=queue[0])
