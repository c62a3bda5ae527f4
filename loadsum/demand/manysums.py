"""Many sums of few demands each, such as all hour classes of many transformers, computed together."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.convolution import DemandSum
from loadsum.demand.lattice import ALIGNED, normal_mass
from loadsum.demand.tails import at_or_below
from loadsum.demand.tilting import EndwiseTerms, TermBlock, endwise

CHUNK = 2**17  # masses computed together, so that they stay in the processor's cache
SMOOTH_STEPS = 3.0  # standard deviation, in steps, from which a rounded normal variable needs no table of masses
SURE = 1e-10  # relative error estimate above which a sum is computed again on its own


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PackedSums:
    """G sums of C terms each and a normal variable, all terms rounded down to one lattice.

    Parameters
    ----------
    step_kw : float
        Step of the lattice. [kW]
    mass : (G, C, n) float64
        Mass of each term at each number of steps below the term's largest outcome; column 0 is positive. [-]
    top : (G,) int64
        Lattice index of the largest outcome of each sum without the normal variable. [steps]
    counts : (G, C) int64
        Copies of each term. [-]
    normal_mean_kw, normal_sd_kw : (G,) float64
        Mean and standard deviation of the normal variable, before rounding; all standard deviations are 0, or all
        at least `SMOOTH_STEPS` steps. [kW]
    rounded : (G,) int64
        Number of terms, copies counted, of which any outcome was rounded; the sum rounded up lies no more than so many
        steps above the sum rounded down. [-]
    """

    step_kw: float
    mass: NDArray[np.float64]
    top: NDArray[np.int64]
    counts: NDArray[np.int64]
    normal_mean_kw: NDArray[np.float64]
    normal_sd_kw: NDArray[np.float64]
    rounded: NDArray[np.int64]

    def __post_init__(self) -> None:
        smallest = float(self.normal_sd_kw.min()) / self.step_kw
        if self.normal_sd_kw.any() and smallest < SMOOTH_STEPS:
            raise ValueError(f"need normal terms of {SMOOTH_STEPS} steps or more, or none, got one of {smallest:.3g}")
        if not np.all(self.mass[:, :, 0] > 0.0):
            raise ValueError("every row of mass must begin with its largest outcome")

    def above(self, levels_kw: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Lower and upper probability that each sum is strictly above each of its levels.

        Parameters
        ----------
        levels_kw : (G, L) float64
            Levels. [kW]

        Returns
        -------
        (G, L) float64, (G, L) float64
            Lower and upper probability; the same array where nothing was rounded. [-]
        """
        first = np.floor(levels_kw / self.step_kw + ALIGNED).astype(np.int64) + 1
        rho = self.top[:, None] - first
        smooth = bool(self.normal_sd_kw.any())
        shift = (self.rounded + int(smooth))[:, None]
        asked = np.concatenate((rho, rho + shift), axis=1) if shift.any() else rho
        found = np.empty(asked.shape)
        longest = self.mass.shape[2] - 1 - np.argmax(np.asarray((self.mass > 0.0).any(axis=1))[:, ::-1], axis=1)
        order = np.argsort(longest, kind="stable")  # sums of like length together
        start = 0
        while start < order.size:
            size = max(1, CHUNK // (self.mass.shape[1] * (int(longest[order[start]]) + 1)))
            part = order[start : start + size]
            found[part] = self._at_or_below(part, asked[part], smooth)
            start += size
        found = np.minimum(found, 1.0)
        return (found[:, : rho.shape[1]], found[:, rho.shape[1] :]) if shift.any() else (found, found)

    def _at_or_below(self, part: NDArray[np.int64], rho: NDArray[np.int64], smooth: bool) -> NDArray[np.float64]:
        mass, counts = self.mass[part], self.counts[part]
        longest = mass.shape[2] - 1 - np.argmax(mass[:, :, ::-1] > 0.0, axis=2)
        mass = mass[:, :, : int(longest.max()) + 1]
        terms = EndwiseTerms(
            (TermBlock(mass, counts),),
            np.zeros(part.size, dtype=np.int64),
            1,
            (counts * longest).sum(axis=1),
            counts.sum(axis=1) + int(smooth),
            0.5 - self.normal_mean_kw[part] / self.step_kw if smooth else None,
            self.normal_sd_kw[part] / self.step_kw if smooth else None,
        )
        tails = at_or_below(terms, rho)
        probability = tails.probability
        for g in np.flatnonzero((tails.relative_error > SURE).any(axis=1)) if smooth else ():
            normal = normal_mass(
                float(self.normal_mean_kw[part[g]]), float(self.normal_sd_kw[part[g]]), self.step_kw, "down"
            )
            alone = endwise([*mass[g], normal.mass[::-1]], [*counts[g].tolist(), 1])
            top = normal.offset + normal.mass.size - 1
            probability[g] = at_or_below(alone, rho[g : g + 1] + top).probability[0]
        return probability


def packed_readings(
    kw: NDArray[np.float64], step_kw: float, normal_mean_kw: NDArray[np.float64], normal_sd_kw: NDArray[np.float64]
) -> PackedSums:
    """Sums of the empirical distributions of readings, rounded down to the lattice, and a normal variable.

    Parameters
    ----------
    kw : (G, C, D) float64
        Readings of each term of each sum, equally weighted, all finite. [kW]
    step_kw : float
        Step of the lattice. [kW]
    normal_mean_kw, normal_sd_kw : (G,) float64
        Normal variable of each sum; a standard deviation of 0 is none. [kW]
    """
    groups, terms, days = kw.shape
    steps = kw / step_kw
    near = np.rint(steps)
    off = np.abs(steps - near) > ALIGNED
    index = np.where(off, np.floor(steps), near).astype(np.int64)
    top = index.max(axis=2)
    distance = top[:, :, None] - index
    n = int(distance.max()) + 1
    place = distance + (np.arange(groups * terms) * n).reshape(groups, terms, 1)
    mass = np.bincount(place.ravel(), minlength=groups * terms * n).reshape(groups, terms, n) / days
    return PackedSums(
        step_kw=step_kw,
        mass=mass,
        top=top.sum(axis=1),
        counts=np.ones((groups, terms), dtype=np.int64),
        normal_mean_kw=normal_mean_kw,
        normal_sd_kw=normal_sd_kw,
        rounded=off.any(axis=2).sum(axis=1),
    )


def exceedance_of_many(sums: Sequence[DemandSum], levels_kw: NDArray[np.float64]) -> NDArray[np.float64]:
    """Probability that each of many sums is strictly above its levels.

    Parameters
    ----------
    sums : sequence of G DemandSum
        Sums, as a rule of few terms each; those of equally many terms and one step are computed together.
    levels_kw : (G, L) float64
        Levels of each sum. [kW]

    Returns
    -------
    (G, L) float64
        Probability above each level. [-]
    """
    found = np.empty(levels_kw.shape)
    kinds: dict[tuple[int, float], list[int]] = {}
    for g, total in enumerate(sums):
        kinds.setdefault((len(total.terms), total.step_kw), []).append(g)
    for (terms, step_kw), members in kinds.items():
        longest = max(term.mass.size for g in members for term in sums[g].terms)
        mass, top = np.zeros((len(members), terms, longest)), np.zeros(len(members), dtype=np.int64)
        beyond = np.zeros(len(members))
        for row, g in enumerate(members):
            for c, (term, count) in enumerate(zip(sums[g].terms, sums[g].counts, strict=True)):
                reverse = term.mass[::-1]
                first = int(np.argmax(reverse > 0.0))
                mass[row, c, : reverse.size - first] = reverse[first:]
                top[row] += count * (term.offset + term.mass.size - 1 - first)
                beyond[row] += count * term.beyond_above
        none = np.zeros(len(members))
        packed = PackedSums(
            step_kw=step_kw,
            mass=mass,
            top=top,
            counts=np.array([sums[g].counts for g in members], dtype=np.int64),
            normal_mean_kw=none,
            normal_sd_kw=none,
            rounded=np.zeros(len(members), dtype=np.int64),
        )
        found[members] = np.minimum(packed.above(levels_kw[members])[0] + beyond[:, None], 1.0)
    return found
