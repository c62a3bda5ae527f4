"""What changed from one study to its revision: inputs, readings, assumptions, findings, verdicts, and why."""

import itertools
import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from loadsum.study.unittables import Transformer

# Tables of the study file whose change can move a verdict.
STUDY_CAUSES = ("customer", "season", "day_types", "model", "transformer", "allowed_loading", "criterion")
TOLERANCE = 1e-9  # relative; what two processors may disagree by
MOST_EXACT = 5  # causes whose shares are found from every subset of them


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """One thing that is not as it was.

    Parameters
    ----------
    part : str
        "input", "readings", "customer", "assumption", "criterion", "finding" or "verdict".
    what : str
        What changed.
    old, new : str
        As it was and as it is; empty where there was or is none.
    """

    part: str
    what: str
    old: str = ""
    new: str = ""

    def __str__(self) -> str:
        if self.old and self.new:
            return f"{self.part}: {self.what}: {self.old} -> {self.new}"
        return f"{self.part}: {self.what}: {'added' if self.new else 'gone'} ({self.new or self.old})"


@dataclass(frozen=True, slots=True, kw_only=True)
class Share:
    """How far one cause moved a figure.

    Parameters
    ----------
    cause : str
        Cause.
    change : float
        What it added to the figure, in the figure's unit.
    share : float
        That as a share of the whole change; not a number where the whole change is zero.
    """

    cause: str
    change: float
    share: float


def compare(old: Mapping[str, Any], new: Mapping[str, Any]) -> tuple[Change, ...]:
    """Everything that changed between two results, causes first and the verdicts last.

    Parameters
    ----------
    old, new : mapping
        Results as read from results.json.
    """
    return (
        *_inputs(old, new),
        *_readings(old, new),
        *_customers(old, new),
        *_assumptions(old, new),
        *_criteria(old, new),
        *_findings(old, new),
        *_verdicts(old, new),
    )


def _table(part: str, old: Mapping[str, str], new: Mapping[str, str]) -> list[Change]:
    """Changes between two tables of texts, in the order of their keys."""
    return [
        Change(part=part, what=what, old=old.get(what, ""), new=new.get(what, ""))
        for what in dict.fromkeys([*old, *new])
        if old.get(what, "") != new.get(what, "")
    ]


def _inputs(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Change]:
    def digests(results: Mapping[str, Any]) -> dict[str, str]:
        return {file["name"]: f"SHA-256 {file['sha256'][:12]}…" for file in results.get("inputs") or ()}

    return _table("input", digests(old), digests(new))


def months_of(results: Mapping[str, Any]) -> dict[tuple[str, str], tuple[int, float]]:
    """Readings and energy by customer and month, months without readings left out. [-, kWh]"""
    found = {}
    for row in results.get("months") or ():
        year, month = (int(part) for part in row["first_month"].split("-"))
        for n, (count, energy) in enumerate(zip(row["readings"], row["energy_kwh"], strict=True)):
            if count:
                past, index = divmod(12 * year + month - 1 + n, 12)
                found[row["customer"], f"{past:04d}-{index + 1:02d}"] = (count, energy)
    return found


def _readings(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Change]:
    """Months that came or went for everybody, customers that did, and months whose readings were replaced."""
    before, after = months_of(old), months_of(new)
    changes = []
    months = [{month for _, month in table} for table in (before, after)]
    people = [{who for who, _ in table} for table in (before, after)]
    for gone, came, what in ((months[0], months[1], "month"), (people[0], people[1], "customer")):
        changes += [
            Change(part="readings", what=f"{what} {name}", old=_of(before, name), new=_of(after, name))
            for name in sorted(gone ^ came)
        ]
    for who in sorted(people[0] & people[1]):
        moved = [
            month
            for month in sorted(months[0] & months[1])
            if not _alike(before.get((who, month)), after.get((who, month)))
        ]
        if not moved:
            continue
        both = len({m for c, m in before if c == who} & {m for c, m in after if c == who})
        span = "all months" if len(moved) >= both else ", ".join(moved)
        changes.append(
            Change(
                part="readings",
                what=f"customer {who}, {span}",
                old=_energy(before, who, moved),
                new=_energy(after, who, moved),
            )
        )
    return changes


