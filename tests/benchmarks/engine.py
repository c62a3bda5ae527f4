"""Speed of the engine as ratios to plain baselines timed in the same run.

``python -m tests.benchmarks.engine`` prints the table. Readings are invented: a lognormal body and appliance
spikes on a grid of 10 W, 90 readings a customer; three ratings each, exceeded with about 0.1, 0.01 and 0.0001.
Baselines compute the whole distribution of the independent sum, from the same masses.
"""

import time
import tracemalloc
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.fft import irfft, next_fast_len, rfft
from scipy.signal import fftconvolve

from loadsum.demand.convolution import DemandSum
from loadsum.demand.lattice import LatticeMass, lattice_mass
from loadsum.demand.manysums import exceedance_of_many, packed_readings

STEP_KW = 0.01
APPLIANCES_KW = (1.5, 2.4, 7.2)


@dataclass(frozen=True)
class Ratio:
    """One line of the table."""

    name: str
    engine_ms: float
    baseline: str
    baseline_ms: float
    target: float

    @property
    def ratio(self) -> float:
        """How many times faster than the baseline."""
        return self.baseline_ms / self.engine_ms


def households(rng: np.random.Generator, shape: tuple[int, ...]) -> np.ndarray:
    """Invented readings on the grid. [kW]"""
    kw = rng.lognormal(np.log(0.5), 0.7, shape) + (rng.random(shape) < 0.15) * rng.choice(APPLIANCES_KW, shape)
    return np.round(kw, 2)


def best_ms(run: Callable[[], object], repeats: int) -> float:
    """Shortest of several times. [ms]"""
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        run()
        times.append(time.perf_counter() - start)
    return 1000.0 * min(times)


def group(rng: np.random.Generator, customers: int) -> DemandSum:
    """A sum of unlike customers."""
    terms = tuple(lattice_mass(row, STEP_KW, "exact") for row in households(rng, (customers, 90)))
    return DemandSum(terms=terms, counts=(1,) * customers)


def ratings(total: DemandSum) -> np.ndarray:
    """Three ratings. [kW]"""
    return np.array([total.quantile_kw(p) for p in (0.1, 0.01, 1e-4)])


def chain(terms: tuple[LatticeMass, ...], convolve: Callable[..., np.ndarray]) -> np.ndarray:
    """Whole distribution by one convolution after the other."""
    law = terms[0].mass
    for term in terms[1:]:
        law = convolve(law, term.mass)
    return law


def forty_customers() -> list[Ratio]:
    """40 customers x 96 hour classes; the baseline on 12 of the classes."""
    rng = np.random.default_rng(40)
    sums = [group(rng, 40) for _ in range(96)]
    levels = np.array([ratings(total) for total in sums])
    slow = best_ms(lambda: [chain(total.terms, np.convolve) for total in sums[:12]], 2) * 8.0
    fast = best_ms(lambda: exceedance_of_many(sums, levels), 3)
    whole = best_ms(lambda: [total.distribution() for total in sums[:24]], 2) * 4.0
    name = "chain of numpy.convolve"
    return [
        Ratio("40 customers x 96 classes, three ratings", fast, name, slow, 15.0),
        Ratio("40 customers x 96 classes, whole distributions", whole, name, slow, 0.0),
    ]


def five_hundred_customers() -> list[Ratio]:
    """500 customers x 96 hour classes; timed on 6 classes, the baseline on 1."""
    rng = np.random.default_rng(500)
    sums = [group(rng, 500) for _ in range(6)]
    levels = [ratings(total) for total in sums]
    slow = best_ms(lambda: chain(sums[0].terms, fftconvolve), 1) * 96.0
    fast = best_ms(lambda: [t.above_many(row) for t, row in zip(sums, levels, strict=True)], 3) * 16.0
    return [Ratio("500 customers x 96 classes, three ratings", fast, "chain of scipy.signal.fftconvolve", slow, 60.0)]


def ten_thousand_like() -> list[Ratio]:
    """10 000 like customers, against a power of one transform of full length."""
    rng = np.random.default_rng(10)
    term = lattice_mass(households(rng, (90,)), STEP_KW, "exact")
    total = DemandSum(terms=(term,), counts=(10_000,))
    levels = ratings(total)
    length = int(next_fast_len(10_000 * (term.mass.size - 1) + 1, real=True))
    slow = best_ms(lambda: irfft(rfft(term.mass, n=length) ** 10_000, n=length), 2)
    fast = best_ms(lambda: total.above_many(levels), 5)
    return [Ratio("10 000 like customers, three ratings", fast, "full-length FFT power", slow, 80.0)]


def thousand_transformers(groups: int = 1920) -> list[Ratio]:
    """8 customers x 96 classes x 1 000 transformers, adopted model, lower and upper; timed on 1 in 50.

    Beside the customers each sum holds the group's own movement (90 values, smoothed by a normal law) and the
    uncertainty of the mean; the baseline convolves the customers alone.
    """
    rng = np.random.default_rng(8)
    kw = households(rng, (groups, 8, 90))
    movement = rng.gamma(4.0, 0.35, (groups, 1, 90)) - 1.4
    both = np.concatenate((kw, movement), axis=1)
    spread = np.full(groups, np.hypot(0.9 * 0.7 * 90**-0.2, 0.25))  # bandwidth of the smoothing, and mean
    mean = both.mean(axis=2).sum(axis=1)
    sd = np.sqrt(both.var(axis=2).sum(axis=1) + spread**2)
    levels = mean[:, None] + sd[:, None] * np.array([1.3, 2.6, 4.2])
    none = np.zeros(groups)
    sums = [tuple(lattice_mass(row, STEP_KW, "exact") for row in rows) for rows in kw[:96]]
    slow = best_ms(lambda: [chain(terms, np.convolve) for terms in sums], 2) * 1000.0
    packed = packed_readings(both, STEP_KW, none, spread)
    fast = best_ms(lambda: packed.above(levels), 2) * (96_000.0 / groups)
    making = best_ms(lambda: packed_readings(both, STEP_KW, none, spread), 2) * (96_000.0 / groups)
    name = "numpy.convolve chains, independent sums alone"
    return [
        Ratio("8 customers x 96 classes x 1 000, adopted model", fast, name, slow, 3.0),
        Ratio("the same, with the masses made from readings", fast + making, name, slow, 3.0),
    ]


def memory_mb() -> float:
    """Largest memory that the engine adds for one class of 500 customers, terms themselves aside. [MB]"""
    total = group(np.random.default_rng(500), 500)
    levels = ratings(total)
    tracemalloc.start()
    total.above_many(levels)
    total.distribution()
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    return peak / 1e6


def table() -> list[Ratio]:
    """All lines."""
    parts = (forty_customers, five_hundred_customers, ten_thousand_like, thousand_transformers)
    return [line for part in parts for line in part()]


def main() -> None:
    """Print the table."""
    print(f"{'':50}{'engine ms':>12}{'baseline ms':>13}{'ratio':>8}{'wanted':>8}   baseline")
    for line in table():
        wanted = f"{line.target:.0f}" if line.target else "-"
        times = f"{line.engine_ms:12.1f}{line.baseline_ms:13.1f}{line.ratio:8.1f}"
        print(f"{line.name:50}{times}{wanted:>8}   {line.baseline}")
    print(f"memory added by one class of 500 customers: {memory_mb():.0f} MB (wanted: less than 150)")


if __name__ == "__main__":
    main()
