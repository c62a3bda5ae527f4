"""Readings of a group of customers -> its demand model, hour by hour."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.commonterm import skewness_along_day, variance_uncertainty_kw2, with_common_term
from loadsum.demand.convolution import BracketedSum, DemandSum, plain_distributions
from loadsum.demand.customerclass import ClassPool, borrowed, class_pool, weighted_variance
from loadsum.demand.dependence import CommonComponent, common_component, correlation_interval, mean_variance
from loadsum.demand.hourly import BlockDiagnostics, GroupDemand, HourDemand, with_normal
from loadsum.demand.lattice import LatticeMass, lattice_mass
from loadsum.demand.latticestep import affordable_step
from loadsum.demand.planned import Planned, PlannedTerm, annual_energy, planned_terms, pooled, total_variance, within
from loadsum.demand.reactive import power_factors
from loadsum.demand.samplingerror import Resamples, resample_weeks
from loadsum.demand.settings import ModelSettings
from loadsum.demand.temperature import TemperatureResponse, take_out_temperature
from loadsum.demand.temperaturepool import PooledResponse, pooled_over
from loadsum.demand.temperaturespread import mixed_over, spread_taken_out
from loadsum.intake.hourclass import DayBlock

FEWEST_DAYS = 2


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Group:
    """Who is served, and who else was metered.

    Parameters
    ----------
    served : (C,) bool
        Metered customers that the transformer serves; the others lend their class what they have shown.
    classes : tuple of str
        Class of each metered customer.
    planned : tuple of Planned
        Customers served that have no readings of their own.
    may_export : (C,) bool
        Metered customers that may export.
    """

    served: NDArray[np.bool_]
    classes: tuple[str, ...]
    planned: tuple[Planned, ...] = ()
    may_export: NDArray[np.bool_] | None = None


def all_served(count: int) -> Group:
    """A group of one class whose metered customers are all served."""
    return Group(served=np.ones(count, dtype=bool), classes=("all",) * count)


def group_demand(
    blocks: Sequence[DayBlock],
    *,
    interval_min: int,
    power_factor: float,
    settings: ModelSettings,
    group: Group | None = None,
    resolution_kw: float = 0.0,
    record_c: Mapping[tuple[str, str], NDArray[np.float64]] | None = None,
    rng: np.random.Generator | None = None,
) -> GroupDemand:
    """Demand model of a group of customers.

    Parameters
    ----------
    blocks : sequence of DayBlock
        Readings of every metered customer, served or not.
    interval_min : int
        Demand interval. [min]
    power_factor : float
        Power factor of the group. [-]
    settings : ModelSettings
        Parts of the model that are on.
    group : Group or None
        Who is served; all metered customers, as one class, when None.
    resolution_kw : float
        Resolution that all meters share, as demand; 0 where unknown. [kW]
    record_c : mapping of (season, day type) to (n,) float64 or None
        Lagged daily means of the temperature record over which the year is mixed; the metered days when None. [°C]
    rng : numpy.random.Generator or None
        Source of randomness of the intervals; needed where the settings ask for resamples.

    Raises
    ------
    ValueError
        Nobody is served, no metered customer stands for a planned one, or the generator is missing.
    """
    if settings.resamples and rng is None:
        raise ValueError(f"{settings.resamples} resamples need a random generator")
    group = group or all_served(blocks[0].kw.shape[0])
    terms = planned_terms(group.planned, group.classes, annual_energy(blocks, interval_min))
    if not group.served.any() and not terms:
        raise ValueError("the group serves nobody")
    built = [
        _Block(
            block=block,
            record_c=None if record_c is None else record_c.get((block.season, block.day_type)),
            interval_min=interval_min,
            power_factor=power_factor,
            settings=settings,
            group=group,
            terms=terms,
            resolution_kw=resolution_kw,
        )
        for block in blocks
    ]
    nothing: list[PooledResponse | None] = [None] * blocks[0].kw.shape[2]
    pooled = pooled_over(blocks, built[0].weights()) if settings.temperature else nothing
    made = [one.hours(rng, pooled) for one in built]
    served_blocks = [
        replace(
            block,
            kw=block.kw[group.served].copy(),
            kvar=None if block.kvar is None else block.kvar[group.served].copy(),
        )
        for block in blocks
    ]
    sums = [
        block.kw.sum(axis=0) if block.kw.shape[0] else np.full(block.kw.shape[1:], np.nan) for block in served_blocks
    ]
    for array in sums:
        array.flags.writeable = False
    return GroupDemand(
        interval_min=interval_min,
        blocks=tuple(served_blocks),
        hours=tuple(hours for hours, _ in made),
        sums_kw=tuple(sums),
        settings=settings,
        diagnostics=tuple(found for _, found in made),
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Block:
    """One class of days and everything its intervals have in common."""

    block: DayBlock
    record_c: NDArray[np.float64] | None
    interval_min: int
    power_factor: float
    settings: ModelSettings
    group: Group
    terms: tuple[PlannedTerm, ...]
    resolution_kw: float

    def weights(self) -> NDArray[np.float64]:
        """How many times each metered customer counts in the group, planned ones shared among their members, (C,)."""
        weight = self.group.served.astype(np.float64)
        for term in self.terms:
            np.add.at(weight, term.members, term.count * term.scale / term.members.size)
        return weight

    def hours(
        self, rng: np.random.Generator | None, pooled: Sequence[PooledResponse | None]
    ) -> tuple[tuple[HourDemand | None, ...], BlockDiagnostics]:
        """Every interval, and the diagnostics of the class of days."""
        kw = self.block.kw
        intervals = kw.shape[2]
        weight = self.weights()
        counted = weight > 0.0
        known = np.isfinite(kw)
        enough = (known[self.group.served].sum(axis=1) >= FEWEST_DAYS).all(axis=0) & known[counted].any(axis=(0, 1))
        adjusted, responses = self._without_temperature(weight, pooled)
        reach = self.settings.smoothing_h * 60.0 / self.interval_min
        together = self.group.served if self.group.served.sum() >= 2 else np.ones(kw.shape[0], dtype=bool)
        common = common_component(adjusted[together], reach)
        raw = common_component(kw[together], reach)
        asked = self.settings.resamples > 0
        spread = correlation_interval(kw[together], self.block.day, reach) if asked else (float("nan"), float("nan"))
        equivalent = np.einsum("c,cdi->di", weight[counted], adjusted[counted])
        observed = np.einsum("c,cdi->di", weight[counted], kw[counted])
        spread_of_mean = mean_variance(equivalent, self.block.day)
        lean = skewness_along_day(equivalent, reach)
        power_factor = self._power_factors()
        nothing: tuple[Resamples | None, ...] = (None,) * intervals
        resamples = nothing if rng is None else resample_weeks(observed, self.block.day, self.settings.resamples, rng)
        made = tuple(
            self._hour(
                i,
                adjusted[:, :, i],
                float(lean[i]),
                self._correlation(common)[i],
                self._correlation(raw)[i],
                float(spread_of_mean[i]),
                responses[i],
                resamples[i],
                float(power_factor[i]),
            )
            if enough[i]
            else None
            for i in range(intervals)
        )
        return made, self._diagnostics(made, raw, responses, weight, spread)

    def _power_factors(self) -> NDArray[np.float64]:
        """Power factor of each interval, metered only where everyone served is."""
        served, kvar = self.group.served, self.block.kvar
        reactive = None if kvar is None or self.terms or not served.any() else kvar[served].sum(axis=0)
        return power_factors(self.block.kw[served].sum(axis=0), reactive, self.power_factor)

    def _correlation(self, common: CommonComponent) -> NDArray[np.float64]:
        """Mean correlation between customers, not negative; the user's figure where it was given."""
        if self.settings.correlation is not None:
            return np.full(common.correlation.size, max(self.settings.correlation, 0.0))
        return np.maximum(common.correlation, 0.0)

    def _without_temperature(
        self, weight: NDArray[np.float64], pooled: Sequence[PooledResponse | None]
    ) -> tuple[NDArray[np.float64], tuple[TemperatureResponse | None, ...]]:
        kw, temperature = self.block.kw, self.block.temperature_c
        intervals = kw.shape[2]
        if not self.settings.temperature or temperature is None:
            return kw, (None,) * intervals
        adjusted = np.array(kw)
        responses = []
        for i in range(intervals):
            adjusted[:, :, i], response = take_out_temperature(kw[:, :, i], temperature, weight, pooled[i])
            responses.append(response)
        return spread_taken_out(adjusted, temperature, weight, responses)

    def _hour(
        self,
        i: int,
        adjusted: NDArray[np.float64],
        skewness: float,
        correlation: float,
        raw_correlation: float,
        mean_variance_kw2: float,
        response: TemperatureResponse | None,
        resamples: Resamples | None,
        power_factor: float,
    ) -> HourDemand:
        """One demand interval; ``adjusted`` is (C, D)."""
        served = np.flatnonzero(self.group.served)
        raw = self.block.kw[:, :, i]
        own = [raw[c][np.isfinite(raw[c])] for c in served]
        like = [(term, *pooled(term, raw)) for term in self.terms]
        like = [(term, values, weights) for term, values, weights in like if values.size]
        target_raw = total_variance(
            [float(values.var(ddof=1)) for values in own],
            [(term, within(term, raw)) for term, _, _ in like],
            [weighted_variance(v, w) for _, v, w in like],
            raw_correlation,
        )
        step = self.settings.lattice_kw or affordable_step(
            [*own, *(v for _, v, _ in like)], target_raw**0.5, self.resolution_kw
        )
        by_class = self._by_class(adjusted)
        down, up, counts, variances, pooled_variances, held = [], [], [], [], [], 0.0
        for c in served.tolist():
            values = adjusted[c][np.isfinite(adjusted[c])]
            variances.append(float(values.var(ddof=1)))
            low, high, variance = self._customer(c, values, by_class, step, response is not None)
            down.append(low)
            up.append(high)
            counts.append(1)
            held += variance
        for term, _, _ in like:
            values, weights = pooled(term, adjusted)
            points = np.rint(values / step) * step
            low = lattice_mass(points, step, "down", weights)
            variance = weighted_variance(points, weights)
            down.append(low)
            up.append(low)
            counts.append(term.count)
            pooled_variances.append(variance)
            held += variance * term.count
        target = total_variance(
            variances, [(term, within(term, adjusted)) for term, _, _ in like], pooled_variances, correlation
        )
        exact = all(a is b for a, b in zip(down, up, strict=True))
        lower = DemandSum(terms=tuple(down), counts=tuple(counts))
        still = BracketedSum(down=lower, up=lower if exact else DemandSum(terms=tuple(up), counts=tuple(counts)))
        if self.settings.common_component:
            still = with_common_term(still, counts, target, target - held, skewness)
        shared = still.up.terms[-1] if len(still.up.terms) > len(counts) else None
        if self.settings.mean_uncertainty:
            unknown = variance_uncertainty_kw2(variances, target, self._days(adjusted))
            still = with_normal(still, (mean_variance_kw2 + unknown) ** 0.5)
        total = self._over_the_record(still, response)
        whole_down, whole_up = plain_distributions(total)
        nearest = DemandSum(
            terms=(*(_nearest(v, step, None) for v in own), *(_nearest(v, step, w) for _, v, w in like)),
            counts=tuple(counts),
        )
        can_export = bool(min([*(v.min() for v in own), *(v.min() for _, v, _ in like)]) < 0.0)
        return HourDemand(
            season=self.block.season,
            day_type=self.block.day_type,
            interval=i,
            interval_min=self.interval_min,
            n_days=self._days(adjusted),
            total=total,
            whole_down=whole_down,
            whole_up=whole_up,
            still=still,
            response=response,
            independent=plain_distributions(BracketedSum(down=nearest, up=nearest))[0],
            covariance_variance_kw2=target_raw,
            power_factor=power_factor,
            mean_variance_kw2=mean_variance_kw2 if self.settings.mean_uncertainty else 0.0,
            can_export=can_export,
            own_terms=len(counts),
            shared=shared,
            resamples=resamples,
        )

    def _by_class(self, adjusted: NDArray[np.float64]) -> dict[str, tuple[list[int], ClassPool]]:
        """Members of each class and what they lend each other."""
        found = {}
        for name in dict.fromkeys(self.group.classes):
            alike = [n for n, other in enumerate(self.group.classes) if other == name]
            found[name] = alike, class_pool(adjusted[alike])
        return found

    def _days(self, adjusted: NDArray[np.float64]) -> int:
        """Days of readings of the counted customer that has fewest, of those with any. [d]"""
        count = np.isfinite(adjusted[self.weights() > 0.0]).sum(axis=1)
        return int(count[count > 0].min())

    def _customer(
        self,
        c: int,
        values: NDArray[np.float64],
        by_class: Mapping[str, tuple[list[int], ClassPool]],
        step: float,
        moved: bool,
    ) -> tuple[LatticeMass, LatticeMass, float]:
        """Predictive distribution of one customer rounded down and up (one object where exact), and its variance.

        What is adjusted or borrowed is stated to the lattice, as a meter would state it; only readings as they were
        metered are rounded outward.
        """
        extra, share = np.empty(0), np.empty(0)
        if self.settings.shrinkage and self.settings.borrowed_days > 0.0:
            alike, pool = by_class[self.group.classes[c]]
            extra, share = borrowed(pool, alike.index(c), float(values.mean()))
        weight = self.settings.borrowed_days / (self.settings.borrowed_days + values.size) if extra.size else 0.0
        if moved:
            values = np.rint(values / step) * step
        points = np.concatenate([values, np.rint(extra / step) * step])
        weights = np.concatenate([np.full(values.size, (1.0 - weight) / values.size), share * weight])
        down = lattice_mass(points, step, "down", weights)
        up = lattice_mass(points, step, "up", weights)
        if down.offset == up.offset and np.array_equal(down.mass, up.mass):
            up = down
        return down, up, weighted_variance(points, weights)

    def _over_the_record(self, still: BracketedSum, response: TemperatureResponse | None) -> BracketedSum:
        """The sum mixed over the temperatures of the record, those outside the metered range held at its ends."""
        record = self.block.temperature_c if self.record_c is None else self.record_c
        if response is None or record is None:
            return still
        days = record[np.isfinite(record)]
        if not self.settings.beyond_metered_range:
            days = np.clip(days, response.lowest_c, response.highest_c)
        if days.size == 0:
            return still
        return mixed_over(still, response, days)

    def _diagnostics(
        self,
        made: tuple[HourDemand | None, ...],
        raw: CommonComponent,
        responses: tuple[TemperatureResponse | None, ...],
        weight: NDArray[np.float64],
        correlation: tuple[float, float],
    ) -> BlockDiagnostics:
        present = [hour for hour in made if hour is not None]
        model = sum(hour.variance_kw2() - hour.mean_variance_kw2 for hour in present)
        observed = sum(float(raw.observed_variance_kw2[hour.interval]) for hour in present)
        explained = [r.explained for r in responses if r is not None]
        outside = 0
        if self.record_c is not None and present and any(r is not None for r in responses):
            low = min(r.lowest_c for r in responses if r is not None)
            high = max(r.highest_c for r in responses if r is not None)
            outside = int(((self.record_c < low) | (self.record_c > high)).sum())
        below = [hour.whole_up.below(0.0) for hour in present if not hour.can_export]
        comparable = bool(np.array_equal(weight, self.group.served.astype(float)))
        return BlockDiagnostics(
            season=self.block.season,
            day_type=self.block.day_type,
            days=int(self.block.day.size),
            correlation=float(raw.correlation.mean()),
            correlation_low=correlation[0],
            correlation_high=correlation[1],
            variance_ratio=model / observed if comparable and observed > 0.0 else float("nan"),
            temperature_explains=float(np.mean(explained)) if explained else 0.0,
            record_days_outside=outside,
            share_below_zero=max(below, default=0.0),
        )


def _nearest(values: NDArray[np.float64], step: float, weights: NDArray[np.float64] | None) -> LatticeMass:
    return lattice_mass(np.rint(values / step) * step, step, "down", weights)