def _alike(a: tuple[int, float] | None, b: tuple[int, float] | None) -> bool:
    if a is None or b is None:
        return a is b
    return a[0] == b[0] and math.isclose(a[1], b[1], rel_tol=TOLERANCE, abs_tol=1e-9)


def _of(table: Mapping[tuple[str, str], tuple[int, float]], name: str) -> str:
    count = sum(found[0] for key, found in table.items() if name in key)
    return f"{count} readings" if count else ""


def _energy(table: Mapping[tuple[str, str], tuple[int, float]], who: str, months: Sequence[str]) -> str:
    found = [table[who, month] for month in months if (who, month) in table]
    return (
        f"{sum(count for count, _ in found)} readings, {sum(energy for _, energy in found):.6g} kWh"
        if found
        else "none"
    )


def _customers(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Change]:
    def known(results: Mapping[str, Any]) -> dict[str, str]:
        return {
            f"{unit['id']} {row['id']}".strip(): f"{row['role']}, class {row['customer_class']}"
            for unit in results.get("transformers") or ()
            for row in unit.get("customers") or ()
        }

    return _table("customer", known(old), known(new))


def _assumptions(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Change]:
    def known(results: Mapping[str, Any]) -> dict[str, str]:
        found = {f"study.{name}": _text(value) for name, value in (results.get("study") or {}).items()}
        tables = [("", results), *((unit["id"], unit) for unit in results.get("transformers") or ())]
        for name, table in tables:
            for row in table.get("assumptions") or ():
                found[f"{name} {row['name']}".strip()] = f"{row['value']} {row.get('unit') or ''}".strip()
        return found

    return _table("assumption", known(old), known(new))


def _rows(results: Mapping[str, Any]) -> list[tuple[str, Mapping[str, Any]]]:
    return [
        (unit["id"], row)
        for unit in results.get("transformers") or ()
        for row in (unit.get("selection") or {}).get("criteria") or ()
    ]


def _criteria(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Change]:
    def known(results: Mapping[str, Any]) -> dict[str, str]:
        found: dict[str, str] = {}
        for _, row in _rows(results):
            name = f"{row['quantity']}, {row['of']}, season {row.get('season', 'all')}, {row.get('direction', 'both')}"
            limit = f"at most {row['limit']:g} {row.get('unit', '')}".strip()
            text = f"{limit}, {row['statistic']}; {row['source'] or 'no source'}"
            found[name] = text if found.get(name, text) == text else f"{found[name]}; and {text}"
        return found

    return _table("criterion", known(old), known(new))


def _findings(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Change]:
    def known(results: Mapping[str, Any]) -> dict[str, str]:
        found: dict[str, str] = {}
        for row in results.get("findings") or ():
            name = ", ".join(part for part in (row["rule"], row["customer"]) if part)
            found[name] = f"{found[name]}; {row['message']}" if name in found else row["message"]
        return found

    return _table("finding", known(old), known(new))


def _verdicts(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Change]:
    def known(results: Mapping[str, Any]) -> dict[str, str]:
        found = {}
        for unit in results.get("transformers") or ():
            name = unit["id"] or "transformer"
            choice = unit.get("selection")
            found[f"{name}, choice"] = _choice(choice) if choice else unit.get("reason") or "no verdict"
            for row in (choice or {}).get("criteria") or ():
                for at in row["by_rating"]:
                    what = f"{name}, {at['rating_kva']:g} kVA, {row['quantity']} of {row['of']}"
                    outcome = at.get("outcome") or {True: "met", False: "not met"}.get(at.get("meets"), "not decided")
                    found[what] = f"{outcome} ({_number(at['value'])} against {row['limit']:g})"
        return found

    return _table("verdict", known(old), known(new))


