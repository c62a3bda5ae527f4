"""The smallest rating that meets every criterion of the user's utility, and why."""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from loadsum.demand.hourly import Direction, GroupDemand
from loadsum.peak.exceedance import ExceedanceTable, LevelExceedance, exceedance_hours
from loadsum.study.unittables import AllowedLoading, Criterion
from loadsum.transformer.loading import allowed_pu

Outcome = Literal["met", "not met", "not decided by these data", "cannot be evaluated"]
Verdict = Literal["chosen", "none suffices", "not decided", "no criterion"]

UNITS = {
    "exceedance hours per year": "h",
    "exceedance probability in any interval": "",
    "annual exceedance probability": "",
    "hot-spot temperature": "°C",
    "top-oil temperature": "°C",
    "ageing per year": "years of normal life",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """A figure that a criterion is held against, with what is known about it.

    Parameters
    ----------
    value : float
        Predictive value, in the unit of the quantity.
    low, high : float or None
        Its interval.
    floor : float or None
        Smallest figure that the record supports; None where that is not a question.
    reason : str
        Why there is no figure; empty where there is.
    """

    value: float
    low: float | None = None
    high: float | None = None
    floor: float | None = None
    reason: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class CriterionAtRating:
    """One criterion at one rating.

    Parameters
    ----------
    rating_kva : float
        Nameplate rating. [kVA]
    value, low, high, floor : float or None
        The figure held against the limit, its interval, and what the record supports.
    limit, margin : float
        The limit, and limit less the figure that counts: positive is room.
    meets : bool or None
        Whether the criterion is met; None where it is not decided or cannot be evaluated.
    outcome : str
        The same in words.
    governs : bool
        Whether this criterion leaves the least room at this rating, as a share of its limit.
    reason : str
        Why it cannot be evaluated.
    """

    rating_kva: float
    value: float | None
    low: float | None
    high: float | None
    floor: float | None
    limit: float
    margin: float | None
    meets: bool | None
    outcome: Outcome
    governs: bool
    reason: str


@dataclass(frozen=True, slots=True, kw_only=True)
class CriterionResult:
    """One criterion at every rating, with what it is and where it comes from."""

    quantity: str
    unit: str
    of: str
    limit: float
    statistic: str
    direction: str
    season: str
    probability: float
    source: str
    traced: bool
    by_rating: tuple[CriterionAtRating, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Selection:
    """The choice of rating.

    Parameters
    ----------
    verdict : str
        What was found.
    rating_kva : float or None
        Smallest rating that meets every criterion; None where there is none. [kVA]
    undecided_kva : tuple of float
        Smaller ratings that these data do not decide. [kVA]
    installed : str
        What was found of the unit in service: "adequate", "not adequate", "not decided by these data"; or empty.
    governing : str
        Quantity that leaves the least room at the chosen rating, or keeps the next smaller one from being chosen.
    sentence : str
        The choice in words.
    criteria : tuple of CriterionResult
        Every criterion at every rating.
    """

    verdict: Verdict
    rating_kva: float | None
    undecided_kva: tuple[float, ...]
    installed: str
    governing: str
    sentence: str
    criteria: tuple[CriterionResult, ...]


FigureSource = Callable[[Criterion, float], Figure]


def evaluate(
    demand: GroupDemand,
    ratings_kva: Sequence[float],
    criteria: Sequence[Criterion],
    allowed: Sequence[AllowedLoading],
    *,
    installed_kva: float = 0.0,
    others: Mapping[str, FigureSource] | None = None,
    above: Mapping[str, ExceedanceTable] | None = None,
    far: bool = True,
) -> Selection:
    """The choice of rating by the user's own criteria.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    ratings_kva : sequence of float
        Ratings to compare, increasing. [kVA]
    criteria : sequence of Criterion
        Criteria of the user's utility; none makes a table and no verdict.
    allowed : sequence of AllowedLoading
        Loading allowed by season.
    installed_kva : float
        Rating in service; 0 where the unit is new. [kVA]
    others : mapping of str to callable
        Sources of figures that other stages compute (annual probability, temperatures, ageing), by quantity.
    above : mapping of str to ExceedanceTable
        Exceedance of every rating that was computed already, both directions and all seasons, by loading.
    far : bool
        Whether rare exceedance is computed as in :func:`exceedance_hours`; no limit lies where that would matter.
    """
    results = tuple(
        _criterion(demand, ratings_kva, criterion, allowed, others or {}, above or {}, far) for criterion in criteria
    )
    results = _with_governing(results)
    return _choice(ratings_kva, results, installed_kva)


def exceedance_figure(level: LevelExceedance, quantity: str) -> Figure:
    """The figure of an exceedance criterion: hours per year, or the largest probability of any demand interval."""
    if quantity == "exceedance hours per year":
        return Figure(value=level.year.expected_h, low=level.year.low_h, high=level.year.high_h)
    largest = level.largest_probability
    if largest is None:
        return Figure(value=float("nan"), reason="no demand interval has readings")
    return Figure(value=largest.value, low=largest.low, high=largest.high, floor=largest.floor)


def _criterion(
    demand: GroupDemand,
    ratings_kva: Sequence[float],
    criterion: Criterion,
    allowed: Sequence[AllowedLoading],
    others: Mapping[str, FigureSource],
    above: Mapping[str, ExceedanceTable],
    far: bool,
) -> CriterionResult:
    rows = []
    exceeded: list[Figure] = []
    if criterion.quantity in ("exceedance hours per year", "exceedance probability in any interval"):
        known = above.get(criterion.of) if criterion.season == "all" and criterion.direction == "both" else None
        exceeded = (
            _exceedances(demand, ratings_kva, criterion, allowed, far)
            if known is None
            else [exceedance_figure(level, criterion.quantity) for level in known.levels]
        )
    for n, rating in enumerate(ratings_kva):
        if exceeded:
            figure = exceeded[n]
        elif criterion.quantity in others:
            figure = others[criterion.quantity](criterion, rating)
        else:
            figure = Figure(value=float("nan"), reason="the study file does not give what this figure needs")
        rows.append(_held(rating, figure, criterion))
    return CriterionResult(
        quantity=criterion.quantity,
        unit=UNITS[criterion.quantity],
        of=criterion.of,
        limit=criterion.limit,
        statistic=criterion.statistic,
        direction=criterion.direction,
        season=criterion.season,
        probability=criterion.probability,
        source=criterion.source or "not traced to a utility standard",
        traced=bool(criterion.source),
        by_rating=tuple(rows),
    )


def _exceedances(
    demand: GroupDemand,
    ratings_kva: Sequence[float],
    criterion: Criterion,
    allowed: Sequence[AllowedLoading],
    far: bool,
) -> list[Figure]:
    """Figures of an exceedance criterion at every rating, from one pass over the hours."""
    share = allowed_pu(demand, criterion.of, allowed)
    kept = [b for b, block in enumerate(demand.blocks) if criterion.season in ("all", block.season)]
    if np.isnan(share[kept]).any():
        missing = Figure(value=float("nan"), reason=f"the study file states no {criterion.of} for every season")
        return [missing] * len(ratings_kva)
    part = replace(
        demand,
        blocks=tuple(demand.blocks[b] for b in kept),
        hours=tuple(demand.hours[b] for b in kept),
        sums_kw=tuple(demand.sums_kw[b] for b in kept),
    )
    direction: Direction = criterion.direction  # type: ignore[assignment]
    levels = {str(n): rating * share[kept] for n, rating in enumerate(ratings_kva)}
    table = exceedance_hours(part, levels, direction, far=far)
    return [exceedance_figure(level, criterion.quantity) for level in table.levels]


def _held(rating: float, figure: Figure, criterion: Criterion) -> CriterionAtRating:
    """One figure held against its limit."""
    counts = figure.high if criterion.statistic == "upper end of interval" else figure.value
    reason = figure.reason
    if not reason and counts is None:
        reason = "no interval was computed: too few weeks, or resamples = 0"
    outcome: Outcome
    if reason or counts is None or np.isnan(counts):
        outcome, meets, margin = "cannot be evaluated", None, None
    else:
        margin = criterion.limit - counts
        inside = figure.low is not None and figure.high is not None and figure.low <= criterion.limit < figure.high
        unsupported = figure.floor is not None and criterion.limit < figure.floor and counts <= criterion.limit
        if unsupported:
            outcome, meets = "not decided by these data", None
            reason = f"the record supports no probability below {figure.floor:.2g}"
        elif criterion.statistic == "predictive value" and inside:
            outcome, meets = "not decided by these data", None
        elif margin >= 0.0:
            outcome, meets = "met", True
        else:
            outcome, meets = "not met", False
    return CriterionAtRating(
        rating_kva=rating,
        value=None if np.isnan(figure.value) else figure.value,
        low=figure.low,
        high=figure.high,
        floor=figure.floor,
        limit=criterion.limit,
        margin=margin,
        meets=meets,
        outcome=outcome,
        governs=False,
        reason=reason,
    )


def _with_governing(results: tuple[CriterionResult, ...]) -> tuple[CriterionResult, ...]:
    """Marks at each rating the criterion with the least room as a share of its limit."""
    if not results:
        return results
    marked = [list(result.by_rating) for result in results]
    for n in range(len(marked[0])):
        room = [
            rows[n].margin / max(rows[n].limit, 1e-12) if rows[n].margin is not None else np.inf  # type: ignore[operator]
            for rows in marked
        ]
        if np.isfinite(min(room)):
            least = int(np.argmin(room))
            marked[least][n] = replace(marked[least][n], governs=True)
    return tuple(replace(result, by_rating=tuple(rows)) for result, rows in zip(results, marked, strict=True))


def _choice(ratings_kva: Sequence[float], results: tuple[CriterionResult, ...], installed_kva: float) -> Selection:
    if not results:
        return Selection(
            verdict="no criterion",
            rating_kva=None,
            undecided_kva=(),
            installed="",
            governing="",
            criteria=(),
            sentence="The study file states no criterion, so there is a table and no verdict.",
        )
    state = {}
    for n, rating in enumerate(ratings_kva):
        column = [result.by_rating[n].meets for result in results]
        state[rating] = False if False in column else None if None in column else True
    met = [rating for rating in ratings_kva if state[rating]]
    chosen = met[0] if met else None
    undecided = tuple(r for r in ratings_kva if state[r] is None and (chosen is None or r < chosen))
    installed = ""
    if installed_kva in state:
        installed = {True: "adequate", False: "not adequate", None: "not decided by these data"}[state[installed_kva]]
    verdict: Verdict = "chosen" if chosen is not None else "not decided" if undecided else "none suffices"
    return Selection(
        verdict=verdict,
        rating_kva=chosen,
        undecided_kva=undecided,
        installed=installed,
        governing=_governing(ratings_kva, results, chosen),
        sentence=_sentence(verdict, chosen, undecided, ratings_kva, results),
        criteria=results,
    )


def _governing(ratings_kva: Sequence[float], results: tuple[CriterionResult, ...], chosen: float | None) -> str:
    """What keeps the next smaller rating from being chosen; at the smallest, what leaves the least room."""
    at = len(ratings_kva) - 1 if chosen is None else max(list(ratings_kva).index(chosen) - 1, 0)
    return next((result.quantity for result in results if result.by_rating[at].governs), "")


def _sentence(
    verdict: Verdict,
    chosen: float | None,
    undecided: tuple[float, ...],
    ratings_kva: Sequence[float],
    results: tuple[CriterionResult, ...],
) -> str:
    named = " and ".join(f"{rating:g} kVA" for rating in undecided)
    if verdict == "none suffices":
        return f"No rating up to {ratings_kva[-1]:g} kVA meets every criterion."
    if verdict == "not decided":
        return f"No rating surely meets every criterion; {named} is not decided by these data."
    sentence = f"{chosen:g} kVA is the smallest rating compared that meets every criterion."
    if chosen == ratings_kva[0] and all(row.meets for result in results for row in result.by_rating):
        sentence = f"Every rating compared meets every criterion; {chosen:g} kVA is the smallest."
    if undecided:
        sentence += f" {named} is not decided by these data."
    return sentence