def _choice(choice: Mapping[str, Any]) -> str:
    rating = choice.get("rating_kva")
    return choice.get("sentence") or (f"{choice['verdict']}: {rating:g} kVA" if rating else str(choice["verdict"]))


def _number(value: float | None) -> str:
    return "no figure" if value is None else f"{value:.4g}"


def _text(value: object) -> str:
    return value if isinstance(value, str) else f"{value:g}" if isinstance(value, float) else str(value)


def shares(causes: Sequence[str], figure: Callable[[frozenset[str]], float]) -> tuple[Share, ...]:
    """How much of the change of a figure each cause accounts for; the changes add up to the whole, whatever the order.

    Parameters
    ----------
    causes : sequence of str
        Names of the causes.
    figure : callable
        The figure with only some of the causes at work: none of them is the old study, all of them the new one. Each
        set is asked for once.

    Notes
    -----
    Up to five causes: the mean, over every order in which they may come, of what each adds when its turn comes [1]_.
    More: the mean of the order given and its reverse, which adds up as well but can depend on that order.

    References
    ----------
    .. [1] L. S. Shapley, "A value for n-person games", Contributions to the Theory of Games II, Princeton, 1953.
       (cited from memory; the additivity is tested)
    """
    known: dict[frozenset[str], float] = {}

    def at(chosen: frozenset[str]) -> float:
        if chosen not in known:
            known[chosen] = figure(chosen)
        return known[chosen]

    few = len(causes) <= MOST_EXACT
    orders = list(itertools.permutations(causes)) if few else [tuple(causes), tuple(reversed(causes))]
    added = dict.fromkeys(causes, 0.0)
    for order in orders:
        here: frozenset[str] = frozenset()
        for cause in order:
            added[cause] += (at(here | {cause}) - at(here)) / len(orders)
            here |= {cause}
    whole = at(frozenset(causes)) - at(frozenset())
    return tuple(
        Share(cause=cause, change=change, share=change / whole if whole else float("nan"))
        for cause, change in added.items()
    )


def moved(old: Mapping[str, Any], new: Mapping[str, Any]) -> tuple[str, ...]:
    """Transformers of both results whose choice, or whose answer to a criterion at a rating, is not as it was.

    Parameters
    ----------
    old, new : mapping
        Results as read from results.json.
    """
    before, after = (
        {unit["id"]: _answers(unit) for unit in results.get("transformers") or ()} for results in (old, new)
    )
    return tuple(name for name in after if name in before and after[name] != before[name])


def _answers(unit: Mapping[str, Any]) -> tuple[object, ...]:
    """What was decided on a transformer, without the figures behind it."""
    choice = unit.get("selection") or {}
    decided = [
        (row["quantity"], row["of"], row.get("season"), at["rating_kva"], at.get("outcome", at.get("meets")))
        for row in choice.get("criteria") or ()
        for at in row["by_rating"]
    ]
    return unit.get("reason") or "", choice.get("verdict"), choice.get("rating_kva"), tuple(decided)


def judged_rating(unit: Transformer) -> float:
    """Rating whose room is shared out among the causes: the unit in service, or the largest compared. [kVA]"""
    return unit.installed_kva or max(unit.ratings_kva, default=0.0)


def room_at(selection: Mapping[str, Any] | None, rating_kva: float) -> float:
    """Least room under any criterion at a rating, as a share of the criterion's limit; not a number without one. [-]

    Parameters
    ----------
    selection : mapping or None
        Choice of rating as results hold it.
    rating_kva : float
        Rating; the smallest one not below it is taken. [kVA]
    """
    rooms = []
    for row in (selection or {}).get("criteria") or ():
        enough = [at for at in row["by_rating"] if at["rating_kva"] >= rating_kva] or row["by_rating"][-1:]
        if enough and enough[0]["margin"] is not None and row["limit"] > 0.0:
            rooms.append(enough[0]["margin"] / row["limit"])
    return min(rooms, default=float("nan"))
